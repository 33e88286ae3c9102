"""The whole cross-section to scale, its parts labelled."""

from __future__ import annotations

import numpy as np

from evaluators.machine.geometry.cross_sections import MILLI, RADII, CrossSections
from evaluators.machine.geometry.outlines import (
    Loop,
    SlotShape,
    coil_side,
    rotor_outlines,
    slot_ring,
    slot_turn,
)
from evaluators.machine.winding.winding import Winding
from studies.drawing.palette import PART_COLOURS, PHASE_COLOURS, PHASE_TINTS
from studies.drawing.svg import line, loop_path, number, outline_path, picture, scale_bar_length
from studies.drawing.svg import text as words

MARGIN = 0.04  # of the outer radius
LABEL_WIDTH = 0.62
LETTERS = "UVW"


def cross_section_svg(
    sections: CrossSections, row: int, winding: Winding, name: str, key: str
) -> str:
    """The cross-section of one design, coil sides coloured by phase.

    Group a has the full colour of its phase, group b a lighter one. A dot is positive phase
    current towards the reader (+z), a cross away from the reader, for the torque connection.

    Parameters
    ----------
    sections : CrossSections
    row : int
        Which of its designs.
    winding : Winding
    name : str
        Of the design, for the label that is read out.
    key : str
        Prefix of the ids inside the drawing, unique on its page: letters, digits and ``-``.
    """
    shape = SlotShape.of(sections, row)
    outer = shape.outer_radius / MILLI
    slots = winding.family.slots
    body = [
        f'<g transform="scale(1,-1)" stroke="#3A3F46" stroke-width="{number(0.004 * outer)}">',
        *_stator(shape, key, winding, outer),
        *_rotor(shape),
        "</g>",
        *_pole_letters(shape),
        *_labels(shape, outer),
        *_scale_bar(outer),
    ]
    half = (1.0 + MARGIN) * outer
    label = (
        f"Cross-section of {name}: {slots} slots, {winding.family.poles} magnet poles, outer "
        f"diameter {2.0 * outer:.1f} mm, bore diameter "
        f"{2.0 * shape.bore_radius / MILLI:.1f} mm"
    )
    box = (-half, -half, 2.0 * half + LABEL_WIDTH * outer, 2.0 * half + 0.16 * outer)
    return picture(box, label, body)


def _stator(shape: SlotShape, key: str, winding: Winding, outer: float) -> list[str]:
    """The lamination as a ring, one slot and one coil side of each layer repeated around it."""
    slots = shape.family.slots
    turn = slot_turn(0, slots)
    sides = {layer: coil_side(shape, layer, turn) for layer in (1, 2)}
    drawn = [
        "<defs>",
        f'<path id="{key}-s" d="{loop_path(slot_ring(shape, turn))}"/>',
        *(f'<path id="{key}-l{layer}" d="{loop_path(side)}"/>' for layer, side in sides.items()),
        _signs(key, outer),
        "</defs>",
        f'<circle r="{number(outer)}" fill="{PART_COLOURS["stator"]}"/>',
        f'<circle r="{number(shape.bore_radius / MILLI)}" fill="{PART_COLOURS["gap"]}"/>',
        f'<g fill="{PART_COLOURS["slot"]}">',
        *(_again(f"{key}-s", slot, slots) for slot in range(slots)),
        "</g>",
    ]
    for phase in range(3):
        for group, colours in enumerate((PHASE_COLOURS, PHASE_TINTS)):
            drawn.append(f'<g fill="{colours[phase]}">')
            drawn += [
                _again(f"{key}-l{side.layer}", side.slot, slots)
                for side in winding.coil_sides
                if (side.phase, side.group) == (phase, group)
            ]
            drawn.append("</g>")
    drawn.append(f'<g stroke="#000" fill="#000" stroke-width="{number(0.008 * outer)}">')
    drawn += [
        _sign(sides[side.layer], side.slot * 2.0 * np.pi / slots, side.torque_direction, key)
        for side in winding.coil_sides
    ]
    drawn.append("</g>")
    return drawn


def _again(identifier: str, slot: int, slots: int) -> str:
    turn = f' transform="rotate({number(360.0 * slot / slots, 4)})"' if slot else ""
    return f'<use href="#{identifier}"{turn}/>'


def _signs(key: str, outer: float) -> str:
    """A dot and a cross about the origin."""
    arm = number(0.016 * outer)
    return (
        f'<circle id="{key}-o" r="{number(0.0115 * outer)}"/>'
        f'<path id="{key}-x" d="M-{arm}-{arm}L{arm} {arm}M-{arm} {arm}L{arm}-{arm}"/>'
    )


def _sign(side: Loop, turn: float, direction: int, key: str) -> str:
    """Placed by polar means, because a coil side may be a curved band."""
    points = side.vertices @ np.array([1.0, 1j])
    towards = np.exp(1j * (np.angle(points.sum()) + turn))
    middle = np.abs(points).mean() * towards
    return (
        f'<use href="#{key}-{"o" if direction > 0 else "x"}" x="{number(middle.real)}" '
        f'y="{number(middle.imag)}"/>'
    )


def _rotor(shape: SlotShape) -> list[str]:
    drawn = []
    for part in rotor_outlines(shape):
        colour: str = part.part
        if part.part == "magnet":
            colour = "south" if part.number % 2 else "north"
        drawn.append(
            f'<path d="{outline_path(part)}" fill="{PART_COLOURS[colour]}" fill-rule="evenodd"/>'
        )
    return drawn


def _pole_letters(shape: SlotShape) -> list[str]:
    """N and S in the magnets, where they are thick enough to read."""
    inner, outer = shape.core_radius / MILLI, shape.magnet_radius / MILLI
    poles = shape.family.poles
    size = min(0.8 * (outer - inner), 0.5 * np.pi * (outer + inner) / poles, 0.2 * outer)
    if size < 0.02 * shape.outer_radius / MILLI:
        return []
    middle = 0.5 * (inner + outer)
    angles = 2.0 * np.pi * np.arange(poles) / poles
    return [
        words(
            middle * float(np.cos(angle)),
            -middle * float(np.sin(angle)) + 0.36 * size,
            "NS"[pole % 2],
            size,
            "middle",
        )
        for pole, angle in enumerate(angles)
    ]


def _labels(shape: SlotShape, outer: float) -> list[str]:
    """Names of the parts in a column on the right, each with a line to its part."""
    half_pitch = np.pi / shape.family.slots
    radius = {name: getattr(shape, name) / MILLI for name in RADII}
    # Slot nearest to 35 degrees, so that the line to its winding stays short.
    slot = (2.0 * round((0.6 / half_pitch - 1.0) / 2.0) + 1.0) * half_pitch
    places = [
        ("stator", 0.5 * (radius["slot_radius"] + radius["outer_radius"]), 0.95),
        ("winding", 0.5 * (radius["wedge_radius"] + radius["slot_radius"]), slot),
        ("gap", 0.5 * (radius["rotor_radius"] + radius["bore_radius"]), 0.25),
        ("sleeve", 0.5 * (radius["magnet_radius"] + radius["rotor_radius"]), 0.1),
        ("magnet", 0.5 * (radius["core_radius"] + radius["magnet_radius"]), -0.12),
        ("core", 0.5 * (radius["shaft_radius"] + radius["core_radius"]), -0.45),
        ("shaft", 0.5 * radius["shaft_radius"], -0.8),
    ]
    size = 0.095 * outer
    column = 1.07 * outer
    drawn = [f'<g stroke="#3A3F46" stroke-width="{number(0.006 * outer)}">']
    heights = np.linspace(-0.72, 0.72, len(places)) * outer
    for (_, distance, angle), height in zip(places, heights, strict=True):
        x, y = distance * float(np.cos(angle)), -distance * float(np.sin(angle))
        drawn.append(line(x, y, column, float(height)))
        drawn.append(
            f'<circle cx="{number(x)}" cy="{number(y)}" r="{number(0.013 * outer)}" fill="#FFF"/>'
        )
    drawn.append("</g>")
    for (name, _, _), height in zip(places, heights, strict=True):
        drawn.append(words(column + 0.03 * outer, float(height) + 0.35 * size, name, size))
    return drawn


def _scale_bar(outer: float) -> list[str]:
    length = scale_bar_length(2.0 * outer)
    y = 1.13 * outer
    return [
        f'<g stroke="#000" stroke-width="{number(0.012 * outer)}">',
        line(-outer, y, -outer + length, y),
        line(-outer, y - 0.03 * outer, -outer, y + 0.03 * outer),
        line(-outer + length, y - 0.03 * outer, -outer + length, y + 0.03 * outer),
        "</g>",
        words(-outer + length + 0.04 * outer, y + 0.035 * outer, f"{length:g} mm", 0.095 * outer),
    ]
