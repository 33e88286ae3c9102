"""Outlines against the areas of the geometry and against plain flattening."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from machines import plain_machine
from outside import OutsideChecks

from evaluators.machine.geometry.outlines import Loop, Outline, outlines
from evaluators.machine.winding.families import design_winding

# The wedge side is drawn by arcs; everything else is exact to rounding.
WEDGE_TOLERANCE = 1e-6
ROUNDING = 1e-12

check = OutsideChecks("geometry")


def flattened(loop: Loop, steps: int = 400) -> np.ndarray:
    """Polygon of the ring by walking every arc from its centre; independent of `Loop.area`."""
    points = []
    start = loop.vertices[:, 0] + 1j * loop.vertices[:, 1]
    for a, b, bulge in zip(start, np.roll(start, -1), loop.bulges, strict=True):
        if bulge == 0.0:
            points.append([a])
            continue
        angle = 4.0 * np.arctan(bulge)
        centre = (b - a * np.exp(1j * angle)) / (1.0 - np.exp(1j * angle))
        turns = np.exp(1j * angle * np.arange(steps) / steps)
        points.append(list(centre + (a - centre) * turns))
    return np.concatenate([np.asarray(item) for item in points])


def polygon_area(points: np.ndarray) -> float:
    return float(0.5 * np.sum(np.imag(np.conj(points) * np.roll(points, -1))))


def total(parts: tuple[Outline, ...], part: str) -> float:
    return sum(item.area for item in parts if item.part == part)


@pytest.mark.parametrize("family", [(6, 2, 1), (12, 4, 5), (12, 2, 1), (24, 2, 1)])
@pytest.mark.parametrize("tip_span", [0.6, 1.0, 1.5])
def test_areas_equal_those_of_the_geometry(family: tuple[int, int, int], tip_span: float) -> None:
    sections, winding = plain_machine(*family, tip_span_ratio=tip_span)
    parts = outlines(sections, 0, winding)
    slots = family[0]
    for part, area in {
        "magnet": sections.magnet_area,
        "sleeve": sections.sleeve_area,
        "core": sections.core_area,
        "shaft": sections.shaft_area,
        "winding": slots * sections.slot_area,
    }.items():
        assert total(parts, part) == pytest.approx(1e6 * area[0], rel=ROUNDING), part
    slot = 1e6 * (sections.slot_area + sections.slot_mouth_area)[0]
    assert total(parts, "slot") == pytest.approx(slots * slot, rel=WEDGE_TOLERANCE)
    assert total(parts, "stator") == pytest.approx(
        1e6 * sections.stator_area[0], rel=WEDGE_TOLERANCE
    )
    sides = [item.area for item in parts if item.part == "winding"]
    np.testing.assert_allclose(sides, sides[0], rtol=ROUNDING)  # equal layers


@pytest.mark.parametrize("family", [(6, 2, 1), (12, 2, 1)])
def test_flattened_arcs_enclose_the_same_area(family: tuple[int, int, int]) -> None:
    sections, winding = plain_machine(*family)
    for item in outlines(sections, 0, winding):
        for loop in (item.outer, *item.holes):
            check(
                "area of the outlines of all parts",
                loop.area,
                polygon_area(flattened(loop)),
                relative=1e-3,
                why="400 chords in at most half a turn miss 1e-5 of their circle; thin rings lose "
                "more of themselves",
                source="polygons along the arcs, walked from their centres",
            )
            assert loop.area > 0.0


@settings(max_examples=40, deadline=None)
@given(
    span=st.floats(0.3, 1.7),
    width=st.floats(0.25, 0.75),
    wedge=st.floats(0.2, 6.0),
    tip=st.floats(0.2, 3.0),
)
def test_parts_fill_the_circle_without_overlap(
    span: float, width: float, wedge: float, tip: float
) -> None:
    changes = {
        "tip_span_ratio": span,
        "tooth_width_ratio": width,
        "wedge_height_mm": wedge,
        "tip_height_mm": tip,
    }
    sections, winding = plain_machine(12, 4, 5, **changes)
    parts = outlines(sections, 0, winding)
    outer = np.pi * (1e3 * sections.outer_radius[0]) ** 2
    bore, rotor = 1e3 * sections.bore_radius[0], 1e3 * sections.rotor_radius[0]
    magnets = 1e3 * sections.magnet_radius[0], 1e3 * sections.core_radius[0]
    between = (1.0 - sections.magnet_arc_ratio[0]) * np.pi * (magnets[0] ** 2 - magnets[1] ** 2)
    gap = np.pi * (bore**2 - rotor**2)
    solid = sum(total(parts, part) for part in ("stator", "slot", "magnet", "sleeve", "core"))
    solid += total(parts, "shaft")
    assert solid + gap + between == pytest.approx(outer, rel=1e-9)  # stator and slots share sides


def test_vertices_lie_on_the_walls() -> None:
    sections, winding = plain_machine(12, 4, 5)
    slot = next(item for item in outlines(sections, 0, winding) if item.part == "slot")
    points = slot.outer.vertices @ np.array([1.0, 1j])
    radius = np.abs(points)
    # Distance from the axis of tooth 0 or 1, whichever is nearer.
    across = np.abs(np.imag(points * np.exp(-2j * np.pi / 12 * (np.angle(points) > np.pi / 12))))
    np.testing.assert_allclose(
        across, 1e3 * sections.tooth_half_width(1e-3 * radius[None, :])[0], rtol=1e-9
    )


def test_layers_lie_where_the_winding_says() -> None:
    """Coil i of pitch 1 surrounds tooth i: both its sides touch that tooth."""
    sections, winding = plain_machine(12, 4, 5)
    parts = {item.number: item for item in outlines(sections, 0, winding) if item.part == "winding"}
    for side in winding.coil_sides:
        middle = parts[2 * side.slot + side.layer - 1].outer.vertices.mean(axis=0)
        axis = 2.0 * np.pi * side.coil / 12
        angle = np.angle(complex(*middle) * np.exp(-1j * axis))
        assert abs(angle) < np.pi / 12


def test_another_family_is_refused() -> None:
    sections, _ = plain_machine(12, 4, 5)
    with pytest.raises(ValueError, match="Q6p2s1"):
        outlines(sections, 0, design_winding(6, 2, 1))


@pytest.mark.parametrize("bulge", [1e-5, 2e-4, 2.6e-4, 1e-3])
def test_flat_arcs_enclose_a_flat_segment(bulge: float) -> None:
    """Chord 1, height bulge / 2."""
    loop = Loop(np.array([[0.0, 0.0], [1.0, 0.0]]), np.array([bulge, 0.0]))
    check(
        "area under a flat arc",
        loop.area,
        bulge / 3.0,
        relative=1e-5,
        why="the next term is of the order bulge squared; the difference of two sines loses digits",
        source="Archimedes: two thirds of the rectangle",
    )


def test_loop_checks_itself() -> None:
    with pytest.raises(ValueError, match="vertices"):
        Loop(np.zeros((1, 2)), np.zeros(1))
    with pytest.raises(ValueError, match="bulges"):
        Loop(np.zeros((3, 2)), np.zeros(2))
