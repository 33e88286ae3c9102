"""The batched kernels against plain NumPy and SciPy, which compute the same by other means."""

from __future__ import annotations

import machines
import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.finite_element import analysis
from evaluators.finite_element.mesh.lattice import Lattice, Resolution
from evaluators.finite_element.mesh.symmetry import Sector
from evaluators.finite_element.model import Discretisation, FieldModel
from evaluators.finite_element.outcome import stress
from evaluators.finite_element.solution import factor, newton
from evaluators.finite_element.solution.batch import BatchField
from evaluators.finite_element.solution.lanes import LANES
from evaluators.finite_element.solution.reference import SciPySolver, full_matrix, tangent
from evaluators.finite_element.solution.system import CurveTable, Topology, reluctivity
from evaluators.machine.field import Excitation, excitation

COARSE = Discretisation(
    resolution=Resolution(tooth=2, slot=2, tip=1, wedge=1, body=2, yoke=2),
    positions=4,
    cogging_positions=4,
)

check = OutsideChecks("field")


@pytest.fixture(scope="module")
def batch() -> BatchField:
    task = machines.task(12, 4, 5)
    sections = machines.sections(task, machines.scattered(LANES, seed=3))
    return BatchField(FieldModel(task, COARSE), sections)


def current_of(batch: BatchField) -> Excitation:
    task = batch.model.task
    density = np.full(LANES, 8e6)
    return excitation(batch.sections, density, task.duty, task.construction)


@pytest.mark.parametrize("slots", [1, 3, 6])
@pytest.mark.parametrize("sign", [1, -1])
def test_factorisation_solves_any_matrix_of_the_pattern(slots: int, sign: int) -> None:
    topology = Topology(Lattice(COARSE.resolution, Sector(slots, 2, sign)))
    pattern = topology.pattern
    generator = np.random.default_rng(slots)
    values = generator.uniform(-1.0, 1.0, (pattern.entries, LANES))
    diagonal = pattern.row == pattern.column
    # Larger than any row sum: positive definite by Gershgorin's theorem.
    values[diagonal] = 2.0 * topology.lattice.bore.size + generator.uniform(
        40.0, 80.0, (pattern.size, LANES)
    )
    load = generator.normal(size=(pattern.size, LANES))
    solver = newton.BatchSolver(pattern)
    solver.factorise(values)
    found = solver.solve(load)
    for lane in range(LANES):
        rest = full_matrix(pattern, values[:, lane]) @ found[:, lane] - load[:, lane]
        # Backward stable elimination of a well-conditioned matrix: rounding of its row sums.
        assert np.max(np.abs(rest)) < 1e-12


def test_pattern_holds_the_fill_in() -> None:
    """The factor's pattern must contain that of L from a dense elimination."""
    topology = Topology(Lattice(Resolution(1, 1, 1, 1, 1, 1), Sector(2, 2, 1)))
    pattern: factor.Pattern = topology.pattern
    dense = np.zeros((pattern.size, pattern.size))
    dense[pattern.row, pattern.column] = -1.0
    dense += dense.T
    np.fill_diagonal(dense, 2.0 * pattern.size)
    lower = np.linalg.cholesky(dense)
    owner = np.repeat(np.arange(pattern.size), np.diff(pattern.start.astype(np.int64)))
    held = np.zeros_like(lower, dtype=bool)
    held[pattern.index, owner] = True
    needed = (np.abs(lower) > 1e-15) & ~np.eye(pattern.size, dtype=bool)
    assert not np.any(needed & ~held)


def test_curve_table_is_the_magnetization_curve(batch: BatchField) -> None:
    curve = batch.model.task.materials.stator_steel.magnetization.laminated(batch.model.stacking)
    table = CurveTable.of(curve)
    square = np.concatenate([np.linspace(0.0, 12.0, 997), curve.flux_density_points**2])
    expected, derivative = curve.reluctivity(square)
    found = np.array([reluctivity(b, *table.arrays) for b in square])
    assert found[:, 0] == pytest.approx(expected, rel=1e-12)
    # The derivative is a small difference of large numbers at low density.
    assert found[:, 1] == pytest.approx(2.0 * derivative, rel=1e-9, abs=1e-9 * derivative.max())


def test_assembly(batch: BatchField) -> None:
    """Residual and tangent of two lanes at a random, partly saturated state."""
    system, topology = batch.torque.system, batch.model.torque
    generator = np.random.default_rng(1)
    nodes = batch.solve_torque(np.zeros(1), current_of(batch).torque).nodes[0]
    nodes = nodes * generator.uniform(0.7, 1.3, nodes.shape)
    residual, values = system.tangent(nodes, np.zeros_like(nodes))
    curve = batch.model.task.materials.stator_steel.magnetization.laminated(batch.model.stacking)
    blocks = batch.gap.stiffness(batch.model.symmetry.torque)
    slots, per_slot = topology.lattice.bore.shape
    for lane in (0, LANES - 1):
        gap = np.empty((slots * per_slot, slots * per_slot))
        for a in range(slots):
            for b in range(slots):
                block = blocks[b - a, ..., lane] if b >= a else blocks[a - b, ..., lane].T
                gap[a * per_slot : (a + 1) * per_slot, b * per_slot : (b + 1) * per_slot] = block
        force, matrix = tangent(
            topology,
            system.gradient[..., lane],
            system.weight[..., lane],
            curve,
            gap,
            nodes[:, lane],
        )
        words = {"why": "rounding of sums", "source": "plain NumPy and SciPy, element by element"}
        scale = np.max(np.abs(force))
        what = "residual of the finite elements over the largest"
        check(what, residual[:, lane] / scale, force / scale, absolute=1e-11, **words)
        whole = matrix.toarray()
        largest = np.max(np.abs(whole))
        found = full_matrix(topology.pattern, values[:, lane]).toarray()
        what = "tangent of the finite elements over the largest entry"
        check(what, found / largest, whole / largest, absolute=1e-10, **words)


def test_tangent_is_the_derivative_of_the_residual(batch: BatchField) -> None:
    system, topology = batch.torque.system, batch.model.torque
    nodes = batch.solve_torque(np.zeros(1), current_of(batch).torque).nodes[0]
    nothing = np.zeros_like(nodes)
    direction = np.random.default_rng(2).normal(size=nodes.shape) * np.abs(nodes).max()
    step = 1e-6
    ahead = system.residual(nodes + step * direction, nothing)
    behind = system.residual(nodes - step * direction, nothing)
    slope = (ahead - behind) / (2.0 * step)
    _, values = system.tangent(nodes, nothing)
    for lane in range(LANES):
        expected = full_matrix(topology.pattern, values[:, lane]) @ direction[:, lane]
        largest = np.max(np.abs(expected))
        check(
            "tangent along a random direction over the largest",
            expected / largest,
            slope[:, lane] / largest,
            absolute=1e-5,
            why="the third derivative of H(B) leaves about step²; kinks of the piecewise cubic "
            "curve leave a step of 1e-6 at the few points that cross one",
            source="central difference of the residual",
        )


def test_whole_analysis_with_scipy(batch: BatchField) -> None:
    current = current_of(batch)
    fast = analysis.solve(batch.model, batch.sections, current)
    slow = analysis.solve(batch.model, batch.sections, current, SciPySolver)
    assert np.all(fast.converged)
    a = analysis.evaluate(fast, current).field
    b = analysis.evaluate(slow, current).field
    for name, value in vars(a).items():
        if value is not None:
            check(
                "all quantities of the field of a batch of machines",
                value,
                getattr(b, name),
                relative=1e-7,
                absolute=1e-12,
                why="both stop after the same steps; what differs is rounding, amplified in "
                "differences such as cogging",
                source="SciPy's LU in place of the batched factorisation",
            )


def test_newton_converges_quadratically(batch: BatchField) -> None:
    current = current_of(batch)
    load = np.zeros((batch.model.torque.size, LANES))
    load[batch.model.torque.lattice.bore] = batch.magnet_load(np.zeros(1), 3)[0]
    batch.add_currents(
        load, batch.model.torque, batch.torque_currents(np.zeros(1), current.torque, 3)[0]
    )
    settings = newton.Settings(tolerance=1e-12)
    solver = newton.BatchSolver(batch.model.torque.pattern)
    _, state = newton.solve(batch.torque.system, solver, np.zeros_like(load), load, settings)
    assert np.all(state.converged)
    history = np.array(state.history) / np.linalg.norm(load, axis=0)
    for lane in range(LANES):
        norms = history[:, lane]
        last = int(np.flatnonzero(norms > 1e-12)[-1])  # beyond is rounding
        early, now, after = norms[last - 2 : last + 1]
        # Order from three residuals, 2 in the limit; measured 1.9 to 2.03.
        assert np.log(after / now) / np.log(now / early) > 1.7


def test_lanes_do_not_disturb_each_other(batch: BatchField) -> None:
    """A design gives the same bits whoever its neighbours are."""
    current = current_of(batch)
    order = np.array([3, 0, 0, 5, 1, 7, 7, 2])
    mixed = BatchField(batch.model, batch.sections.rows(order))
    angles = batch.model.angles
    nodes = batch.solve_torque(angles, current.torque)
    other = mixed.solve_torque(angles, current.torque[order])
    assert np.array_equal(nodes.nodes[..., order], other.nodes)
    torque = stress.torque(nodes.waves.orders, nodes.waves.potential, nodes.waves.tangential)
    turned = stress.torque(other.waves.orders, other.waves.potential, other.waves.tangential)
    assert np.array_equal(torque[:, order], turned)
