"""Colours and marker shapes that stay apart for colour-blind readers.

The eight colours of Okabe and Ito, *Color Universal Design*, 2008, leaving out the yellow, which
is too pale for thin lines on white. Every family has a marker shape besides its colour.
"""

from __future__ import annotations

from dataclasses import dataclass

BLUE, ORANGE, GREEN, VERMILION = "#0072B2", "#E69F00", "#009E73", "#D55E00"
PURPLE, SKY, BLACK = "#CC79A7", "#56B4E9", "#000000"

FAMILY_COLOURS = (BLUE, ORANGE, GREEN, VERMILION, PURPLE, SKY, BLACK)
MARKERS = (
    "circle",
    "square",
    "triangle",
    "diamond",
    "inverted_triangle",
    "hex",
    "star",
    "plus",
)
"""Names as Bokeh has them; `marker_path` draws the same shapes."""

PHASE_COLOURS = (BLUE, ORANGE, GREEN)
PHASE_TINTS = ("#A9CFE8", "#F7DDA6", "#A6DCCB")
"""Group b: the phase's colour, lighter."""

PART_COLOURS = {
    "stator": "#C9CED6",
    "slot": "#FFFFFF",
    "sleeve": "#4A5058",
    "core": "#AEB5BF",
    "shaft": "#E4E7EB",
    "north": "#B98FB0",
    "south": "#E3D2DF",
    "gap": "#FFFFFF",
}

_MARKER_PATHS = {
    "circle": "M5 0A5 5 0 1 1-5 0A5 5 0 1 1 5 0Z",
    "square": "M-5-5H5V5H-5Z",
    "triangle": "M0-5.5L5.5 4.5H-5.5Z",
    "inverted_triangle": "M0 5.5L5.5-4.5H-5.5Z",
    "diamond": "M0-6L4.4 0L0 6L-4.4 0Z",
    "hex": "M5.5 0L2.7 4.8H-2.7L-5.5 0L-2.7-4.8H2.7Z",
    "star": "M0-6L1.4-1.9H5.7L2.2.7L3.5 4.9L0 2.3L-3.5 4.9L-2.2.7L-5.7-1.9H-1.4Z",
    "plus": "M-1.5-5H1.5V-1.5H5V1.5H1.5V5H-1.5V1.5H-5V-1.5H-1.5Z",
}


@dataclass(frozen=True)
class Mark:
    """How one family looks."""

    colour: str
    marker: str

    @property
    def path(self) -> str:
        """SVG path of the marker about the origin, 10 units wide."""
        return _MARKER_PATHS[self.marker]


def family_mark(position: int) -> Mark:
    """Colour and marker of the family at `position`; the first 56 pairs all differ."""
    # Seven colours and eight markers share no divisor, so both may simply run round.
    return Mark(FAMILY_COLOURS[position % len(FAMILY_COLOURS)], MARKERS[position % len(MARKERS)])
