"""Drawings as SVG: well-formed, true to scale, complete, the same every time."""

from __future__ import annotations

import math
import re
import xml.etree.ElementTree as ET

import pytest
from machines import PLAIN, plain_machine

from evaluators.machine.winding.families import design_winding
from studies.drawing.cross_section import cross_section_svg
from studies.drawing.palette import FAMILY_COLOURS, MARKERS, family_mark
from studies.drawing.slot_detail import slot_detail_svg, slot_measures
from studies.drawing.svg import number, scale_bar_length
from studies.drawing.winding_diagram import winding_svg

NAME = 'Q<b>"&1'


def parsed(svg: str) -> ET.Element:
    root = ET.fromstring(svg)  # noqa: S314
    assert root.get("role") == "img"
    assert root.get("aria-label")
    return root


def tags(root: ET.Element, name: str) -> list[ET.Element]:
    return [item for item in root.iter() if item.tag.rpartition("}")[2] == name]


@pytest.mark.parametrize("family", [(6, 2, 1), (12, 4, 5), (24, 2, 1)])
def test_cross_section_shows_every_part_once(family: tuple[int, int, int]) -> None:
    sections, winding = plain_machine(*family)
    svg = cross_section_svg(sections, 0, winding, NAME, "key")
    root = parsed(svg)
    assert NAME in str(root.get("aria-label"))
    used = [item.get("href") for item in tags(root, "use")]
    slots = family[0]
    assert used.count("#key-s") == slots
    assert used.count("#key-l1") == used.count("#key-l2") == slots
    # As many dots as crosses: every coil has a side of each sense.
    assert used.count("#key-o") == used.count("#key-x") == slots
    known = {item.get("id") for item in root.iter() if item.get("id")}
    assert {str(item).removeprefix("#") for item in used} <= known
    letters = [item.text for item in tags(root, "text")]
    assert letters.count("N") == letters.count("S") == winding.family.pole_pairs
    assert {"stator", "winding", "gap", "sleeve", "magnet", "core", "shaft"} <= set(letters)
    assert svg == cross_section_svg(sections, 0, winding, NAME, "key")


def test_signs_lie_where_the_winding_says() -> None:
    sections, winding = plain_machine(12, 4, 5)
    root = parsed(cross_section_svg(sections, 0, winding, NAME, "key"))
    towards: dict[int, int] = {}
    for item in tags(root, "use"):
        if item.get("href") not in ("#key-o", "#key-x"):
            continue
        angle = math.atan2(float(item.get("y", "")), float(item.get("x", "")))
        # The two sides of tooth k lie on both sides of its axis.
        place = round(angle / (2.0 * math.pi / 24) - 0.5) % 24
        towards[place] = 1 if item.get("href") == "#key-o" else -1
    for side in winding.coil_sides:
        # Half-pitch 2k is just after the axis of tooth k, 2k - 1 just before it.
        place = (2 * side.coil if side.layer == 2 else 2 * side.coil - 1) % 24
        assert towards[place] == side.torque_direction


def test_scale_is_true() -> None:
    sections, winding = plain_machine(12, 4, 5)
    svg = cross_section_svg(sections, 0, winding, NAME, "key")
    radii = [float(item.get("r", "")) for item in tags(parsed(svg), "circle")]
    assert max(radii) == pytest.approx(1e3 * sections.outer_radius[0], abs=1e-3)
    bar = [item for item in tags(parsed(svg), "text") if str(item.text).endswith(" mm")]
    length = float(str(bar[0].text).removesuffix(" mm"))
    spans = [float(i.get("x2", "")) - float(i.get("x1", "")) for i in tags(parsed(svg), "line")]
    assert any(span == pytest.approx(length, abs=2e-3) for span in spans)


@pytest.mark.parametrize("family", [(6, 2, 1), (12, 2, 1), (24, 2, 1)])
def test_detail_letters_its_measures(family: tuple[int, int, int]) -> None:
    sections, winding = plain_machine(*family)
    root = parsed(slot_detail_svg(sections, 0, winding, "key"))
    measures = slot_measures(sections, 0)
    assert [item.text for item in tags(root, "text")] != []
    assert {item.text for item in tags(root, "text")} == {item.letter for item in measures}
    found = {item.name: item.value for item in measures}
    assert found["mechanical clearance"] == pytest.approx(PLAIN["clearance_mm"])
    assert found["wedge height"] == pytest.approx(PLAIN["wedge_height_mm"])
    assert found["magnet thickness"] == pytest.approx(PLAIN["magnet_thickness_mm"])
    opening = 1e3 * sections.slot_opening[0]
    assert found["slot opening (chord at the bore)"] == pytest.approx(opening)


@pytest.mark.parametrize("family", [(6, 2, 1), (12, 2, 1), (24, 2, 1)])
def test_winding_diagram_names_every_coil_side(family: tuple[int, int, int]) -> None:
    winding = design_winding(*family)
    root = parsed(winding_svg(winding))
    said = [str(item.text) for item in tags(root, "text")]
    labels = [item for item in said if re.fullmatch("[UVW][ab]", item)]
    wanted = ["UVW"[s.phase] + "ab"[s.group] for s in winding.coil_sides]
    assert labels == wanted
    signs = [item for item in said if re.fullmatch("[+−]{2}", item)]
    assert signs == [
        "".join("+" if d > 0 else "−" for d in (s.torque_direction, s.suspension_direction))
        for s in winding.coil_sides
    ]


def test_families_differ_in_colour_or_marker() -> None:
    marks = [family_mark(position) for position in range(len(FAMILY_COLOURS) * len(MARKERS))]
    assert len({(mark.colour, mark.marker) for mark in marks}) == len(marks)
    assert len({mark.marker for mark in marks[:6]}) == 6  # without colour, too


def test_numbers_are_short_and_never_minus_zero() -> None:
    assert [number(v) for v in (0.0, -0.0001, 1.5, -2.0, 1.23456)] == [
        "0",
        "0",
        "1.5",
        "-2",
        "1.235",
    ]
    assert [scale_bar_length(v) for v in (3.0, 59.0, 60.0, 200.0)] == [1.0, 10.0, 20.0, 50.0]
