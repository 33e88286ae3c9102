"""One slot with its two teeth and the rotor below it, enlarged, its measures lettered."""

from __future__ import annotations

import cmath
import math
from collections.abc import Callable
from dataclasses import dataclass

from evaluators.machine.geometry.cross_sections import MILLI, CrossSections
from evaluators.machine.geometry.outlines import Loop, SlotShape, coil_side, slot_ring
from evaluators.machine.winding.winding import Winding
from studies.drawing.palette import PART_COLOURS, PHASE_TINTS
from studies.drawing.svg import line, loop_path, number, picture
from studies.drawing.svg import text as words

Place = Callable[[float, float], tuple[float, float]]


@dataclass(frozen=True)
class Measure:
    """One lettered measure of the drawing, mm."""

    letter: str
    name: str
    value: float


def slot_measures(sections: CrossSections, row: int) -> tuple[Measure, ...]:
    """The measures that the drawing letters, in its order."""
    shape = SlotShape.of(sections, row)
    chord = 2.0 * shape.bore_radius * math.sin(shape.half_angle(shape.bore_radius))
    values = (
        ("slot opening (chord at the bore)", chord),
        ("tooth tip width", 2.0 * shape.tip_half_width),
        ("tooth width", shape.tooth_width),
        ("tip height", shape.tip_radius - shape.bore_radius),
        ("wedge height", shape.wedge_radius - shape.tip_radius),
        ("depth of the wound part", shape.slot_radius - shape.wedge_radius),
        ("yoke thickness", shape.outer_radius - shape.slot_radius),
        ("mechanical clearance", shape.bore_radius - shape.rotor_radius),
        ("sleeve thickness", shape.rotor_radius - shape.magnet_radius),
        ("magnet thickness", shape.magnet_radius - shape.core_radius),
    )
    return tuple(
        Measure(letter, name, value / MILLI)
        for letter, (name, value) in zip("ABCDEFGHJK", values, strict=True)
    )


def slot_detail_svg(sections: CrossSections, row: int, winding: Winding, key: str) -> str:
    """The enlarged slot of one design; `key` as in `cross_section_svg`."""
    shape = SlotShape.of(sections, row)
    pitch = 2.0 * math.pi / winding.family.slots
    wide = min(0.95 * pitch, 0.45 * math.pi)
    outer = shape.outer_radius / MILLI
    lowest = (shape.core_radius - 0.25 * (shape.magnet_radius - shape.core_radius)) / MILLI
    half = outer * math.sin(wide)
    base = lowest * math.cos(wide)
    height = outer - base
    size = 0.05 * max(height, 1.2 * half)
    body = [
        f'<clipPath id="{key}-c"><path d="{_band(lowest, outer, wide)}"/></clipPath>',
        f'<g stroke="#3A3F46" stroke-width="{number(0.06 * size)}">',
        f'<g clip-path="url(#{key}-c)">',
        *_parts(shape, winding),
        "</g>",
        f'<path d="{_band(lowest, outer, wide)}" fill="none"/>',
        "</g>",
        f'<g stroke="#000" stroke-width="{number(0.07 * size)}" fill="none">',
        *_lines(shape, pitch, half, size),
        "</g>",
        *_letters(shape, pitch, half, size),
    ]
    margin = 5.0 * size
    box = (-half - margin, -outer - 1.2 * size, 2.0 * (half + margin), height + 2.4 * size)
    said = ", ".join(f"{m.letter} {m.name} {m.value:.2f} mm" for m in slot_measures(sections, row))
    return picture(box, f"Slot, teeth and rotor of the cross-section with measures: {said}", body)


def _up(point: complex) -> tuple[float, float]:
    """Drawing coordinates in mm of a point in metres whose x axis is the slot's."""
    return -point.imag / MILLI, -point.real / MILLI


def _band(inner: float, outer: float, wide: float) -> str:
    """Path of a piece of a ring about the upward axis, radii in mm."""
    points = [(radius, side) for radius in (inner, outer) for side in (-wide, wide)]
    (ax, ay), (bx, by), (cx, cy), (dx, dy) = (
        (radius * math.sin(side), -radius * math.cos(side)) for radius, side in points
    )
    return (
        f"M{number(ax)} {number(ay)}A{number(inner)} {number(inner)} 0 0 1 {number(bx)} "
        f"{number(by)}L{number(dx)} {number(dy)}A{number(outer)} {number(outer)} 0 0 0 "
        f"{number(cx)} {number(cy)}Z"
    )


def _disc(radius: float, colour: str) -> str:
    return f'<circle r="{number(radius / MILLI)}" fill="{colour}"/>'


def _ring(loop: Loop, turn: float, colour: str) -> str:
    return (
        f'<path transform="rotate({number(turn, 5)}) rotate(-90) scale(1,-1)" '
        f'd="{loop_path(loop)}" fill="{colour}"/>'
    )


def _parts(shape: SlotShape, winding: Winding) -> list[str]:
    slots = winding.family.slots
    drawn = [
        _disc(shape.outer_radius, PART_COLOURS["stator"]),
        _disc(shape.bore_radius, PART_COLOURS["gap"]),
    ]
    for turn in (-360.0 / slots, 0.0, 360.0 / slots):
        drawn.append(_ring(slot_ring(shape), turn, PART_COLOURS["slot"]))
        drawn += [_ring(coil_side(shape, layer), turn, PHASE_TINTS[layer - 1]) for layer in (1, 2)]
    drawn += [
        _disc(shape.rotor_radius, PART_COLOURS["sleeve"]),
        _disc(shape.magnet_radius, PART_COLOURS["south"]),
        _disc(shape.core_radius, PART_COLOURS["core"]),
    ]
    return drawn


def _tooth_line(pitch: float, radius: float, half: float) -> tuple[complex, complex]:
    """Ends of a line across the tooth on the right at `radius`."""
    axis = cmath.exp(-0.5j * pitch)
    along = math.sqrt(radius**2 - half**2)
    return axis * complex(along, -half), axis * complex(along, half)


def _across(shape: SlotShape, pitch: float) -> list[tuple[str, complex, complex]]:
    opening = shape.wall(shape.bore_radius)
    tip = _tooth_line(pitch, 0.5 * (shape.bore_radius + shape.tip_radius), shape.tip_half_width)
    body = _tooth_line(
        pitch, 0.5 * (shape.wedge_radius + shape.slot_radius), 0.5 * shape.tooth_width
    )
    return [("A", opening, opening.conjugate()), ("B", *tip), ("C", *body)]


def _radial(shape: SlotShape) -> list[tuple[str, float, float]]:
    return [
        ("D", shape.bore_radius, shape.tip_radius),
        ("E", shape.tip_radius, shape.wedge_radius),
        ("F", shape.wedge_radius, shape.slot_radius),
        ("G", shape.slot_radius, shape.outer_radius),
        ("H", shape.rotor_radius, shape.bore_radius),
        ("J", shape.magnet_radius, shape.rotor_radius),
        ("K", shape.core_radius, shape.magnet_radius),
    ]


def _lines(shape: SlotShape, pitch: float, half: float, size: float) -> list[str]:
    drawn = []
    for _, start, end in _across(shape, pitch):
        (x1, y1), (x2, y2) = _up(start), _up(end)
        drawn.append(line(x1, y1, x2, y2))
    column = {"D": 1.0, "E": 1.0, "F": 1.0, "G": 1.0}
    thin = f' stroke-width="{number(0.04 * size)}" stroke-dasharray="{number(0.3 * size)}"'
    for letter, low, high in _radial(shape):
        side = column.get(letter, -1.0)
        x = side * (half + 1.2 * size)
        for radius in (low, high):
            y = -radius / MILLI
            drawn.append(line(0.0, y, x + side * 0.4 * size, y, thin))
        drawn.append(line(x, -low / MILLI, x, -high / MILLI))
        for radius in (low, high):
            y = -radius / MILLI
            drawn.append(line(x - 0.3 * size, y + 0.3 * size, x + 0.3 * size, y - 0.3 * size))
    return drawn


def _letters(shape: SlotShape, pitch: float, half: float, size: float) -> list[str]:
    drawn = []
    for letter, start, end in _across(shape, pitch):
        x, y = _up(0.5 * (start + end))
        drawn.append(words(x, y - 0.3 * size, letter, size, "middle"))
    for side, group in ((1.0, "DEFG"), (-1.0, "HJK")):
        chosen = [item for item in _radial(shape) if item[0] in group]
        heights = _apart([-0.5 * (low + high) / MILLI for _, low, high in chosen], 1.15 * size)
        for (letter, low, high), y in zip(chosen, heights, strict=True):
            middle = -0.5 * (low + high) / MILLI
            x = side * (half + 1.2 * size)
            mark = side * (half + 3.2 * size)
            thin = f' stroke="#000" stroke-width="{number(0.04 * size)}"'
            drawn.append(line(x, middle, mark - side * 0.4 * size, y, thin))
            drawn.append(words(mark, y + 0.35 * size, letter, size, "middle"))
    return drawn


def _apart(places: list[float], least: float) -> list[float]:
    """`places` (falling or rising) moved so that neighbours are `least` apart, middle kept."""
    order = sorted(range(len(places)), key=lambda item: places[item])
    moved = dict.fromkeys(order, 0.0)
    last = -math.inf
    for item in order:
        last = max(places[item], last + least)
        moved[item] = last
    shift = sum(places) / len(places) - sum(moved.values()) / len(places)
    return [moved[item] + shift for item in range(len(places))]
