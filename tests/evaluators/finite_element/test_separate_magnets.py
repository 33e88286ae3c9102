"""Separate magnets with non-magnetic spaces between them."""

from __future__ import annotations

from dataclasses import replace

import machines
import numpy as np
import pytest
from numpy.typing import NDArray
from outside import OutsideChecks

from evaluators.finite_element import analysis, transient
from evaluators.finite_element.evaluator import FiniteElementEvaluator
from evaluators.finite_element.mesh.lattice import Resolution
from evaluators.finite_element.model import Discretisation, FieldModel
from evaluators.finite_element.rotor.answer import eddy_rotor
from evaluators.finite_element.rotor.eddy import Conductors, EddyRotor
from evaluators.finite_element.rotor.separate_magnets import Ring, SeparateMagnets, at_bore
from evaluators.finite_element.rotor.uniform import NU_0, Rotor, magnetisation
from evaluators.finite_element.solution.batch import BatchField
from evaluators.finite_element.solution.lanes import LANES
from evaluators.finite_element.solution.newton import Settings
from evaluators.interface import EvaluatorError
from evaluators.machine.field import Excitation, excitation

FloatArray = NDArray[np.float64]

check = OutsideChecks("field")

COARSE = Discretisation(
    resolution=Resolution(tooth=2, slot=2, tip=1, wedge=1, body=2, yoke=2),
    positions=6,
    cogging_positions=4,
    newton=Settings(tolerance=1e-8),
)


def machine(
    numbers: machines.Numbers, magnetisation: str = "radial", *, separate: bool = False
) -> tuple[FieldModel, analysis.StaticFields, Excitation]:
    task = machines.task(*numbers, construction={"magnetisation": magnetisation})
    sections = machines.sections(task, machines.scattered(LANES, seed=7))
    current = excitation(sections, np.full(LANES, 6e6), task.duty, task.construction)
    discretisation = Discretisation(**{**vars(COARSE), "separate_magnets": separate})
    model = FieldModel(task, discretisation)
    return model, analysis.solve(model, sections, current), current


@pytest.mark.parametrize("direction", ["radial", "parallel"])
@pytest.mark.parametrize("numbers", [(12, 1, 2), (12, 4, 5)])
def test_spaces_as_permeable_as_magnets_change_nothing(
    numbers: machines.Numbers, direction: str
) -> None:
    task = machines.task(*numbers, construction={"magnetisation": direction})
    sections = machines.sections(task, machines.scattered(LANES, seed=7))
    batch = BatchField(FieldModel(task, COARSE), sections)
    found = SeparateMagnets(batch, batch.model.recoil)
    # The same equations by two routes; measured 1e-13.
    assert np.max(np.abs(found.response)) < 1e-9 * batch.response.max()
    assert np.max(np.abs(found.source)) < 1e-9 * np.abs(batch.source).max()


@pytest.mark.parametrize("numbers", [(6, 2, 1), (12, 1, 2)])
def test_rounds_settle_on_a_small_change(numbers: machines.Numbers) -> None:
    _, uniform, current = machine(numbers)
    model, separate, _ = machine(numbers, separate=True)
    magnets = SeparateMagnets(separate.batch)
    again = magnets.torque_field(separate.batch, separate.loaded, current.torque)
    scale = np.max(np.abs(uniform.loaded.nodes))
    change = np.max(np.abs(separate.loaded.nodes - uniform.loaded.nodes)) / scale
    # A recoil permeability of 1.05 or so against 1 in a fraction of the ring.
    assert 1e-4 < change < 0.02
    left = np.max(np.abs(again.nodes - separate.loaded.nodes)) / scale
    assert left < 1e-3 * change
    before = analysis.evaluate(uniform, current).field
    after = analysis.evaluate(separate, current).field
    # Measured: torque up to 0.3 %, force up to 1.5 %.
    assert after.torque == pytest.approx(before.torque, rel=0.01)
    assert after.force == pytest.approx(before.force, rel=0.03)
    assert not np.array_equal(after.force, before.force)
    assert model.discretisation.separate_magnets


def insulating(batch: BatchField) -> EddyRotor:
    endless = np.full(LANES, np.inf)
    nothing = Conductors(
        1e-9, 1e-9, 1e-9, endless, endless, batch.sections.magnet_arc_ratio, endless
    )
    nothing = replace(nothing, segment_angle=np.pi / batch.model.pole_pairs * nothing.coverage)
    rings = batch.model.discretisation.iron_rings
    return EddyRotor(batch.rotor, batch.reluctivity, rings, nothing)


def test_insulating_separate_magnets_are_the_static_ones() -> None:
    _, fields, current = machine((6, 2, 1), separate=True)
    batch, separate = fields.batch, fields.separate
    assert separate is not None
    eddy = insulating(batch)
    main = transient.torque_field(batch, eddy, fields.loaded, current.torque, separate)
    assert np.max(main.loss.total) < 1e-6
    # The static rounds end a hundredth of a small correction off, about 1e-5.
    assert np.all(main.unsettled <= 1e-4)
    scale = np.max(np.abs(fields.loaded.nodes))
    assert np.max(np.abs(main.solution.nodes - fields.loaded.nodes)) < 1e-4 * scale
    equations = batch.equations(batch.model.suspension)
    control = transient.suspension_field(
        batch, equations, eddy, fields.loaded, separate, fields.added
    )
    scale = np.max(np.abs(fields.small))
    assert np.max(np.abs(control.small - fields.small)) < 1e-4 * scale
    for part, expected in zip(control.added, fields.added or (), strict=True):
        scale = np.max(np.abs(expected))
        assert np.max(np.abs(part - expected)) < 1e-2 * scale


def test_conducting_magnets_with_spaces_like_them_are_those_of_the_uniform_rotor() -> None:
    model, fields, current = machine((12, 1, 2))
    batch = fields.batch
    eddy = eddy_rotor(batch, np.ones(LANES))
    equations = batch.equations(model.suspension)
    alike = SeparateMagnets(batch, model.recoil * (1.0 + 1e-12))
    results = []
    for separate in (None, alike):
        main = transient.torque_field(batch, eddy, fields.loaded, current.torque, separate)
        control = transient.suspension_field(batch, equations, eddy, main.solution, separate)
        loss = control.loss(current.suspension)
        results.append((main.solution.nodes, control.small, main.loss.magnet, loss.magnet))
    for uniform, other in zip(*results, strict=True):
        assert np.max(np.abs(other - uniform)) < 1e-6 * np.max(np.abs(uniform))


def test_separate_magnets_conduct() -> None:
    """Lane by lane close to the uniform rotor, but not the same."""
    found = {}
    for separate in (False, True):
        model, fields, current = machine((6, 2, 1), separate=separate)
        model.discretisation = replace(model.discretisation, transient=True)
        result = analysis.evaluate(fields, current)
        assert np.all(result.converged)
        found[separate] = result.field
    # A recoil permeability of 1.05 or so against 1 in a fraction of the ring.
    for name in ("loss_magnet", "loss_sleeve", "force"):
        uniform, other = (getattr(found[key], name) for key in (False, True))
        assert other == pytest.approx(uniform, rel=0.05)
        assert not np.allclose(other, uniform, rtol=1e-4)


def test_settings() -> None:
    task = machines.task()
    chosen = FiniteElementEvaluator(task, {"rotor": "separate"}).model.discretisation
    assert chosen.separate_magnets
    both = {"rotor": "separate", "analysis": "transient"}
    chosen = FiniteElementEvaluator(task, both).model.discretisation
    assert chosen.separate_magnets
    assert chosen.transient
    with pytest.raises(EvaluatorError, match="rotor = 'round' must be uniform or separate"):
        FiniteElementEvaluator(task, {"rotor": "round"})


@pytest.mark.slow
@pytest.mark.parametrize(("direction", "driven"), [("radial", 2), ("parallel", 2), ("radial", 1)])
def test_against_scikit_fem(direction: str, driven: int) -> None:
    """A rotor on a mesh of its own: h on the bore for a potential of one order there.

    Order 1 is one of a suspension field, to which the magnets answer with order 3 as well; then
    they are without remanence.
    """
    skfem = pytest.importorskip("skfem")
    pairs, recoil, arc = 2, 1.3, 0.75
    remanence = 1.2 if driven == pairs else 0.0
    radii = np.array([12e-3, 20e-3, 24e-3, 24.5e-3, 25e-3])  # shaft, core, magnets, sleeve, bore
    core = NU_0 / 50.0  # so little that the core takes part
    ones = np.ones(1)
    rotor = Rotor(
        iron_radius=radii[:2, None] * ones,
        magnet_radius=radii[2] * ones,
        sleeve_radius=radii[3] * ones,
        bore_radius=radii[4] * ones,
        magnet_permeability=recoil,
        sleeve_permeability=1.0,
    )
    magnet_orders = np.arange(pairs, 200, 2 * pairs)
    parts = magnetisation(arc * ones, pairs, magnet_orders, direction)
    ring = Ring(arc * ones, pairs, 1.0, magnet_orders, remanence * parts[0], remanence * parts[1])
    potential = 2e-3  # Wb/m, times cos(driven phi)
    h: dict[int, complex] = {}
    for residue in {driven % (2 * pairs), -driven % (2 * pairs)}:
        orders = np.arange(residue - 96, 97 + residue, 2 * pairs)
        y, source = at_bore(rotor, np.full((2, 1), core), ring, orders)
        a = np.where(np.abs(orders) == driven, 0.5 * potential, 0.0)
        h |= dict(zip(orders.tolist(), y[0] @ a + source[0], strict=True))

    # Angle in the first coordinate, radius in the second; magnet flanks lie on element sides.
    half = 0.5 * np.pi / pairs * arc
    pole = np.pi / pairs
    breaks = [
        edge + k * pole
        for k in range(2 * pairs)
        for edge in (np.linspace(-half, half, 61), np.linspace(half, pole - half, 21))
    ]
    angle = np.unique(np.concatenate(breaks).round(14))
    radius = np.unique(
        np.concatenate(
            [np.geomspace(1e-4, radii[1], 41)]
            + [np.linspace(radii[k], radii[k + 1], n) for k, n in ((1, 25), (2, 5), (3, 5))]
        ).round(14)
    )
    grid = skfem.MeshQuad.init_tensor(angle, radius)
    basis = skfem.Basis(grid, skfem.ElementQuad2(), intorder=6)

    def region(x: FloatArray) -> tuple[FloatArray, FloatArray]:
        turn = np.rint(x[0] / pole)
        within = np.abs(x[0] - turn * pole) < half
        ring_here = (x[1] > radii[1]) & (x[1] < radii[2])
        strength = np.where(within & ring_here, remanence * (-1.0) ** turn, 0.0)
        nu = np.where(x[1] < radii[1], core, NU_0)
        return np.where(within & ring_here, NU_0 / recoil, nu), strength

    @skfem.BilinearForm
    def stiffness(u, v, w):  # type: ignore[no-untyped-def]
        nu, _ = region(w.x)
        r = w.x[1]
        return nu * (u.grad[0] * v.grad[0] / r + r * u.grad[1] * v.grad[1])

    @skfem.LinearForm
    def load(v, w):  # type: ignore[no-untyped-def]
        nu, strength = region(w.x)
        r = w.x[1]
        off = w.x[0] - np.rint(w.x[0] / pole) * pole if direction == "parallel" else 0.0 * r
        # B = (dA/dphi / r, -dA/dr).
        return nu * strength * (np.cos(off) * v.grad[0] + r * np.sin(off) * v.grad[1])

    matrix, right = stiffness.assemble(basis), load.assemble(basis)
    x = basis.doflocs
    low, high = x[0] < angle[0] + 1e-9, x[0] > angle[-1] - 1e-9
    outside, centre = x[1] > radii[4] - 1e-9, x[1] < radius[0] + 1e-9
    # Last column of nodes upon the first one.
    first = np.flatnonzero(low)[np.argsort(x[1][low])]
    last = np.flatnonzero(high)[np.argsort(x[1][high])]
    keep = np.setdiff1d(np.arange(basis.N), last)
    column = np.full(basis.N, -1)
    column[keep] = np.arange(keep.size)
    column[last] = column[first]
    from scipy.sparse import csr_matrix
    from scipy.sparse.linalg import spsolve

    fold = csr_matrix((np.ones(basis.N), (np.arange(basis.N), column)))
    matrix, right = (fold.T @ matrix @ fold).tocsr(), fold.T @ right
    place, fixed = x[:, keep], (outside | centre)[keep]
    values = np.where(outside[keep], potential * np.cos(driven * place[0]), 0.0)
    free = ~fixed
    values[free] = spsolve(
        matrix[free][:, free].tocsc(), right[free] - matrix[free][:, fixed] @ values[fixed]
    )
    reaction = matrix @ values - right
    largest = max(abs(value) for value in h.values())
    what = "tangential field of separate magnets at the bore over the largest order's"
    source = "scikit-fem, second-order elements on a mesh of its own"
    for order in (driven, 3 * driven, 5 * driven):
        for test, expected in ((np.cos, h[order].real), (np.sin, -h[order].imag)):
            weight = np.where(outside[keep], test(order * place[0]), 0.0)
            found = (reaction @ weight) / (2.0 * np.pi)
            why = "the mesh at the magnets' corners: measured 1e-4"
            check(what, expected / largest, found / largest, absolute=3e-4, why=why, source=source)
