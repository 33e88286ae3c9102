"""A turning machine by time stepping on meshes of NGSolve's, apart from the package's methods.

Stator and rotor are meshed apart, with curved second-order triangles, each magnet a conductor with
a voltage of its own. Fourier multipliers on a circle in the gap tie the two together at any angle;
time runs in steps of BDF2 (Hairer, Wanner, Solving Ordinary Differential Equations II, ch. V). The
iron is linear. Only geometry, materials and currents are taken from the package.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.sparse import csr_matrix
from scipy.sparse.linalg import splu

from evaluators.finite_element.model import FieldModel
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.quantity import MU_0

ngsolve = pytest.importorskip("ngsolve")
occ = pytest.importorskip("netgen.occ")

FloatArray = NDArray[np.float64]
IRON = 1000.0
"""Relative permeability of all iron."""


def point(radius: float, angle: float) -> Any:
    return occ.Pnt(radius * np.cos(angle), radius * np.sin(angle), 0.0)


def disc(radius: float) -> Any:
    return occ.Face(occ.Wire([occ.Circle(occ.Pnt(0, 0, 0), occ.Z, radius)]))


def arc(radius: float, start: float, end: float) -> Any:
    return occ.ArcOfCircle(
        point(radius, start), point(radius, 0.5 * (start + end)), point(radius, end)
    )


def sector_face(inner: float, outer: float, start: float, end: float) -> Any:
    return occ.Face(
        occ.Wire(
            [
                occ.Segment(point(inner, start), point(outer, start)),
                arc(outer, start, end),
                occ.Segment(point(outer, end), point(inner, end)),
                arc(inner, end, start),
            ]
        )
    )


def slot_faces(sections: CrossSections, slot: int) -> tuple[Any, Any]:
    """Mouth (air) and wound part of a slot."""
    pitch = 2.0 * np.pi / sections.family.slots
    bore, tip, wedge, bottom = (
        float(getattr(sections, f"{name}_radius")[0]) for name in ("bore", "tip", "wedge", "slot")
    )

    def between(radii: FloatArray) -> Any:
        half = [float(sections.tooth_half_width(np.array([r]))[0]) for r in radii]
        wall = np.arcsin(np.array(half) / radii)
        low, high = slot * pitch + wall, (slot + 1) * pitch - wall
        left = [point(r, a) for r, a in zip(radii, low, strict=True)]
        right = [point(r, a) for r, a in zip(radii, high, strict=True)]
        edges = [occ.Segment(a, b) for a, b in pairwise(left)]
        edges.append(arc(radii[-1], low[-1], high[-1]))
        edges += [occ.Segment(a, b) for a, b in pairwise(right[::-1])]
        edges.append(arc(radii[0], high[0], low[0]))
        return occ.Face(occ.Wire(edges))

    mouth = between(np.concatenate([[bore, tip], np.linspace(tip, wedge, 5)[1:]]))
    return mouth, between(np.array([wedge, bottom]))


def named(face: Any, name: str, size: float) -> Any:
    face.faces.name = name
    face.faces.maxh = size
    return face


def meshed(parts: list[Any], size: float) -> Any:
    geometry = occ.OCCGeometry(occ.Glue(parts), dim=2)
    grid = ngsolve.Mesh(geometry.GenerateMesh(maxh=size, grading=0.4))
    grid.Curve(2)
    return grid


def matrix_of(form: Any) -> csr_matrix:
    form.Assemble()
    rows, columns, values = form.mat.COO()
    size = form.space.ndof
    places = (np.array(rows), np.array(columns))
    return csr_matrix((np.array(values), places), shape=(size, size))


def vector_of(space: Any, integrand: Any) -> FloatArray:
    load = ngsolve.LinearForm(space)
    load += integrand
    load.Assemble()
    return load.vec.FV().NumPy().copy()


def harmonics_on(space: Any, edge: str, radius: float, highest: int) -> FloatArray:
    """Mean over the circle of test functions times 1, cos n phi, sin n phi, (dofs, 2 N + 1)."""
    v = space.TestFunction()
    phi = ngsolve.atan2(ngsolve.y, ngsolve.x)
    scale = 1.0 / (2.0 * np.pi * radius)
    columns = [vector_of(space, scale * v * ngsolve.ds(edge))]
    for shape in (ngsolve.cos, ngsolve.sin):
        columns += [
            vector_of(space, scale * shape(n * phi) * v * ngsolve.ds(edge, bonus_intorder=4))
            for n in range(1, highest + 1)
        ]
    return np.array(columns).T


class Stator:
    """Potential on the circle, (2 N + 1,), of multipliers there and of slot currents."""

    def __init__(self, sections: CrossSections, middle: float, highest: int) -> None:
        slots = [slot_faces(sections, s) for s in range(sections.family.slots)]
        bore, outer = float(sections.bore_radius[0]), float(sections.outer_radius[0])
        iron = disc(outer)
        iron.edges.name = "outer"
        iron = iron - disc(bore)
        for mouth, wound in slots:
            iron = iron - mouth - wound
        hole = disc(middle)
        hole.edges.name = "middle"
        clearance = disc(bore) - hole
        fine, coarse = 0.5 * (bore - middle), 0.06 * bore
        parts = [named(iron, "iron", coarse), named(clearance, "clearance", fine)]
        for s, (mouth, wound) in enumerate(slots):
            parts += [named(mouth, "mouth", 0.3 * coarse), named(wound, f"slot{s}", coarse)]
        grid = meshed(parts, coarse)
        space = ngsolve.H1(grid, order=2, dirichlet="outer")
        u, v = space.TnT()
        form = ngsolve.BilinearForm(space)
        stiff = ngsolve.grad(u) * ngsolve.grad(v) / MU_0
        form += stiff / IRON * ngsolve.dx(definedon=grid.Materials("iron"))
        form += stiff * ngsolve.dx(definedon=grid.Materials("clearance|mouth|slot.*"))
        free = np.array(list(space.FreeDofs()))
        solver = splu(matrix_of(form)[free][:, free].tocsc())
        edge = harmonics_on(space, "middle", middle, highest)[free]
        currents = []
        for s in range(len(slots)):
            here = grid.Materials(f"slot{s}$")
            area = ngsolve.Integrate(ngsolve.CoefficientFunction(1.0), grid, definedon=here)
            currents.append(vector_of(space, v / area * ngsolve.dx(definedon=here))[free])
        self.multipliers = edge.T @ solver.solve(edge)
        self.currents = edge.T @ solver.solve(np.array(currents).T)


@dataclass
class Conductor:
    """Nodes' share of a conductor's current, its conductance and the magnet's number or None."""

    share: FloatArray
    conductance: float
    mass: csr_matrix
    magnet: bool


class TurningRotor:
    """Rotor in its own frame."""

    def __init__(
        self,
        model: FieldModel,
        sections: CrossSections,
        middle: float,
        highest: int,
        space_permeability: float,
        conductivity: tuple[float, float],
    ) -> None:
        core, magnet, outside = (
            float(getattr(sections, f"{name}_radius")[0]) for name in ("core", "magnet", "rotor")
        )
        pairs = model.pole_pairs
        pitch = np.pi / pairs
        half = 0.5 * pitch * float(sections.magnet_arc_ratio[0])
        magnets = [
            sector_face(core, magnet, k * pitch - half, k * pitch + half) for k in range(2 * pairs)
        ]
        spaces = disc(magnet) - disc(core)
        for face in magnets:
            spaces = spaces - face
        clearance = disc(middle)
        clearance.edges.name = "middle"
        fine, coarse = 0.6 * (middle - outside), 0.12 * core
        thin = (magnet - core) / 5.0
        parts = [
            named(disc(core), "core", coarse),
            named(spaces, "space", thin),
            named(disc(outside) - disc(magnet), "sleeve", thin),
            named(clearance - disc(outside), "clearance", fine),
        ]
        parts += [named(face, f"magnet{k}_", thin) for k, face in enumerate(magnets)]
        grid = meshed(parts, coarse)
        space = ngsolve.H1(grid, order=2)
        u, v = space.TnT()
        form = ngsolve.BilinearForm(space)
        stiff = ngsolve.grad(u) * ngsolve.grad(v) / MU_0
        for name, mu in (
            ("core", IRON),
            ("space", space_permeability),
            ("sleeve", model.task.materials.sleeve.relative_permeability.value),
            ("clearance", 1.0),
            ("magnet.*", model.recoil),
        ):
            form += stiff / float(mu) * ngsolve.dx(definedon=grid.Materials(name))
        self.stiffness = matrix_of(form)
        self.load = np.zeros(space.ndof)
        gradient = ngsolve.grad(v)
        for k in range(2 * pairs):
            strength = (-1) ** k * model.remanence / (MU_0 * model.recoil)
            mx, my = strength * np.cos(k * pitch), strength * np.sin(k * pitch)
            work = float(mx) * gradient[1] - float(my) * gradient[0]
            here = grid.Materials(f"magnet{k}_")
            self.load += vector_of(space, work * ngsolve.dx(definedon=here))
        self.conductors = []
        for name in [f"magnet{k}_" for k in range(2 * pairs)] + ["sleeve"]:
            sigma = conductivity[name == "sleeve"]
            here = grid.Materials(name)
            form = ngsolve.BilinearForm(space)
            form += sigma * u * v * ngsolve.dx(definedon=here)
            unit = ngsolve.CoefficientFunction(sigma)
            self.conductors.append(
                Conductor(
                    vector_of(space, sigma * v * ngsolve.dx(definedon=here)),
                    ngsolve.Integrate(unit, grid, definedon=here),
                    matrix_of(form),
                    name != "sleeve",
                )
            )
        self.edge = harmonics_on(space, "middle", middle, highest)


@dataclass
class Run:
    """Potential and multipliers on the circle in the stator's frame, (steps, 2 N + 1); losses."""

    potential: FloatArray
    multipliers: FloatArray
    magnet: float
    sleeve: float


def turned(values: FloatArray, angle: float) -> FloatArray:
    """Coefficients of 1, cos, sin (2 N + 1, ...) of a picture turned by `angle`."""
    highest = (values.shape[0] - 1) // 2
    n = np.arange(1, highest + 1) * angle
    c, s = (f(n).reshape(-1, *[1] * (values.ndim - 1)) for f in (np.cos, np.sin))
    even, odd = values[1 : highest + 1], values[highest + 1 :]
    return np.concatenate([values[:1], c * even - s * odd, s * even + c * odd])


class Steps:
    """One BDF2 step of the rotor: sparse factor, voltages as a correction of low rank."""

    def __init__(self, rotor: TurningRotor, rate: float) -> None:
        self.mass = sum((item.mass for item in rotor.conductors[1:]), rotor.conductors[0].mass)
        self.share = np.array([item.share for item in rotor.conductors]).T
        self.conductance = np.array([item.conductance for item in rotor.conductors])
        self.rate = rate
        size = rotor.load.size
        # A constant potential makes no field: a little extra holds it near zero.
        extra = csr_matrix((np.full(size, 1e-9), (np.arange(size), np.arange(size))))
        self.solver = splu(
            (rate * self.mass + rotor.stiffness + extra).tocsc(),
            permc_spec="MMD_AT_PLUS_A",
            diag_pivot_thresh=0.0,
            options={"SymmetricMode": True},
        )
        self.of_share = self.solver.solve(self.share)
        self.inner = np.diag(self.conductance / rate) - self.share.T @ self.of_share

    def solve(self, right: FloatArray, net: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Potential and voltages for right-hand sides (size, k) and net currents / rate."""
        x = self.solver.solve(right)
        voltage = np.linalg.solve(self.inner, net - self.share.T @ x)
        return x - self.of_share @ voltage, voltage


def run(
    stator: Stator,
    rotor: TurningRotor,
    currents: FloatArray,
    magnets: FloatArray,
    step_time: float,
    turn: int,
) -> list[Run]:
    """Turn the rotor: `currents` (steps, slots, k) and magnets or not (k,) of k fields at once.

    Losses and results are those of the last `turn` steps.
    """
    rate = 1.5 / step_time
    # Currents start from a field at rest.
    moving, step = Steps(rotor, rate), Steps(rotor, 1e-6 * rate)
    kinds = magnets.size
    nothing = np.zeros((step.conductance.size, rotor.edge.shape[1]))
    answer, answer_voltage = step.solve(rotor.edge, nothing)
    own = rotor.edge.T @ answer
    load = np.outer(rotor.load, magnets)
    earlier = before = np.zeros((rotor.load.size, kinds))
    loss = np.zeros((step.conductance.size, kinds))
    potentials, multipliers = [], []
    for k, current in enumerate(currents):
        angle = 2.0 * np.pi * k / turn
        past = (-2.0 * before + 0.5 * earlier) / step_time
        if k == 1:
            step = moving
            answer, answer_voltage = step.solve(rotor.edge, nothing)
            own = rotor.edge.T @ answer
        free, free_voltage = step.solve(load - step.mass @ past, -step.share.T @ past / step.rate)
        # Rotor: a = edge free - own l; stator: a = Z l + b, both as seen from the stator.
        seen = turned(rotor.edge.T @ free, angle)
        rotor_part = turned(turned(own, angle).T, angle)
        source = stator.currents @ current
        multiplier = np.linalg.solve(stator.multipliers + rotor_part, seen - source)
        back = turned(multiplier, -angle)
        x, voltage = free - answer @ back, free_voltage - answer_voltage @ back
        if k == 0:
            earlier = before = x
            continue
        if k >= len(currents) - turn:
            change = rate * x + past
            for c, item in enumerate(rotor.conductors):
                square = np.sum(change * (item.mass @ change), axis=0)
                square += 2.0 * voltage[c] * (item.share @ change)
                loss[c] += (square + voltage[c] ** 2 * item.conductance) / turn
            potentials.append(stator.multipliers @ multiplier + source)
            multipliers.append(multiplier)
        earlier, before = before, x
    is_magnet = np.array([item.magnet for item in rotor.conductors])
    return [
        Run(a, h, magnet, sleeve)
        for a, h, magnet, sleeve in zip(
            np.array(potentials).transpose(2, 0, 1),
            np.array(multipliers).transpose(2, 0, 1),
            loss[is_magnet].sum(axis=0),
            loss[~is_magnet].sum(axis=0),
            strict=True,
        )
    ]


def cross_force(first: Run, second: Run, radius: float) -> NDArray[np.complex128]:
    """Maxwell stress of two fields together less that of each, summed over the circle, N/m."""
    highest = (first.potential.shape[1] - 1) // 2
    phi = 2.0 * np.pi * np.arange(4 * highest) / (4 * highest)
    n = np.arange(1, highest + 1)
    cos, sin = np.cos(np.outer(n, phi)), np.sin(np.outer(n, phi))

    def field(item: Run) -> tuple[FloatArray, FloatArray]:
        # Mean of A cos n phi is half the amplitude; multipliers times 1/(2 pi R) are H_phi.
        a = 2.0 * item.potential
        even, odd = a[:, 1 : highest + 1], a[:, highest + 1 :]
        radial = (-(even * n) @ sin + (odd * n) @ cos) / radius
        h = item.multipliers / (2.0 * np.pi * radius)
        tangential = h[:, 1 : highest + 1] @ cos + h[:, highest + 1 :] @ sin
        return radial, MU_0 * tangential

    (r1, t1), (r2, t2) = field(first), field(second)
    normal, shear = (r1 * r2 - t1 * t2) / MU_0, (r1 * t2 + t1 * r2) / MU_0
    step = radius * 2.0 * np.pi / phi.size
    return np.asarray(((normal + 1j * shear) * np.exp(1j * phi)).sum(axis=1) * step)
