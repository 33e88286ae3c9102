"""Cross-sections: areas against polygons, shapes of the tooth tip, and why a design is none."""

from __future__ import annotations

import machines
import numpy as np
import pytest
from numpy.typing import NDArray
from outside import OutsideChecks

from evaluators.machine.geometry.cross_sections import CrossSections, batch_length, cross_sections

FloatArray = NDArray[np.float64]
TIPS = {"half-closed": 1.6, "straight": 1.0, "pointed": 0.5}

check = OutsideChecks("geometry", "polygons drawn from the definition of the variables alone")
EXACT = {"relative": 1e-12, "why": "rounding"}


def section(numbers: machines.Numbers = (12, 4, 5), **changes: float) -> CrossSections:
    return machines.sections(machines.task(*numbers), machines.designs(**changes))


def tooth_profile(span: float, slots: int) -> tuple[FloatArray, FloatArray]:
    """Radii and half-widths of the corners of one tooth side, in metres, from the variables.

    Written again from the definition of the variables, with none of the package's formulas.
    """
    d = machines.DESIGN
    bore = 1e-3 * (d["rotor_radius_mm"] + d["clearance_mm"])
    tip = bore + 1e-3 * d["tip_height_mm"]
    wedge = tip + 1e-3 * d["wedge_height_mm"]
    bottom = wedge + d["slot_depth_ratio"] * bore
    body = d["tooth_width_ratio"] * bore * np.sin(np.pi / slots)  # half of ratio times the chord
    if span <= 1.0:
        narrow = span * body
    else:
        free = np.pi / slots - np.arcsin(body / bore)  # half the straight slot mouth, rad
        narrow = bore * np.sin(np.pi / slots - (2.0 - span) * free)
    return np.array([bore, tip, wedge, bottom]), np.array([narrow, narrow, body, body])


def polygon_area(x: FloatArray, y: FloatArray) -> float:
    return 0.5 * abs(float(x @ np.roll(y, -1) - y @ np.roll(x, -1)))


def tooth_area(inner: float, outer: float, radii: FloatArray, widths: FloatArray) -> float:
    """Area of one tooth between two radii: a polygon of many corners."""
    radius = np.linspace(inner, outer, 4001)
    half = np.arcsin(np.interp(radius, radii, widths) / radius)
    arc = np.linspace(-1.0, 1.0, 4001)
    r = np.concatenate([radius, np.full(4001, outer), radius[::-1], np.full(4001, inner)])
    angle = np.concatenate([half, -arc * half[-1], -half[::-1], arc * half[0]])
    return polygon_area(r * np.cos(angle), r * np.sin(angle))


@pytest.mark.parametrize("span", TIPS.values(), ids=TIPS.keys())
@pytest.mark.parametrize("numbers", [(12, 4, 5), (6, 2, 1), (24, 4, 5)], ids=str)
def test_areas_of_slot_and_iron(numbers: machines.Numbers, span: float) -> None:
    slots = numbers[0]
    found = section(numbers, tip_span_ratio=span)
    radii, widths = tooth_profile(span, slots)
    bore, _, wedge, bottom = radii
    ring = np.pi * (bottom**2 - wedge**2) / slots
    body = tooth_area(wedge, bottom, radii, widths)
    mouth = np.pi * (wedge**2 - bore**2) / slots - tooth_area(bore, wedge, radii, widths)
    whole = tooth_area(bore, bottom, radii, widths) * slots
    yoke = np.pi * (found.outer_radius[0] ** 2 - bottom**2)
    for part, area, expected in (
        ("slot", found.slot_area[0], ring - body),
        ("slot mouth", found.slot_mouth_area[0], mouth),
        ("teeth", found.teeth_area[0], whole),
        ("stator", found.stator_area[0], whole + yoke),
    ):
        why = "polygons of 4000 sides per edge miss 1e-7 of the area"
        check(f"area of {part}", area, expected, relative=1e-6, why=why)


@pytest.mark.parametrize("span", TIPS.values(), ids=TIPS.keys())
def test_shape_of_the_tip(span: float) -> None:
    found = section(tip_span_ratio=span)
    radii, widths = tooth_profile(span, 12)
    for name, radius in zip(
        ("bore_radius", "tip_radius", "wedge_radius", "slot_radius"), radii, strict=True
    ):
        assert getattr(found, name)[0] == pytest.approx(radius, rel=1e-12)
    check("half-widths of a tooth", found.tooth_half_width(radii[None])[0], widths, **EXACT)
    # Half-way down the wedge the wall is half-way between tip and body.
    middle = np.array([0.5 * (radii[1] + radii[2])])
    assert found.tooth_half_width(middle)[0] == pytest.approx(0.5 * (widths[1] + widths[2]))
    body = 0.5 * found.tooth_width[0]
    assert np.sign(found.tip_half_width[0] - body) == np.sign(span - 1.0)
    # The opening as a chord between the corners of neighbouring tips.
    corner = radii[0] * np.exp(1j * np.arcsin(widths[0] / radii[0]))
    next_corner = np.conj(corner) * np.exp(2j * np.pi / 12)
    check("slot opening as a chord", found.slot_opening[0], abs(next_corner - corner), **EXACT)


def test_tip_span_closes_the_slot_in_proportion() -> None:
    angles = [section(tip_span_ratio=span).slot_opening_angle[0] for span in (1.0, 1.25, 1.5)]
    assert angles[1] == pytest.approx(0.75 * angles[0], rel=1e-12)
    assert angles[2] == pytest.approx(0.5 * angles[0], rel=1e-12)


def test_rotor_parts() -> None:
    found = section()
    radii = {"core": 15.4e-3, "magnet": 18.4e-3, "rotor": 20e-3, "bore": 20.6e-3}
    for name, value in radii.items():
        assert getattr(found, f"{name}_radius")[0] == pytest.approx(value, rel=1e-12)
    assert found.shaft_radius[0] == pytest.approx(7.7e-3, rel=1e-12)
    ring = np.pi * (18.4e-3**2 - 15.4e-3**2)
    assert found.magnet_area[0] == pytest.approx(0.85 * ring, rel=1e-12)
    assert found.sleeve_area[0] == pytest.approx(np.pi * (20e-3**2 - 18.4e-3**2), rel=1e-12)
    assert found.core_area[0] + found.shaft_area[0] == pytest.approx(np.pi * 15.4e-3**2, rel=1e-12)
    assert found.magnetic_gap[0] == pytest.approx(2.2e-3, rel=1e-12)


def test_yoke_ratio_one_loads_yoke_and_teeth_alike() -> None:
    # Half the flux of a pole of amplitude B over its pitch is B R/p; a tooth takes B 2 pi R/Q.
    found = section(yoke_ratio=1.0)
    bore, flux_density = found.bore_radius[0], 0.7
    tooth = flux_density * 2.0 * np.pi * bore / 12 / found.tooth_width[0]
    yoke = flux_density * bore / 4 / found.yoke_thickness[0]
    assert tooth == pytest.approx(yoke, rel=1e-12)


def test_end_turns() -> None:
    construction = machines.task().construction
    tooth_coil = section()
    radius = 0.5 * (tooth_coil.wedge_radius + tooth_coil.slot_radius)
    slot = radius * tooth_coil.slot_angle(radius)
    # Two quarter circles over tooth and half a slot, and a straight piece at each side.
    expected = 0.5 * np.pi * (tooth_coil.tooth_width + 0.5 * slot) + 4e-3
    assert tooth_coil.end_turn_length(construction)[0] == pytest.approx(expected[0], rel=1e-12)
    wound = section((12, 1, 2))
    pitch = wound.family.coil_pitch
    assert pitch > 1
    expected = 0.5 * np.pi * 2.0 * np.pi * radius * pitch / 12 + 4e-3
    assert wound.end_turn_length(construction)[0] == pytest.approx(expected[0], rel=1e-12)


def test_scaling_of_all_lengths() -> None:
    small = section()
    large = section(**{k: 3.0 * v for k, v in machines.DESIGN.items() if k.endswith("_mm")})
    for name in ("slot_area", "slot_mouth_area", "teeth_area", "yoke_area", "magnet_area"):
        np.testing.assert_allclose(getattr(large, name), 9.0 * getattr(small, name), rtol=1e-9)


# -- what is no cross-section ---------------------------------------------------------------------

REFUSED = {
    "sleeve and magnets fill the rotor": ({"magnet_thickness_mm": 18.3}, "magnet_thickness_mm"),
    "negative": ({"tip_height_mm": -1.0}, "tip_height_mm = -1 must be positive"),
    "zero": ({"slot_depth_ratio": 0.0}, "slot_depth_ratio = 0 must be positive"),
    "arc above the pitch": ({"magnet_arc_ratio": 1.01}, "magnet_arc_ratio = 1.01"),
    "solid shaft": ({"core_ratio": 1.0}, "core_ratio = 1 must be less than 1"),
    "closed slot": ({"tip_span_ratio": 1.95}, "slot opening ="),
    "over-closed slot": ({"tip_span_ratio": 2.0}, "tip_span_ratio = 2 must be less than 2"),
    "no slot": (
        {"tooth_width_ratio": 0.99, "tip_span_ratio": 0.4}
        | {"tip_height_mm": 0.1, "wedge_height_mm": 0.1},
        "insulation",
    ),
    "not a number": ({"clearance_mm": float("nan")}, "not a finite number"),
    "endless": ({"rotor_radius_mm": float("inf")}, "not a finite number"),
}


@pytest.mark.parametrize(("changes", "text"), REFUSED.values(), ids=REFUSED.keys())
def test_refusal_says_why(changes: dict[str, float], text: str) -> None:
    of = machines.task()
    found, valid, reasons = cross_sections(
        of.winding.family, machines.designs(**changes), of.construction
    )
    assert len(found) == valid.size == 0
    assert text in reasons[0]


def test_valid_rows_keep_their_place() -> None:
    batch = machines.designs(5, rotor_radius_mm=np.array([20.0, 3.0, 21.0, 4.0, 22.0]))
    of = machines.task()
    found, valid, reasons = cross_sections(of.winding.family, batch, of.construction)
    assert valid.tolist() == [0, 2, 4]
    np.testing.assert_allclose(found.rotor_radius, [20e-3, 21e-3, 22e-3])
    assert [bool(reason) for reason in reasons] == [False, True, False, True, False]
    part = found.rows(np.array([2, 0]))
    np.testing.assert_allclose(part.rotor_radius, [22e-3, 20e-3])


def test_narrowest_opening_is_the_construction_s() -> None:
    wide = machines.task(construction={"minimum_slot_opening": 3e-3})
    opening = 1e3 * section().slot_opening[0]
    assert 0.8 < opening < 3.0
    _, valid, reasons = cross_sections(wide.winding.family, machines.designs(), wide.construction)
    assert not valid.size
    assert f"{opening:.4g} mm must be at least 3 mm" in reasons[0]


def test_batch_errors() -> None:
    batch = machines.designs(3)
    assert batch_length(batch) == 3
    with pytest.raises(ValueError, match="lacks yoke_ratio"):
        batch_length({name: value for name, value in batch.items() if name != "yoke_ratio"})
    with pytest.raises(ValueError, match=r"yoke_ratio has shape \(2,\)"):
        batch_length({**batch, "yoke_ratio": np.ones(2)})


def test_class_refuses_disordered_radii() -> None:
    found = section()
    names = [name for name in vars(found) if name != "family"]
    values = {name: getattr(found, name) for name in names}
    with pytest.raises(ValueError, match=r"design 0: bore_radius = .* larger than rotor_radius"):
        CrossSections(family=found.family, **{**values, "bore_radius": 0.9 * found.rotor_radius})
    with pytest.raises(ValueError, match="tooth_width = 0 must be positive"):
        CrossSections(family=found.family, **{**values, "tooth_width": np.zeros(1)})
