"""Eddy currents of separate magnets, each without net current, against NGSolve (time-harmonic).

A current sheet of one order on an iron bore, magnets of full segments between it and an iron core.
NGSolve meshes magnets and gap with third-order elements and gives every magnet segment its own
unknown voltage.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.finite_element.rotor.conducting_magnets import ConductingMagnets, Spaces
from evaluators.finite_element.rotor.eddy import Conductors, EddyRotor
from evaluators.finite_element.rotor.separate_magnets import Ring, ring_reluctivity
from evaluators.finite_element.rotor.uniform import NU_0, Rotor
from evaluators.finite_element.solution.lanes import LANES
from evaluators.machine.quantity import MU_0

ngsolve = pytest.importorskip("ngsolve")
occ = pytest.importorskip("netgen.occ")

CORE, MAGNET, BORE = 0.020, 0.024, 0.0255
RESISTIVITY, RECOIL, SHEET = 1.5e-6, 1.05, 1e4
ONES = np.ones(LANES)

check = OutsideChecks("losses", "NGSolve, third-order elements, a voltage for every segment")


def point(radius: float, angle: float) -> Any:
    return occ.Pnt(radius * np.cos(angle), radius * np.sin(angle), 0.0)


def disc(radius: float) -> Any:
    return occ.Face(occ.Wire([occ.Circle(occ.Pnt(0, 0, 0), occ.Z, radius)]))


def magnet_face(middle: float, half: float) -> Any:
    low, high = middle - half, middle + half
    return occ.Face(
        occ.Wire(
            [
                occ.Segment(point(CORE, low), point(MAGNET, low)),
                occ.ArcOfCircle(point(MAGNET, low), point(MAGNET, middle), point(MAGNET, high)),
                occ.Segment(point(MAGNET, high), point(CORE, high)),
                occ.ArcOfCircle(point(CORE, high), point(CORE, middle), point(CORE, low)),
            ]
        )
    )


@dataclass(frozen=True)
class Case:
    """Magnets over pole pitch in `segments` pieces each; `order` and `frequency` of the sheet."""

    pole_pairs: int
    arc: float
    order: int
    frequency: float
    segments: int = 1
    recoil: float = 1.05
    space: float = 1.05


def independent(case: Case) -> float:
    """Loss of all magnets, W/m."""
    pitch = np.pi / case.pole_pairs
    piece = case.arc * pitch / case.segments
    middles = [
        k * pitch + (s - 0.5 * (case.segments - 1)) * piece
        for k in range(2 * case.pole_pairs)
        for s in range(case.segments)
    ]
    magnets = [magnet_face(middle, 0.5 * piece) for middle in middles]
    gap = disc(BORE)
    gap.edges.name = "bore"
    gap = gap - disc(MAGNET)
    gap.faces.name = "gap"
    space = disc(MAGNET) - disc(CORE)
    for k, magnet in enumerate(magnets):
        space = space - magnet
        magnet.faces.name = f"magnet{k}"
    space.faces.name = "space"
    shape = occ.OCCGeometry(occ.Glue([gap, space, *magnets]), dim=2)
    grid = ngsolve.Mesh(shape.GenerateMesh(maxh=(MAGNET - CORE) / 3.0))
    grid.Curve(3)
    potential = ngsolve.H1(grid, order=3, complex=True)
    voltages = [ngsolve.NumberSpace(grid, complex=True) for _ in magnets]
    unknowns = ngsolve.FESpace([potential, *voltages])
    trial, test = unknowns.TrialFunction(), unknowns.TestFunction()
    omega, sigma = 2.0 * np.pi * case.frequency, 1.0 / RESISTIVITY
    form = ngsolve.BilinearForm(unknowns)
    stiff = ngsolve.grad(trial[0]) * ngsolve.grad(test[0])
    for permeability, name in ((1.0, "gap"), (case.space, "space"), (case.recoil, "magnet.*")):
        form += stiff / (MU_0 * permeability) * ngsolve.dx(definedon=grid.Materials(name))
    for k in range(len(magnets)):
        here = ngsolve.dx(definedon=grid.Materials(f"magnet{k}$"))
        current = 1j * omega * sigma * (trial[0] + trial[1 + k])
        form += current * (test[0] + test[1 + k]) * here
    # A constant potential with opposite voltages makes no field; this holds it near zero.
    form += 0.1 * trial[0] * test[0] * ngsolve.dx
    load = ngsolve.LinearForm(unknowns)
    angle = ngsolve.atan2(ngsolve.y, ngsolve.x)
    load += SHEET * ngsolve.exp(1j * case.order * angle) * test[0] * ngsolve.ds("bore")
    form.Assemble()
    load.Assemble()
    field = ngsolve.GridFunction(unknowns)
    field.vec.data = form.mat.Inverse(unknowns.FreeDofs(), inverse="umfpack") * load.vec
    total = 0.0
    for k in range(len(magnets)):
        current = 1j * omega * sigma * (field.components[0] + field.components[1 + k])
        density = 0.5 * RESISTIVITY * (current * ngsolve.Conj(current)).real
        total += ngsolve.Integrate(density, grid, definedon=grid.Materials(f"magnet{k}$"))
    return float(total)


@pytest.mark.slow
@pytest.mark.parametrize(
    "case",
    [
        # Suspension field and slotting of an eight-pole machine.
        Case(4, 0.85, 5, 800.0),
        Case(4, 0.85, 8, 9600.0),
        # Wide magnets; one order alone would be off by 4, 55 and 11 % here.
        Case(2, 0.85, 1, 800.0),
        Case(2, 0.85, 3, 9600.0),
        Case(1, 0.9, 5, 4800.0),
        # Insulated segments; spaces that are not as permeable as the magnets.
        Case(1, 0.9, 2, 4800.0, segments=3),
        Case(2, 0.7, 3, 9600.0, segments=2, recoil=1.3, space=1.0),
    ],
)
def test_loss_of_separate_magnets(case: Case) -> None:
    rotor = Rotor(
        np.array([[0.5 * CORE], [CORE]]) * ONES,
        MAGNET * ONES,
        0.5 * (MAGNET + BORE) * ONES,
        BORE * ONES,
        case.recoil,
        1.0,
    )
    piece = case.arc * np.pi / case.pole_pairs / case.segments
    parts = Conductors(
        0.0, 1.0 / RESISTIVITY, 0.0, piece * ONES, np.inf * ONES, case.arc * ONES, np.inf * ONES
    )
    eddy = EddyRotor(rotor, np.full((2, LANES), NU_0 / 1e9), 1, parts)
    every = np.arange(-48, 49)
    orders = every[((every - case.order) % (2 * case.pole_pairs) == 0) & (every != 0)]
    magnet = NU_0 / case.recoil
    nothing = np.zeros((1, LANES))
    ring = Ring(case.arc * ONES, case.pole_pairs, case.space, np.array([1]), nothing, nothing)
    along, across = ring_reluctivity(ring, orders, magnet)
    own = magnet * np.eye(orders.size)
    spaces = Spaces(along - own, across - own)
    magnets = ConductingMagnets(eddy, case.pole_pairs, case.segments, orders, spaces)
    answer = magnets.answer(np.array([2.0 * np.pi * case.frequency]))
    h = np.where(orders == case.order, 0.5 * BORE * SHEET, 0.0)[:, None]
    potential = np.linalg.solve(answer.response, h.astype(np.complex128))[..., 0]
    loss = answer.loss(potential)
    check(
        "eddy loss of separate magnets, orders together",
        loss.magnet[0],
        independent(case),
        relative=1e-3,
        why="without slots the mesh's and the orders' errors are small: measured 1e-4",
    )
    assert np.max(np.abs(loss.sleeve)) < 1e-9 * loss.magnet[0, 0]
