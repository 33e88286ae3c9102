"""Laws that the saturated, slotted machine must obey, each computed here by another route."""

from __future__ import annotations

from math import gcd, lcm

import machines
import numpy as np
import pytest
from numpy.typing import NDArray
from outside import OutsideChecks

from evaluators.finite_element import analysis
from evaluators.finite_element.mesh.lattice import Resolution
from evaluators.finite_element.model import Discretisation, FieldModel
from evaluators.finite_element.outcome import losses, nonlinear_force, stress
from evaluators.finite_element.outcome.displacement import displaced, stiffness
from evaluators.finite_element.outcome.quantities import force_parts
from evaluators.finite_element.solution.batch import BatchField, Solution
from evaluators.finite_element.solution.lanes import LANES
from evaluators.finite_element.solution.newton import Settings
from evaluators.machine.field import Excitation, excitation
from evaluators.machine.losses.iron import iron_loss_from_waveform

check, check_losses = OutsideChecks("force"), OutsideChecks("losses")

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

# Laws of the discrete equations hold on any mesh, so a coarse one will do, solved to rounding.
COARSE = Discretisation(
    resolution=Resolution(tooth=2, slot=2, tip=1, wedge=1, body=2, yoke=2),
    positions=6,
    cogging_positions=4,
    newton=Settings(tolerance=1e-8),
)
# Odd and even p, ps above and below p, both signs of either sector, tooth coils and distributed.
NUMBERS = [
    (12, 4, 5),
    (12, 5, 4),
    (6, 2, 1),
    pytest.param((12, 1, 2), marks=pytest.mark.slow),
    pytest.param((24, 2, 1), marks=pytest.mark.slow),
    pytest.param((24, 4, 5), marks=pytest.mark.slow),
]


def machine(numbers: machines.Numbers) -> tuple[BatchField, Excitation]:
    """Eight designs of a family, from lightly loaded to heavily saturated."""
    task = machines.task(*numbers)
    batch = machines.scattered(LANES, seed=4)
    batch["yoke_ratio"] = np.linspace(0.6, 1.4, LANES)
    sections = machines.sections(task, batch)
    current = excitation(sections, np.full(LANES, 8e6), task.duty, task.construction)
    field = BatchField(FieldModel(task, COARSE), sections)
    field.settle_rotor_iron(0.0, current.torque)
    return field, current


def torque_of(solution: Solution) -> FloatArray:
    waves = solution.waves
    return stress.torque(waves.orders, waves.potential, waves.tangential)


def energy(batch: BatchField, solution: Solution, currents: FloatArray, angle: float) -> FloatArray:
    """Stationary functional of the sector, (LANES,) J/m: field energy minus work of currents.

    Energy of the iron by quadrature of H dB, of the air from B, of gap and rotor from the boundary:
    pi sum over n of y |a|^2 + 2 Re(s exp(-j n angle) conj(a)), up to a constant.
    """
    model, mesh = batch.model, batch.mesh
    lattice = model.torque.lattice
    nodes = solution.nodes[0]
    padded = np.concatenate([nodes, np.zeros((1, LANES))])
    local = padded[lattice.cells] * lattice.cell_signs[..., None]
    flux = np.einsum("rcqadl,srcal->srcqdl", mesh.gradient, local)
    density = np.sqrt(np.sum(flux**2, axis=4))
    curve = model.task.materials.stator_steel.magnetization.laminated(model.stacking)
    points, weights = np.polynomial.legendre.leggauss(40)
    share = 0.5 * (points + 1.0)
    iron = sum(
        0.5 * w * density * curve.field(x * density) for x, w in zip(share, weights, strict=True)
    )
    air = density**2 / (2.0 * 4e-7 * np.pi)
    value = np.where(lattice.iron[None, :, :, None, None], iron, air)
    total = np.einsum("rcql,srcql->l", mesh.weight, value)
    total -= np.sum(currents * solution.linkage[0], axis=0)
    sector = lattice.sector
    orders = batch.gap.class_orders(sector)
    bore = nodes[lattice.bore]
    a = batch.gap.coefficients(bore, sector, orders)
    quadratic = np.sum(batch.response[orders] * np.abs(a) ** 2, axis=0)
    place = np.searchsorted(orders, model.magnet_orders)
    turned = batch.source * np.exp(-1j * model.magnet_orders * angle)[:, None]
    linear = 2.0 * np.sum(np.real(turned * np.conj(a[place])), axis=0)
    # Positive orders only, hence twice; the coefficients are those of the whole circle.
    return total + 2.0 * np.pi * (quadratic + linear) / sector.count


@pytest.mark.parametrize("numbers", NUMBERS[:3])
def test_torque_is_the_derivative_of_energy(numbers: machines.Numbers) -> None:
    """At constant currents."""
    batch, current = machine(numbers)
    angle, step = 0.31 * batch.model.sixth, 1e-4
    slots = batch.model.torque.lattice.slots
    currents = batch.torque_currents(np.array([angle]), current.torque, slots)
    ends = []
    for moved in (angle - step, angle + step):
        solution = batch.solve(batch.torque, np.array([moved]), currents)
        ends.append(energy(batch, solution, currents[0], moved))
    expected = -(ends[1] - ends[0]) / (2.0 * step) * batch.model.symmetry.torque.count
    found = torque_of(batch.solve(batch.torque, np.array([angle]), currents))[0]
    check(
        "torque of saturated machines",
        found,
        expected,
        relative=2e-4,
        why="exact up to the orders left out of the sum (measured 3e-5); the difference leaves "
        "the square of its step",
        source="virtual work: derivative of the field's functional by the angle",
    )


@pytest.mark.parametrize("numbers", NUMBERS)
def test_small_suspension_current_superposes(numbers: machines.Numbers) -> None:
    """The tangent's force is the derivative of the full nonlinear force by the current."""
    batch, current = machine(numbers)
    model = batch.model
    fields = analysis.solve(model, batch.sections, current)
    force = analysis.evaluate(fields, current).force
    whole = fields.batch.equations(model.whole)
    source, factor = model.unfold(model.whole)
    t = 2
    angles = model.angles[[t]]
    start = fields.loaded.nodes[t][source] * factor[:, None]
    phasor = 0.02 * current.suspension * np.exp(0.7j)
    ends = [
        nonlinear_force.force(
            fields.batch,
            nonlinear_force.solve(
                fields.batch, whole, angles, current.torque, sign * phasor, start
            ),
        )[0]
        for sign in (1.0, -1.0)
    ]
    found = 0.5 * (ends[0] - ends[1])
    fine = t * force.direct.shape[0] // (6 * model.pole_pairs * COARSE.positions)
    direct, mirrored = force.direct[fine], force.mirrored[fine]
    expected = direct * phasor + mirrored * np.conj(phasor)
    scale = np.abs(direct * phasor) + np.abs(mirrored * phasor)
    check(
        "force of a small suspension current in saturated machines",
        found / scale,
        expected / scale,
        absolute=5e-3,
        why="third order in a current of 0.2 % of the slot current; where teeth graze the knee of "
        "the piecewise curve, measured up to 2e-3",
        source="difference of nonlinear fields of the whole circle",
    )
    # No suspension current, no force.
    assert np.max(np.abs(0.5 * (ends[0] + ends[1])) / scale) < 5e-3


@pytest.mark.parametrize("numbers", NUMBERS)
def test_sixty_electrical_degrees_make_the_whole_turn(numbers: machines.Numbers) -> None:
    """Torque and force at positions elsewhere in the turn, solved there, fit the continuation."""
    batch, current = machine(numbers)
    model = batch.model
    fields = analysis.solve(model, batch.sections, current)
    result = analysis.evaluate(fields, current)
    for m in (1, 3, 6 * model.pole_pairs - 1):
        there = model.angles + m * model.sixth
        loaded = fields.batch.solve_torque(there, current.torque)
        assert torque_of(loaded) == pytest.approx(torque_of(fields.loaded), rel=1e-6)
        equations = fields.batch.equations(model.suspension)
        small = analysis.suspension_field(fields.batch, equations, loaded)
        _, direct, mirrored = force_parts(fields.batch, loaded, small)
        step = result.force.direct.shape[0] // (6 * model.pole_pairs)
        fine = m * step + np.arange(COARSE.positions) * (step // COARSE.positions)
        size = np.abs(direct) + np.abs(mirrored)
        assert np.max(np.abs(direct - result.force.direct[fine]) / size) < 1e-6
        assert np.max(np.abs(mirrored - result.force.mirrored[fine]) / size) < 1e-6


@pytest.mark.parametrize("numbers", [(12, 4, 5), (12, 5, 4)])
def test_cogging_has_lcm_periods(numbers: machines.Numbers) -> None:
    batch, _ = machine(numbers)
    period = 2.0 * np.pi / lcm(numbers[0], 2 * numbers[1])
    angles = np.array([0.2, 0.45, 0.2 + 1.0, 0.45 + 1.0, 0.7]) * period
    torque = torque_of(batch.solve_torque(angles, np.zeros(LANES)))
    swing = np.ptp(torque, axis=0).max()
    check(
        "cogging torque a whole number of periods further on over its swing",
        torque[2:4] / swing,
        torque[:2] / swing,
        absolute=1e-6,
        why="the fields are solved to 1e-8",
        source="lcm(Q, 2p) periods in a turn: Zhu, Howe, IEEE Trans. Energy Conv. 15(4), 2000",
    )
    # Half a period apart it differs: the period is no smaller.
    assert np.all(np.abs(torque[4] - torque[0]) > 0.1 * np.ptp(torque, axis=0))


def test_stiffness_hardly_depends_on_position() -> None:
    """It pulls outwards, and hardly depends on the position: the mean gap field makes it.

    Its size is checked against closed forms in `test_slotless_limit.py`.
    """
    batch, _ = machine((12, 4, 5))
    angles = np.array([0.0, 0.03])
    unloaded = batch.solve_torque(angles, np.zeros(LANES))
    equations = batch.equations(batch.model.suspension)
    found = stiffness(batch, unloaded, [0, 1], equations)
    # Measured 0.2 %, or 2 % in the most saturated of the eight.
    assert found[0] == pytest.approx(found[1], rel=0.05)
    assert np.all(found > 0.0)


@pytest.mark.parametrize("numbers", NUMBERS[:3])
def test_force_per_current_is_linkage_per_displacement(numbers: machines.Numbers) -> None:
    batch, current = machine(numbers)
    model = batch.model
    solution = batch.solve_torque(model.angles[:2], current.torque)
    equations = batch.equations(model.suspension)
    small = analysis.suspension_field(batch, equations, solution)
    _, direct, mirrored = force_parts(batch, solution, small)
    phase = np.exp(1j * model.pole_pairs * solution.waves.angles)[:, None]
    moved = batch.slot_means(model.suspension, displaced(batch, solution, [0, 1], equations))
    sector = model.symmetry.suspension
    pattern = model.task.winding.suspension_slot_mmf[: sector.slots]
    for phasor, currents in ((1.0, pattern.real), (1j, (1j * pattern).real)):
        # Currents of the slots themselves: take the turning of the phasor back.
        force = direct * phasor / phase + mirrored * np.conj(phasor) * phase
        linkage = sector.count * np.einsum("s,tsl->tl", currents, moved)
        largest = np.max(np.abs(force))
        check(
            "force per suspension current at load over the largest",
            force / largest,
            linkage / largest,
            absolute=1e-10,
            why="exact in the discrete equations: the tangent is symmetric",
            source="flux linkage per displacement: both are the mixed derivative of coenergy",
        )


@pytest.mark.parametrize("numbers", [(6, 2, 1), (12, 4, 5), (12, 5, 4)])
def test_no_load_stress_has_orders_of_the_gcd(numbers: machines.Numbers) -> None:
    """Multiples of gcd(Q, 2p).

    The whole circle is solved, so that no symmetry is put in. Equal halves of the phases ask for an
    even number of slots, so that the divisor is never one and there is no pull without current.
    """
    batch, _ = machine(numbers)
    model = batch.model
    angles, nothing = np.array([0.013]), np.zeros(LANES)
    whole = batch.equations(model.whole)
    solution = nonlinear_force.solve(batch, whole, angles, nothing, nothing + 0j)
    waves, highest = solution.waves, batch.highest_wave
    radius = batch.sections.bore_radius
    u = stress.rotating(
        stress.spread(waves.orders, waves.potential, highest),
        stress.spread(waves.orders, waves.tangential, highest),
        radius,
    )[0, :, 0]
    phi = 2.0 * np.pi * np.arange(4096) / 4096
    field = np.exp(1j * np.outer(phi, np.arange(-highest, highest + 1))) @ u
    spectrum = np.abs(np.fft.fft((field**2).real))[:40] / phi.size
    step = gcd(numbers[0], 2 * numbers[1])
    order = np.arange(spectrum.size)
    check(
        "no-load stress in orders that are no multiples of gcd(Q, 2p), over the mean",
        spectrum[order % step != 0] / spectrum[0],
        0.0,
        absolute=1e-10,
        why="rounding; the order gcd(Q, 2p) itself is above 1e-2",
        source="Zhu, Ishak, Howe, Chen, IEEE Trans. Ind. Appl. 43(6), 2007: none",
    )
    assert spectrum[step] > 1e-2 * spectrum[0]
    pull = np.abs(nonlinear_force.force(batch, solution))[0]
    # Against the mean stress all along the bore on one side.
    assert np.all(pull < 1e-8 * np.pi * radius / stress.MU_0 * spectrum[0])


def test_iron_loss_of_a_cell_is_that_of_its_waveform() -> None:
    """The compiled loop against `iron_loss_from_waveform`, fields gathered position by position."""
    batch, current = machine((12, 4, 5))
    model = batch.model
    solution = batch.solve_torque(model.angles, current.torque)
    parts = losses.iron_loss(batch, solution)
    # The whole period solved outright instead of continued from a sixth.
    angles = 2.0 * np.pi / model.pole_pairs * np.arange(36) / 36
    period = batch.solve_torque(angles, current.torque)
    lattice, mesh = model.torque.lattice, batch.mesh
    padded = np.concatenate([period.nodes, np.zeros((36, 1, LANES))], axis=1)
    local = padded[:, lattice.cells] * lattice.cell_signs[..., None]
    bx = np.einsum("rcqal,tsrcal->srcqlt", mesh.gradient[..., 1, :], local)
    by = -np.einsum("rcqal,tsrcal->srcqlt", mesh.gradient[..., 0, :], local)
    middle = mesh.angle[1::2, 1::2][:, :, None, :, None]
    radial = np.cos(middle) * bx + np.sin(middle) * by
    tangential = np.cos(middle) * by - np.sin(middle) * bx
    steel = model.task.materials.stator_steel
    loss = iron_loss_from_waveform(
        steel.losses,
        radial / model.stacking,
        model.task.electrical_frequency,
        tangential / model.stacking,
        minor_loops=True,
        smooth=True,
    )
    density = float(steel.density.value) * model.stacking
    sectors = model.symmetry.torque.count
    for mask, part in ((lattice.iron & ~lattice.yoke, parts.teeth), (lattice.yoke, parts.yoke)):
        weight = mesh.weight[mask] * density * sectors
        for found, per_mass in zip(part, loss, strict=True):
            expected = np.einsum("cql,scql->l", weight, per_mass[:, mask])
            check_losses(
                "iron loss of teeth and yoke by mechanism, finite elements",
                found,
                expected,
                relative=1e-6,
                why="same law, same samples; the fields are solved to 1e-8",
                source="the law by waveform in plain NumPy, period solved position by position",
            )
