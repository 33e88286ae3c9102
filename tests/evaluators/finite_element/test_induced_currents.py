"""Induced currents in the rotor: closed forms and the machine's laws."""

from __future__ import annotations

from dataclasses import replace

import machines
import numpy as np
import pytest
from numpy.typing import NDArray
from outside import OutsideChecks

from evaluators.finite_element import analysis, transient
from evaluators.finite_element.mesh.lattice import Resolution
from evaluators.finite_element.model import Discretisation, FieldModel
from evaluators.finite_element.outcome import stress
from evaluators.finite_element.rotor.answer import eddy_rotor
from evaluators.finite_element.rotor.eddy import Conductors, EddyRotor
from evaluators.finite_element.rotor.harmonics import Harmonics
from evaluators.finite_element.rotor.uniform import NU_0, Rotor
from evaluators.finite_element.solution import newton
from evaluators.finite_element.solution.batch import BatchField
from evaluators.finite_element.solution.lanes import LANES
from evaluators.machine.field import Excitation, excitation

FloatArray = NDArray[np.float64]
ONES = np.ones(LANES)

check = OutsideChecks("losses")


def rotor_of(
    iron: list[float], magnet: float, sleeve: float, bore: float, recoil: float = 1.0
) -> Rotor:
    return Rotor(
        iron_radius=np.array(iron)[:, None] * ONES * 1e-3,
        magnet_radius=magnet * ONES * 1e-3,
        sleeve_radius=sleeve * ONES * 1e-3,
        bore_radius=bore * ONES * 1e-3,
        magnet_permeability=recoil,
        sleeve_permeability=1.0,
    )


def conductors(shaft: float = 0.0, magnet: float = 0.0, sleeve: float = 0.0) -> Conductors:
    """Closed rings of endless length."""
    return Conductors(shaft, magnet, sleeve, 2.0 * np.pi * ONES, np.inf * ONES, ONES, np.inf * ONES)


# Unsegmented magnet ring on iron without conductivity, current sheet of 10 kA/m on the bore, W/m;
# radii 20, 24, 25 mm, mu_r 1.05, 1.5 uohm m.
RING = {
    (1, 100.0): 148.4842,
    (1, 1e3): 2741.988,
    (1, 1e4): 3373.482,
    (2, 100.0): 9.556257,
    (2, 1e3): 741.6309,
    (2, 1e4): 3216.731,
    (4, 100.0): 0.5710469,
    (4, 1e3): 56.08825,
    (4, 1e4): 2035.723,
}


@pytest.mark.parametrize(("order", "frequency"), RING)
def test_closed_ring_on_iron(order: int, frequency: float) -> None:
    rotor = rotor_of([8.0, 20.0], 24.0, 24.5, 25.0, recoil=1.05)
    perfect = np.full((2, LANES), NU_0 / 1e9)
    eddy = EddyRotor(rotor, perfect, 1, conductors(magnet=1.0 / 1.5e-6))
    orders, speed = np.array([order]), np.array([2.0 * np.pi * frequency])
    sheet = 0.5 * 25e-3 * 1e4  # two-sided coefficient of h
    loss = eddy.loss(orders, speed, sheet / eddy.response(orders, speed))
    check(
        "eddy loss of a closed magnet ring, by layers",
        loss.magnet[0],
        RING[order, frequency],
        relative=1e-3,
        why="24 layers of constant coefficient: measured 3e-4 at most",
        source="Bessel functions, Poynting vector and volume integral alike, own evaluation "
        "(Smythe, Static and Dynamic Electricity, ch. 10, from memory)",
    )
    assert np.max(np.abs(loss.sleeve)) < 1e-9 * loss.magnet[0, 0]


# Solid cylinder, a = 10 mm, 58 MS/m, rotating field of 0.1 T, W/m.
CYLINDER = {10.0: 17.87628, 50.0: 391.2065, 200.0: 2251.503, 1000.0: 5861.523, 5000.0: 13986.55}


@pytest.mark.parametrize("frequency", CYLINDER)
def test_solid_cylinder_in_a_rotating_field(frequency: float) -> None:
    rotor = rotor_of([10.0], 11.0, 12.0, 15.0)
    eddy = EddyRotor(rotor, np.full((1, LANES), NU_0), 1, conductors(shaft=58e6))
    orders, speed = np.array([1]), np.array([2.0 * np.pi * frequency])
    y = eddy.response(orders, speed)
    # A = alpha r + beta/r with alpha r = B0 r/2 (two-sided): a = 2 nu0/(nu0 + y) alpha R.
    potential = 0.5 * 0.1 * 15e-3 * 2.0 * NU_0 / (NU_0 + y)
    loss = eddy.loss(orders, speed, potential)
    check(
        "loss of a solid shaft in a rotating field",
        loss.shaft[0],
        CYLINDER[frequency],
        relative=1e-6,
        why="Bessel functions throughout; the table's last digit",
        source="own evaluation of Landau, Lifshitz, Electrodynamics of Continuous Media, section "
        "59, problem 2",
    )


def test_segments_without_net_current_lose_what_a_strip_loses() -> None:
    """Narrow segments, resistance-limited."""
    rotor = rotor_of([8.0, 20.0], 20.4, 20.5, 20.6)
    width = 2.0 * np.pi / 120.0
    parts = Conductors(0.0, 1.0 / 1.5e-6, 0.0, width * ONES, np.inf * ONES, ONES, np.inf * ONES)
    eddy = EddyRotor(rotor, np.full((2, LANES), NU_0 / 1e9), 1, parts)
    orders, speed = np.array([2]), np.array([2.0 * np.pi * 1e3])
    y = eddy.response(orders, speed)
    potential = np.full((1, LANES), 1e-4 + 0j)
    loss = eddy.loss(orders, speed, potential).magnet[0]
    assert np.all(y.imag > 0.0)
    # In a thin ring on iron the potential is that of the bore; two-sided B_r is n a/r, peak twice.
    density = 2.0 * 2 * 1e-4 / 20.2e-3
    volume = np.pi * (20.4e-3**2 - 20e-3**2)
    strip = speed**2 * density**2 * (width * 20.2e-3) ** 2 / (24.0 * 1.5e-6) * volume
    check(
        "eddy loss of narrow segments",
        loss,
        strip * ONES,
        relative=0.01,
        why="curvature and the change of the field over the ring; measured 0.4 %",
        source="strip formula, w² B² b²/(24 rho) per volume",
    )


# -- the machine ---------------------------------------------------------------------------------


def machine(numbers: machines.Numbers, sleeve: str) -> tuple[analysis.StaticFields, Excitation]:
    task = machines.task(*numbers, sleeve=sleeve)
    sections = machines.sections(task, machines.scattered(LANES, seed=3))
    current = excitation(sections, np.full(LANES, 6e6), task.duty, task.construction)
    settings = Discretisation(
        resolution=Resolution(tooth=2, slot=2, tip=1, wedge=1, body=2, yoke=2),
        positions=8,
        cogging_positions=4,
        transient=True,
        newton=newton.Settings(tolerance=1e-8),
    )
    return analysis.solve(FieldModel(task, settings), sections, current), current


@pytest.mark.parametrize("numbers", [(12, 4, 5), (12, 5, 4)])
def test_drag_torque_makes_the_loss(numbers: machines.Numbers) -> None:
    """Without current all rotor loss comes from the shaft: mean torque times speed = -loss."""
    fields, _ = machine(numbers, "NiCr19NbMo")
    batch = fields.batch
    nothing = np.zeros(LANES)
    static = batch.solve_torque(batch.model.angles, nothing)
    rotor = eddy_rotor(batch, ONES)
    induced = transient.torque_field(batch, rotor, static, nothing)
    assert np.all(induced.unsettled <= transient.SETTLED)
    waves = induced.solution.waves
    torque = stress.torque(waves.orders, waves.potential, waves.tangential).mean(axis=0)
    check(
        "drag power of induced currents",
        -torque * batch.model.task.duty.speed,
        induced.loss.total,
        relative=5e-3,
        why="both sums stop at order 4 Q; rotor and stator agree to 1e-3 of h",
        source="first law: without current all rotor loss comes from the shaft",
    )


def test_static_analysis_suffices_for_torque_but_not_for_force() -> None:
    """Common practice; a titanium sleeve, suspension field of one pole pair against p = 2."""
    fields, current = machine((6, 2, 1), "TiAl6V4")
    found = analysis.evaluate(fields, current)
    assert np.all(found.converged)
    assert np.all(found.unsettled < 1e-2)
    static = analysis.evaluate(
        analysis.StaticFields(
            **{**vars(fields), "batch": _without_induction(fields.batch, fields)}
        ),
        current,
    )
    # The torque loses the drag of the rotor's loss and hardly anything else.
    drag = (found.field.loss_magnet + found.field.loss_sleeve) / fields.batch.model.task.duty.speed
    assert found.field.torque == pytest.approx(static.field.torque - drag, rel=0.02)
    bias = found.field.force_angle_bias
    assert bias is not None
    assert np.median(np.abs(np.degrees(bias))) > 5.0
    assert static.field.force_angle_bias is None
    # The command of the static field gives a force that is turned by just that.
    commanded = static.force.command(0.4, forward=False)  # suspension pole pairs below the magnets'
    force = found.force.at(current.suspension * commanded).mean(axis=0)
    assert np.angle(force * np.exp(-0.4j)) == pytest.approx(bias, abs=1e-9)


def _without_induction(batch: BatchField, fields: analysis.StaticFields) -> BatchField:
    model = batch.model
    still = FieldModel(model.task, replace(model.discretisation, transient=False))
    other = BatchField(still, fields.batch.sections)
    other.set_rotor_iron(batch.reluctivity)
    return other


def test_insulating_rotor_is_the_static_one() -> None:
    fields, current = machine((12, 4, 5), "Carbon fibre, wound")
    batch = fields.batch
    nothing = Conductors(1e-9, 1e-9, 1e-9, 2.0 * np.pi * ONES, np.inf * ONES, ONES, np.inf * ONES)
    rotor = EddyRotor(
        batch.rotor, batch.reluctivity, batch.model.discretisation.iron_rings, nothing
    )
    induced = transient.torque_field(batch, rotor, fields.loaded, current.torque)
    equations = batch.equations(batch.model.suspension)
    control = transient.suspension_field(batch, equations, rotor, fields.loaded)
    assert np.max(induced.loss.total) < 1e-6
    scale = np.max(np.abs(fields.small))
    # One ring of shaft instead of several has no part in the change of the response.
    assert np.max(np.abs(control.small - fields.small)) < 1e-9 * scale


@pytest.mark.parametrize("numbers", [(6, 2, 1), (12, 4, 5)])
def test_frequencies_of_the_suspension_field(numbers: machines.Numbers) -> None:
    """Watched from the rotor over one turn, order by order, by Fourier transform in time."""
    fields, current = machine(numbers, "NiCr19NbMo")
    batch = fields.batch
    model = batch.model
    equations = batch.equations(model.suspension)
    orders = transient.reacting_orders(batch, equations)
    sector, bore = model.symmetry.suspension, equations.topology.lattice.bore
    sixth = 4
    turn = 6 * model.pole_pairs * sixth
    angles = 2.0 * np.pi * np.arange(turn) / turn
    solution = batch.solve_torque(angles, current.torque, fields.loaded.nodes[0])
    small = analysis.suspension_field(batch, equations, solution)
    parts = batch.coefficients_both_sides(small, sector, bore, orders)
    potential = np.concatenate(parts, axis=1)
    harmonics = Harmonics.suspension(model, orders, angles[:sixth])
    amplitudes = harmonics.analyse(potential[:sixth])
    # The suspension currents turn with the rotor's p; its frame turns once a turn.
    turning = np.exp(1j * np.outer(angles, harmonics.orders + model.pole_pairs))
    seen = np.fft.fft(potential * turning[:, :, None], axis=0) / turn
    cycles = np.rint(harmonics.speed / model.task.duty.speed).astype(int)
    expected = np.zeros_like(seen)
    for k in range(harmonics.orders.size):
        expected[cycles[:, k] % turn, k] = amplitudes[:, k]
    # Newton's tolerance.
    assert np.max(np.abs(seen - expected)) < 1e-6 * np.max(np.abs(seen))
