"""The winding of one family unrolled: slots as columns, layers as rows, coils as arches."""

from __future__ import annotations

from evaluators.machine.winding.winding import Winding
from studies.drawing.palette import PHASE_COLOURS, PHASE_TINTS
from studies.drawing.svg import line, number, picture
from studies.drawing.svg import text as words

COLUMN, CELL, ARCH = 46.0, 34.0, 64.0
LEFT = 74.0
PHASES, GROUPS = "UVW", "ab"


def winding_svg(winding: Winding) -> str:
    """Slots with phase, group and sense of both layers, and the coils that join them.

    Signs give the direction of positive phase current, + towards the reader: the first for the
    torque connection, the second for the suspension connection.
    """
    family = winding.family
    slots = family.slots
    width = LEFT + slots * COLUMN + 8.0
    top = ARCH + 6.0
    parts = _arches(winding, top)
    for side in winding.coil_sides:
        x = LEFT + side.slot * COLUMN
        y = top + (side.layer - 1) * CELL
        colours = PHASE_TINTS if side.group else PHASE_COLOURS
        ink = "#000" if side.group or side.phase == 1 else "#FFF"
        signs = "".join(
            "+" if item > 0 else "−" for item in (side.torque_direction, side.suspension_direction)
        )
        parts.append(
            f'<rect x="{number(x + 1)}" y="{number(y)}" width="{number(COLUMN - 2)}" '
            f'height="{number(CELL - 2)}" fill="{colours[side.phase]}" stroke="#3A3F46"/>'
        )
        label = f"{PHASES[side.phase]}{GROUPS[side.group]}"
        parts.append(
            f'<g fill="{ink}">'
            + words(x + 0.5 * COLUMN, y + 14.0, label, 12.5, "middle")
            + words(x + 0.5 * COLUMN, y + 27.0, signs, 12.5, "middle")
            + "</g>"
        )
    bottom = top + 2.0 * CELL
    for slot in range(slots):
        middle = LEFT + (slot + 0.5) * COLUMN
        parts.append(words(middle, bottom + 14.0, str(slot + 1), 12.0, "middle"))
    parts.append(words(0.0, bottom + 14.0, "slot", 12.0))
    for layer, said in ((1, "layer 1"), (2, "layer 2")):
        parts.append(words(0.0, top + (layer - 0.5) * CELL + 3.0, said, 12.0))
    parts.append(words(0.0, top - 8.0, "coils", 12.0))
    label = (
        f"Winding of {family.id}: {slots} slots, coil pitch {family.coil_pitch}; the same as the "
        "table of coil sides"
    )
    return picture((0.0, 0.0, width, bottom + 20.0), label, parts)


def _arches(winding: Winding, top: float) -> list[str]:
    """Each coil from its return slot to its go slot; those across the seam in two halves."""
    family = winding.family
    height = ARCH * 0.9
    parts = ['<g fill="none" stroke-width="1.8">']
    ends = LEFT, LEFT + family.slots * COLUMN
    for coil in range(family.slots):
        colour = PHASE_COLOURS[int(winding.phase[coil])]
        dashes = ' stroke-dasharray="5 3"' if winding.group[coil] else ""
        first, last = (int(item) for item in winding.coil_slots[coil])
        start, stop = (LEFT + (slot + 0.5) * COLUMN for slot in (first, last))
        stroke = f' stroke="{colour}"{dashes}'
        if start < stop:
            middle = 0.5 * (start + stop)
            parts.append(
                f'<path d="M{number(start + 5)} {number(top)}Q{number(middle)} '
                f'{number(top - 2.0 * height * 0.55)} {number(stop - 5)} {number(top)}"{stroke}/>'
            )
        else:
            level = top - 0.45 * height
            parts.append(
                f'<path d="M{number(start + 5)} {number(top)}Q{number(start + 8)} {number(level)} '
                f'{number(ends[1])} {number(level)}"{stroke}/>'
            )
            parts.append(
                f'<path d="M{number(ends[0])} {number(level)}Q{number(stop - 8)} {number(level)} '
                f'{number(stop - 5)} {number(top)}"{stroke}/>'
            )
    parts.append("</g>")
    parts.append(f'<g stroke="#9AA1AB">{line(ends[0], top - 1.0, ends[1], top - 1.0)}</g>')
    return parts
