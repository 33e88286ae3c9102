"""The saturated machine against NGSolve: independent mesh, elements, gap, rotor and force.

NGSolve meshes the whole circle with curved second-order triangles, rotor, magnets and gap included,
minimises the magnetic energy itself, and integrates Maxwell's stress over the gap (Arkkio's
method). Nothing but geometry, materials and currents is shared.
"""

from __future__ import annotations

from itertools import pairwise
from typing import Any

import machines
import numpy as np
import pytest
from numpy.typing import NDArray
from outside import OutsideChecks

from evaluators.finite_element.model import Discretisation, FieldModel
from evaluators.finite_element.outcome import nonlinear_force, stress
from evaluators.finite_element.solution.batch import BatchField
from evaluators.finite_element.solution.lanes import LANES
from evaluators.machine.field import excitation
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.materials.magnetization import MagnetizationCurve
from evaluators.machine.quantity import MU_0

ngsolve = pytest.importorskip("ngsolve")
occ = pytest.importorskip("netgen.occ")

FloatArray = NDArray[np.float64]

check = OutsideChecks("force", "NGSolve: mesh, elements, gap, rotor and force of its own")


def point(radius: float, angle: float) -> Any:
    return occ.Pnt(radius * np.cos(angle), radius * np.sin(angle), 0.0)


def sector_face(inner: float, outer: float, start: float, end: float) -> Any:
    """Part of a ring between two angles."""
    middle = 0.5 * (start + end)
    edges = [
        occ.Segment(point(inner, start), point(outer, start)),
        occ.ArcOfCircle(point(outer, start), point(outer, middle), point(outer, end)),
        occ.Segment(point(outer, end), point(inner, end)),
        occ.ArcOfCircle(point(inner, end), point(inner, middle), point(inner, start)),
    ]
    return occ.Face(occ.Wire(edges))


def slot_faces(sections: CrossSections, slot: int) -> tuple[Any, Any]:
    """Mouth (air) and wound part of a slot."""
    pitch = 2.0 * np.pi / sections.family.slots

    def wall(radius: float) -> float:
        half = float(sections.tooth_half_width(np.array([radius]))[0])
        return float(np.arcsin(half / radius))

    bore, tip, wedge, bottom = (
        float(item[0])
        for item in (
            sections.bore_radius,
            sections.tip_radius,
            sections.wedge_radius,
            sections.slot_radius,
        )
    )

    def between(radii: FloatArray) -> Any:
        left = [point(r, slot * pitch + wall(r)) for r in radii]
        right = [point(r, (slot + 1) * pitch - wall(r)) for r in radii]
        centre = (slot + 0.5) * pitch
        edges = [occ.Segment(a, b) for a, b in pairwise(left)]
        edges.append(occ.ArcOfCircle(left[-1], point(radii[-1], centre), right[-1]))
        edges += [occ.Segment(a, b) for a, b in pairwise(right[::-1])]
        edges.append(occ.ArcOfCircle(right[0], point(radii[0], centre), left[0]))
        return occ.Face(occ.Wire(edges))

    mouth = between(np.concatenate([[bore, tip], np.linspace(tip, wedge, 5)[1:]]))
    return mouth, between(np.array([wedge, bottom]))


def disc(radius: float) -> Any:
    return occ.Face(occ.Wire([occ.Circle(occ.Pnt(0, 0, 0), occ.Z, radius)]))


def energy_of(curve: MagnetizationCurve, b: Any) -> Any:
    """Energy density of a curve, integral of H dB, as a function of the modulus `b`."""
    knots, field, slopes = curve.flux_density_points, curve.field_points, curve.slopes
    pieces = []
    stored = 0.0
    for k in range(knots.size):
        if k + 1 < knots.size:
            width = knots[k + 1] - knots[k]
            secant = (field[k + 1] - field[k]) / width
            c2 = (3.0 * secant - 2.0 * slopes[k] - slopes[k + 1]) / width
            c3 = (slopes[k] + slopes[k + 1] - 2.0 * secant) / width**2
            c1 = slopes[k]
        else:
            width, c1, c2, c3 = 0.0, 1.0 / MU_0, 0.0, 0.0
        pieces.append((knots[k], stored, field[k], c1, c2, c3))
        stored += width * (field[k] + width * (c1 / 2 + width * (c2 / 3 + width * c3 / 4)))
    result = None
    for knot, start, c0, c1, c2, c3 in pieces:
        t = b - float(knot)
        value = float(start) + t * (
            float(c0) + t * (float(c1) / 2 + t * (float(c2) / 3 + t * float(c3) / 4))
        )
        result = value if result is None else ngsolve.IfPos(t, value, result)
    return result


def independent(
    model: FieldModel, sections: CrossSections, currents: FloatArray, angle: float
) -> tuple[float, complex, FloatArray]:
    """Torque, force and mean potential of the slots by NGSolve."""
    family = sections.family
    radii = {
        name: float(getattr(sections, f"{name}_radius")[0])
        for name in ("shaft", "core", "magnet", "rotor", "bore", "outer")
    }
    gap_inner = radii["rotor"] + 0.3 * (radii["bore"] - radii["rotor"])
    gap_outer = radii["rotor"] + 0.7 * (radii["bore"] - radii["rotor"])
    slots = [slot_faces(sections, s) for s in range(family.slots)]
    stator = disc(radii["outer"])
    stator.edges.name = "outer"
    stator = stator - disc(radii["bore"])
    for mouth, wound in slots:
        stator = stator - mouth - wound
    pitch = np.pi / family.pole_pairs
    half = 0.5 * pitch * float(sections.magnet_arc_ratio[0])
    magnets = [
        sector_face(
            radii["core"], radii["magnet"], angle + k * pitch - half, angle + k * pitch + half
        )
        for k in range(2 * family.pole_pairs)
    ]
    fine = 0.25 * (radii["bore"] - radii["rotor"])
    coarse = 0.06 * radii["bore"]

    def named(face: Any, name: str, size: float) -> Any:
        face.faces.name = name
        face.faces.maxh = size
        return face

    spaces = disc(radii["magnet"]) - disc(radii["core"])
    for magnet in magnets:
        spaces = spaces - magnet
    parts = [
        named(stator, "stator", coarse),
        named(disc(radii["shaft"]), "shaft", coarse),
        named(disc(radii["core"]) - disc(radii["shaft"]), "core", coarse),
        named(spaces, "space", 0.5 * coarse),
        named(disc(gap_inner) - disc(radii["magnet"]), "sleeve", 2 * fine),
        named(disc(gap_outer) - disc(gap_inner), "gap", fine),
        named(disc(radii["bore"]) - disc(gap_outer), "clearance", fine),
    ]
    parts += [named(face, f"magnet{k}", 0.5 * coarse) for k, face in enumerate(magnets)]
    for s, (mouth, wound) in enumerate(slots):
        parts += [named(mouth, "mouth", 0.3 * coarse), named(wound, f"slot{s}", coarse)]
    grid = ngsolve.Mesh(
        occ.OCCGeometry(occ.Glue(parts), dim=2).GenerateMesh(maxh=coarse, grading=0.4)
    )
    grid.Curve(2)

    space = ngsolve.H1(grid, order=2, dirichlet="outer")
    u = space.TrialFunction()
    gradient = ngsolve.grad(u)
    square = gradient * gradient
    modulus = ngsolve.sqrt(square + 1e-12)
    steels = {
        "stator": model.task.materials.stator_steel.magnetization.laminated(model.stacking),
        "core": model.rotor_curve,
        "shaft": model.shaft_curve,
    }
    form = ngsolve.BilinearForm(space)
    for name, curve in steels.items():
        form += ngsolve.Variation(
            energy_of(curve, modulus) * ngsolve.dx(definedon=grid.Materials(name))
        )
    nu_magnet = 1.0 / (MU_0 * model.recoil)
    ring = grid.Materials("space|magnet.*")
    form += ngsolve.Variation(0.5 * nu_magnet * square * ngsolve.dx(definedon=ring))
    air = grid.Materials("sleeve|gap|clearance|mouth|slot.*")
    form += ngsolve.Variation(0.5 / MU_0 * square * ngsolve.dx(definedon=air))
    for k in range(2 * family.pole_pairs):
        axis = angle + k * pitch
        mx, my = (-1) ** k * model.remanence * np.array([np.cos(axis), np.sin(axis)])
        # B = (dA/dy, -dA/dx): the work of the remanence is -nu Br . B.
        work = -nu_magnet * (float(mx) * gradient[1] - float(my) * gradient[0])
        form += ngsolve.Variation(work * ngsolve.dx(definedon=grid.Materials(f"magnet{k}")))
    areas = []
    for s in range(family.slots):
        wound_area = ngsolve.Integrate(
            ngsolve.CoefficientFunction(1.0), grid, definedon=grid.Materials(f"slot{s}$")
        )
        areas.append(wound_area)
        density = float(currents[s]) / wound_area
        form += ngsolve.Variation(-density * u * ngsolve.dx(definedon=grid.Materials(f"slot{s}$")))
    field = ngsolve.GridFunction(space)
    field.vec[:] = 0.0
    ngsolve.solvers.NewtonMinimization(
        form,
        field,
        linesearch=True,
        maxit=60,
        maxerr=1e-7,
        printing=False,
        inverse="sparsecholesky",
    )
    slope = ngsolve.grad(field)
    bx, by = slope[1], -slope[0]
    r = ngsolve.sqrt(ngsolve.x**2 + ngsolve.y**2)
    radial, tangential = (
        (ngsolve.x * bx + ngsolve.y * by) / r,
        (ngsolve.x * by - ngsolve.y * bx) / r,
    )
    gap = grid.Materials("gap")
    thickness = gap_outer - gap_inner
    torque = ngsolve.Integrate(r * radial * tangential, grid, definedon=gap, order=6)
    normal = 0.5 * (radial * radial - tangential * tangential)
    shear = radial * tangential
    force_x = ngsolve.Integrate(
        (normal * ngsolve.x - shear * ngsolve.y) / r, grid, definedon=gap, order=6
    )
    force_y = ngsolve.Integrate(
        (normal * ngsolve.y + shear * ngsolve.x) / r, grid, definedon=gap, order=6
    )
    scale = MU_0 * thickness
    means = [
        ngsolve.Integrate(field, grid, definedon=grid.Materials(f"slot{s}$")) / areas[s]
        for s in range(family.slots)
    ]
    return torque / scale, complex(force_x, force_y) / scale, np.array(means)


@pytest.mark.slow
@pytest.mark.parametrize("position", [0.0, 0.4, 0.75])
@pytest.mark.parametrize("numbers", [(12, 4, 5), (12, 1, 2)])
def test_saturated_machine(numbers: machines.Numbers, position: float) -> None:
    """Tooth coils and an integral-slot winding, teeth and yoke at 1.7 to 1.9 T."""
    task = machines.task(*numbers)
    changes = {
        "yoke_ratio": 0.75,
        "tooth_width_ratio": 0.42,
        "magnet_thickness_mm": 5.0,
        "current_density_A_mm2": 9.0,
    }
    sections = machines.sections(task, machines.designs(LANES, **changes))
    current = excitation(sections, np.full(LANES, 9e6), task.duty, task.construction)
    model = FieldModel(task, Discretisation())
    batch = BatchField(model, sections)
    batch.settle_rotor_iron(0.0, current.torque)
    angles = np.array([position * model.sixth])
    phasor = current.suspension * np.exp(0.3j)
    whole = batch.equations(model.whole)
    solution = nonlinear_force.solve(batch, whole, angles, current.torque, phasor)
    assert np.all(solution.converged)
    waves = solution.waves
    torque = stress.torque(waves.orders, waves.potential, waves.tangential)[0, 0]
    force = nonlinear_force.force(batch, solution)[0, 0]
    linkage = solution.linkage[0, :, 0]

    slot = task.winding
    turn = np.exp(1j * model.pole_pairs * angles[0])
    main = slot.torque_slot_mmf * turn * np.exp(1j * model.symmetry.torque_phase)
    control = slot.suspension_slot_mmf * turn * phasor[0]
    currents = np.real(current.torque[0] * main + control)
    other_torque, other_force, other_linkage = independent(
        model, sections, currents, float(angles[0])
    )
    why = "measured over the six cases: torque 0.1 %, force 0.3 %, flux 0.2 %"
    pairs = task.winding.coil_slots
    coils = linkage[pairs[:, 1]] - linkage[pairs[:, 0]]
    others = other_linkage[pairs[:, 1]] - other_linkage[pairs[:, 0]]
    largest = np.max(np.abs(others))
    what = "torque of saturated machines, finite elements"
    check(what, torque, other_torque, relative=5e-3, why=why)
    what = "force vector of saturated machines, finite elements"
    check(what, force, other_force, relative=5e-3, why=why)
    what = "flux linkages of the coils of saturated machines over the largest, finite elements"
    check(what, coils / largest, others / largest, absolute=5e-3, why=why)
