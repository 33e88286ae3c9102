"""The whole analytic field of turning machines: laws that hold for every family and position."""

from __future__ import annotations

from dataclasses import fields

import machines
import numpy as np
import pytest
from analytic_case import AnalyticCase, roomy
from numpy.typing import NDArray
from outside import OutsideChecks

from evaluators.analytic.gap import SlottedGap
from evaluators.analytic.model import Resolution
from evaluators.analytic.rotor import MU_0, RotorRadii
from evaluators.analytic.rotor_state import at_order
from evaluators.analytic.slots import mouth
from evaluators.machine.winding.families import enumerate_families
from evaluators.machine.winding.winding import Winding

FloatArray = NDArray[np.float64]

check = OutsideChecks("force")

EVERY_FAMILY: list[machines.Numbers] = [
    (w.family.slots, w.family.pole_pairs, w.family.suspension_pole_pairs)
    for w in enumerate_families((6, 12, 18, 24, 30, 36), range(1, 9))
    if isinstance(w, Winding)
]

# -- the turn -----------------------------------------------------------------------------------


@pytest.mark.parametrize("numbers", EVERY_FAMILY, ids=str)
def test_one_sector_tells_the_whole_turn(numbers: machines.Numbers) -> None:
    case = AnalyticCase(numbers, ideal_iron=True, **roomy(numbers[0]))
    sector = case.motion()
    sectors = case.model.rotation.sectors
    count = sector.positions.size * sectors
    assert sector.positions.size * sectors >= 8 * 6 * numbers[1]
    turn = case.motion(2.0 * np.pi * np.arange(count) / count)
    rest, direct, mirrored = sector.whole_turn()
    # The same circuit, solved to 1e-10 of its potentials; relative to mean torque and force.
    np.testing.assert_allclose(
        np.tile(sector.torque, (1, sectors)), turn.torque, atol=1e-6 * turn.torque.mean()
    )
    np.testing.assert_allclose(
        np.tile(sector.cogging, (1, sectors)), turn.cogging, atol=1e-6 * turn.torque.mean()
    )
    scale = np.abs(turn.direct).max() + np.abs(turn.mirrored).max()
    np.testing.assert_allclose(direct, turn.direct, atol=1e-6 * scale)
    np.testing.assert_allclose(mirrored, turn.mirrored, atol=1e-6 * scale)
    strength = scale * case.exciting.suspension[0]
    np.testing.assert_allclose(rest, turn.rest, atol=1e-6 * strength)
    if np.gcd(numbers[0], 2 * numbers[1]) > 1:
        check(
            "force of balanced machines without suspension current over that with it",
            np.abs(turn.rest).max() / strength,
            0.0,
            absolute=1e-6,
            why="the circuit is solved to 1e-10 of its potentials",
            source="Zhu, Ishak, Howe, Chen, IEEE Trans. Ind. Appl. 43(6), 2007: none",
        )


@pytest.mark.parametrize("numbers", [(6, 2, 1), (12, 4, 5), (12, 5, 4), (18, 4, 5)], ids=str)
def test_cogging_has_the_period_of_slots_and_poles(numbers: machines.Numbers) -> None:
    case = AnalyticCase(numbers, Resolution(slot_modes=4, reach=16, highest_order=160, positions=8))
    periods = int(np.lcm(numbers[0], 2 * numbers[1]))
    turn = case.motion(2.0 * np.pi * np.arange(8 * periods) / (8 * periods))
    spectrum = np.abs(np.fft.rfft(turn.cogging[0])) / turn.cogging.size
    rounding = 1e-10 * turn.torque.mean()
    allowed = np.arange(spectrum.size) % periods == 0
    check(
        "cogging in other than lcm(Q, 2p) periods a turn over the mean torque",
        spectrum[~allowed] / turn.torque.mean(),
        0.0,
        absolute=1e-10,
        why="rounding",
        source="Zhu, Howe, IEEE Trans. Energy Conv. 15(4), 2000: none; energy over a turn",
    )
    # The mean is that of the harmonics cut off, too.
    assert spectrum[0] < 1e-6 * turn.torque.mean() + 1e-2 * spectrum[periods]
    if numbers != (18, 4, 5):  # 72 periods: too small to see
        assert spectrum[periods] > 1e3 * rounding


# -- energy ---------------------------------------------------------------------------------------


@pytest.mark.parametrize("numbers", EVERY_FAMILY, ids=str)
def test_torque_equals_power_of_the_emf(numbers: machines.Numbers) -> None:
    # One side is the stress in the gap, the other the flux of the coils.
    source = "energy balance of a round rotor, T = 1.5 p lambda i (common practice)"
    resolution = Resolution(3, 8, 8 * 36 + 40, 8)
    case = AnalyticCase(numbers, resolution, ideal_iron=True, **roomy(numbers[0]))
    field = case.solve()
    expected = 1.5 * numbers[1] * field.flux_linkage * case.exciting.torque
    check(
        "mean torque of all families, perfect iron",
        field.torque,
        expected,
        relative=1e-5,
        why="Galerkin's method keeps reciprocity; the sheets' permeability of ten million leaves "
        "1e-6",
        source=source,
    )
    # Saturated iron stores energy but returns it within a sector; eight positions sample its swing.
    case = AnalyticCase(numbers, resolution, **roomy(numbers[0]))
    field = case.solve()
    check(
        "mean torque of all families, sheets",
        field.torque,
        1.5 * numbers[1] * field.flux_linkage * case.exciting.torque,
        relative=0.01,
        why="saturated iron stores energy but returns it within a sector; eight positions sample "
        "its swing",
        source=source,
    )


@pytest.mark.parametrize("numbers", machines.FAMILIES, ids=str)
def test_torque_at_every_position(numbers: machines.Numbers) -> None:
    slots, pole_pairs, _ = numbers
    resolution = Resolution(3, 8, 8 * slots + 8 * pole_pairs, 8)
    case = AnalyticCase(numbers, resolution, ideal_iron=True, **roomy(slots))
    waves = case.waves()
    orders = case.model.rotation.magnet_orders
    flux = case.model.linkage.magnet_harmonics(waves.magnets, orders)[0]
    motion = case.motion()
    sequence = case.task.winding.torque_sequence
    expected = np.zeros(motion.positions.size)
    for k in range(3):
        shift = sequence * 2.0 * np.pi * k / 3.0
        electrical = pole_pairs * motion.positions - shift
        current = np.real(waves.phasor[0] * np.exp(1j * electrical))
        harmonic = orders[:, None] // pole_pairs
        slope = np.real(1j * orders * flux @ np.exp(1j * harmonic * electrical))
        expected += current * slope
    found = motion.torque[0] - motion.cogging[0]
    check(
        "torque less cogging at every position",
        found,
        expected,
        relative=1e-5,
        why="the magnets' orders beyond 45 are in neither; iron of mu_r = 1e7 is linear up to 1e-7",
        source="sum over phases of i d(linkage)/d(angle)",
    )


@pytest.mark.parametrize("numbers", [(6, 2, 1), (12, 5, 4), (12, 4, 5)], ids=str)
@pytest.mark.parametrize("span", [0.7, 1.6])
def test_cogging_is_the_slope_of_the_energy(numbers: machines.Numbers, span: float) -> None:
    """Slots act as current sheets K = -H_theta in their mouths would on a smooth bore.

    Magnets and iron being linear, the coenergy that goes with it is half of A of the smooth bore
    times K, integrated along the bore, and its slope over the angle is the torque.
    """
    slots = numbers[0]
    case = AnalyticCase(
        numbers, Resolution(4, 8, 9 * slots, 8), ideal_iron=True, tip_span_ratio=span
    )
    waves, source, _ = case.model.waves(case.sections, case.exciting)
    field, orders = waves.magnets, case.model.rotation.magnet_orders
    bore = float(case.sections.bore_radius[0])
    size = np.where(field.orders == 0, 0, np.abs(field.orders))
    across = -size * (field.rising[0] - field.falling[0]) / bore
    periods = int(np.lcm(slots, 2 * numbers[1]))
    count = 4 * 24
    angle = 2.0 * np.pi / periods * np.arange(count) / count
    points = 2.0 * np.pi * np.arange(1024) / 1024
    energy = []
    for turned in angle:
        smooth = 2.0 * np.real(
            (source.bore[0] * np.exp(-1j * orders * turned)) @ np.exp(1j * orders[:, None] * points)
        )
        rotor = np.exp(-1j * orders * turned)[:, None] * across
        tangential = 2.0 * np.real(
            rotor.ravel() @ np.exp(1j * field.orders.ravel()[:, None] * points)
        )
        energy.append(-0.5 * np.mean(smooth * tangential) * 2.0 * np.pi * bore / MU_0)
    spectrum = np.fft.rfft(energy)
    slope = np.fft.irfft(1j * periods * np.arange(spectrum.size) * spectrum, count)
    cogging = case.motion(angle).cogging[0]
    largest = np.abs(slope).max()
    check(
        "cogging torque at every position over the largest",
        cogging / largest,
        slope / largest,
        absolute=1e-5,
        why="the same harmonics by another route; iron of mu_r = 1e7",
        source="slope of the coenergy of the slots' equivalent current sheets",
    )
    assert np.abs(slope).max() > 1e-4


# -- force ----------------------------------------------------------------------------------------


@pytest.mark.parametrize("numbers", EVERY_FAMILY, ids=str)
def test_force_points_where_it_is_commanded(numbers: machines.Numbers) -> None:
    case = AnalyticCase(numbers, **roomy(numbers[0]))
    motion = case.motion()
    rest, direct, mirrored = motion.whole_turn()
    for direction in (0.0, 0.5 * np.pi, 2.3):
        phasor = case.exciting.suspension[0] * motion.command(direction)[0]
        mean = np.mean(rest + direct * phasor + mirrored * np.conj(phasor))
        assert np.angle(mean * np.exp(-1j * direction)) == pytest.approx(0.0, abs=1e-9)
    field = case.solve()
    # The mean force is proportional to the current.
    np.testing.assert_allclose(
        field.force, field.force_per_ampere_turn * case.exciting.suspension, rtol=1e-9
    )


def narrow(**changes: float) -> dict[str, float]:
    """Straight narrow slots and hardly any torque current."""
    return {
        "tooth_width_ratio": 0.9,
        "tip_span_ratio": 1.0,
        "current_density_A_mm2": 1e-6,
        **changes,
    }


@pytest.mark.parametrize("numbers", [(12, 4, 5), (12, 5, 4), (12, 1, 2), (12, 2, 1)], ids=str)
def test_force_per_ampere_in_closed_form(numbers: machines.Numbers) -> None:
    """10 % wide slots; magnets of mu_r = 1, as the closed form has them."""
    _, pole_pairs, order = numbers
    case = AnalyticCase(numbers, Resolution(6, 60, 200, 8), ideal_iron=True, **narrow())
    case.model.recoil = 1.0
    field, sections = case.solve(), case.sections
    turns = numbers[0] / 3  # one per coil
    bore = float(sections.bore_radius[0])
    wave = case.task.winding.suspension_winding_factor * np.sinc(
        order * sections.slot_opening_angle[0] / (2.0 * np.pi)
    )
    sheet = 3.0 * turns * wave / (np.pi * bore)
    part = 1.0 / np.tanh(order * np.log(bore / sections.core_radius[0]))
    sign = 1.0 if order > pole_pairs else -1.0
    expected = 0.5 * np.pi * bore * field.gap_flux_density * sheet * (part + sign)
    check(
        "force per ampere-turn with narrow slots",
        field.force_per_ampere_turn,
        expected,
        relative=0.04,
        why="slots of 10 % of the pitch take a little of either field",
        source="pi Rs B1 K/2 (coth(nu ln(Rs/Rr)) ± 1), K = 3 N k_w I/(pi Rs): Bichsel, "
        "dissertation ETH Zurich 1990 (from memory)",
    )


@pytest.mark.parametrize("numbers", [(12, 4, 5), (12, 2, 1), (24, 5, 4)], ids=str)
def test_main_field_of_the_torque_current(numbers: machines.Numbers) -> None:
    """Main inductance with curvature; linkage 2 N k_w A of a balanced phase."""
    pole_pairs = numbers[1]
    case = AnalyticCase(numbers, **narrow(), **roomy(numbers[0]))
    sections = case.sections
    rotor = RotorRadii.of(sections, 1.0)
    residues, current = case.model.rotation.current_residues("torque")
    gap = SlottedGap(
        rotor, sections.slot_opening_angle, mouth(sections, 6), numbers[0], residues, 60
    )
    potential = 2.0 * abs(at_order(gap.of_currents(current), pole_pairs)[0])
    factor = numbers[0] / 3 * case.task.winding.torque_winding_factor
    found = 2.0 * factor * potential
    ratio = np.log(rotor.bore[0] / rotor.core[0])
    expected = 6.0 * MU_0 * factor**2 / (np.tanh(pole_pairs * ratio) * np.pi * pole_pairs)
    check(
        "main inductance with narrow slots",
        found,
        expected,
        relative=0.01,
        why="slots of 10 % of the pitch, so tooth faces are nearly the whole bore",
        source="6 mu0 (N k_w)² coth(p ln(Rs/Rr))/(pi p), current sheet of Hughes, Miller, "
        "Proc. IEE 124(2), 1977",
    )


# -- scaling --------------------------------------------------------------------------------------

SCALING = {
    # powers of length at the same flux densities: currents go with the length
    "torque": 2, "cogging": 2, "force": 1, "flux_linkage": 1, "displacement_stiffness": 0,
    "torque_inductance": 0, "suspension_inductance": 0, "force_per_ampere_turn": 0,
    "torque_ripple": 0, "force_error_magnitude": 0, "force_error_angle": 0,
    "gap_flux_density": 0, "tooth_flux_density": 0, "yoke_flux_density": 0, "core_flux_density": 0,
    "magnet_flux_density": 0, "loss_teeth": 2, "loss_yoke": 2,
    "loss_iron_hysteresis": 2, "loss_iron_eddy": 2, "loss_iron_excess": 2,
}  # fmt: skip


@pytest.mark.parametrize("numbers", [(6, 2, 1), (12, 5, 4)], ids=str)
def test_twice_as_large_at_the_same_flux_density(numbers: machines.Numbers) -> None:
    # Magnetostatics knows no length, saturated or not; 2-D quantities per metre scale as stated.
    small = AnalyticCase(numbers, tooth_width_ratio=0.35)
    double = {name: 2.0 * value for name, value in machines.DESIGN.items() if name.endswith("_mm")}
    large = AnalyticCase(numbers, tooth_width_ratio=0.35, **double, current_density_A_mm2=3.0)
    np.testing.assert_allclose(large.exciting.torque, 2.0 * small.exciting.torque, rtol=1e-12)
    first, second = small.solve(), large.solve()
    assert first.tooth_flux_density[0] > 1.1  # the iron takes part
    for item in fields(first):
        if item.name not in SCALING:
            # The skin depth is a length; no currents turn the force.
            assert item.name in ("loss_magnet", "loss_sleeve", "force_angle_bias")
            continue
        ratio = getattr(second, item.name) / getattr(first, item.name)
        assert ratio[0] == pytest.approx(2.0 ** SCALING[item.name], rel=1e-6), item.name
