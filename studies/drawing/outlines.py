"""Closed outlines of every part of one cross-section, in millimetres.

Frame: x along the axis of tooth 0, counter-clockwise positive, origin on the shaft axis. An
outline is a ring of vertices; the edge that leaves a vertex is straight where its bulge is 0 and
otherwise an arc of the included angle 4 atan(bulge), counter-clockwise for a positive bulge (the
convention of polylines in DXF). All outlines run counter-clockwise, holes too.

Arcs about the shaft axis and straight tooth sides are exact. The sides of the wedge are conics
(the tooth's half-width is linear in the radius) and are drawn by `WEDGE_ARCS` arcs each.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

from evaluators.machine.geometry import CrossSections
from evaluators.machine.winding import Winding

FloatArray = NDArray[np.float64]
Part = Literal["stator", "slot", "winding", "magnet", "sleeve", "core", "shaft"]
Point = complex  # x + j y in metres while outlines are made

MILLI = 1e-3
WEDGE_ARCS = 4
"""Arcs along one wedge side; the area of the slot mouth is then right to 1e-6 of itself."""
STRAIGHT = 1e-12  # bulges below this are rounding


@dataclass(frozen=True, eq=False)
class Loop:
    """One closed ring: `vertices` (k, 2) in mm, `bulges` (k,) of the edges that leave them."""

    vertices: FloatArray
    bulges: FloatArray

    def __post_init__(self) -> None:
        if self.vertices.ndim != 2 or self.vertices.shape[1] != 2 or len(self.vertices) < 2:
            msg = f"vertices have shape {self.vertices.shape} but must have (k, 2) with k >= 2"
            raise ValueError(msg)
        if self.bulges.shape != (len(self.vertices),):
            msg = f"bulges have shape {self.bulges.shape} but must have ({len(self.vertices)},)"
            raise ValueError(msg)

    @cached_property
    def area(self) -> float:
        """Enclosed area in mm2, positive for a counter-clockwise ring.

        Polygon of the vertices (shoelace) plus the circular segment over each bulged edge,
        r^2/2 (angle - sin angle).
        """
        start = self.vertices[:, 0] + 1j * self.vertices[:, 1]
        end = np.roll(start, -1)
        polygon = 0.5 * float(np.sum(np.imag(np.conj(start) * end)))
        angle = 4.0 * np.arctan(self.bulges)
        # A nearly straight edge: (angle - sin angle) / sin^2(angle/2) loses all digits.
        bent = np.abs(angle) > 1e-3
        safe = np.where(bent, angle, 1.0)
        ratio = np.where(bent, (safe - np.sin(safe)) / np.sin(0.5 * safe) ** 2, 2.0 / 3.0 * angle)
        return polygon + float(np.sum(0.125 * np.abs(end - start) ** 2 * ratio))


@dataclass(frozen=True, eq=False)
class Outline:
    """One part: its `outer` ring and the rings left out of it.

    Attributes
    ----------
    part : str
    number : int
        Which of several: slot, magnet (0 is the north pole on the axis of tooth 0 at rotor angle
        0), or coil side as ``2 * slot + layer - 1``; 0 for a part there is once.
    label : str
        For a reader, slots and magnets counted from 1.
    """

    part: Part
    number: int
    label: str
    outer: Loop
    holes: tuple[Loop, ...] = ()

    @property
    def area(self) -> float:
        """Area in mm2."""
        return self.outer.area - sum(hole.area for hole in self.holes)


class _Ring:
    """Collects vertices and bulges of one ring, in metres."""

    def __init__(self) -> None:
        self.points: list[Point] = []
        self.bulges: list[float] = []

    def line(self, start: Point) -> None:
        """Leave `start` straight."""
        self.points.append(start)
        self.bulges.append(0.0)

    def arc(self, start: Point, angle: float) -> None:
        """Leave `start` on an arc of `angle`."""
        self.points.append(start)
        self.bulges.append(float(np.tan(0.25 * angle)))

    def curve(self, points: Sequence[Point]) -> None:
        """Leave along arcs through every second point; the last point is left out."""
        for start, middle, end in zip(points[:-2:2], points[1:-1:2], points[2::2], strict=True):
            chord = end - start
            # Height of the arc over its chord, to the right where the arc is counter-clockwise.
            height = -float(np.imag(np.conj(chord) * (middle - start))) / abs(chord)
            bulge = 2.0 * height / abs(chord)
            self.points.append(start)
            self.bulges.append(bulge if abs(bulge) > STRAIGHT else 0.0)

    def close(self, turn: Point = 1.0) -> Loop:
        points = np.array(self.points) * turn / MILLI
        return Loop(np.column_stack([points.real, points.imag]), np.array(self.bulges))


@dataclass(frozen=True)
class SlotShape:
    """One slot about the x axis: its upper wall as points, lower wall mirrored. Metres.

    The wall of the slot at radius r lies at the angle pi/Q - asin(h(r)/r) from the slot's axis.
    """

    sections: CrossSections
    row: int

    def value(self, name: str) -> float:
        """A dimension of the row."""
        return float(getattr(self.sections, name)[self.row])

    def half_angle(self, radius: float) -> float:
        """Half the angle between the walls at `radius`."""
        one = self.sections.rows(slice(self.row, self.row + 1))
        return 0.5 * float(one.slot_angle(np.array([radius]))[0])

    def wall(self, radius: float) -> Point:
        """Point of the wall at positive angle."""
        return complex(radius * np.exp(1j * self.half_angle(radius)))

    @cached_property
    def wedge_wall(self) -> list[Point]:
        """Points from tip to wedge radius, two for each arc and one."""
        radii = np.linspace(
            self.value("tip_radius"), self.value("wedge_radius"), 2 * WEDGE_ARCS + 1
        )
        return [self.wall(float(radius)) for radius in radii]

    def wound_area(self, inner: float, outer: float) -> float:
        """Area between two radii of the wound part, m2."""
        half = 0.5 * self.value("tooth_width")

        def tooth(radius: float) -> float:
            return float(radius**2 * np.arcsin(half / radius) + half * np.sqrt(radius**2 - half**2))

        ring = np.pi / self.sections.family.slots * (outer**2 - inner**2)
        return float(ring - (tooth(outer) - tooth(inner)))

    @cached_property
    def halving_radius(self) -> float:
        """Radius that divides the wound part into equal areas."""
        inner, outer = self.value("wedge_radius"), self.value("slot_radius")
        half = 0.5 * self.wound_area(inner, outer)
        return float(
            brentq(lambda r: self.wound_area(inner, r) - half, inner, outer, xtol=1e-15, rtol=1e-14)
        )


def outlines(sections: CrossSections, row: int, winding: Winding) -> tuple[Outline, ...]:
    """Outlines of all parts of design `row` of `sections`.

    The stator has the outer circle and, as its hole, bore and slots in one ring. Slots reach from
    bore to slot bottom. Layers of a coil that surrounds one tooth lie beside each other in the
    slot, each along the tooth it belongs to; longer coils lie above each other, layer 1 at the
    slot bottom. Insulation is not drawn.

    Raises
    ------
    ValueError
        If the winding is of another family than the cross-sections.
    """
    if winding.family != sections.family:
        msg = f"the winding is of {winding.family.id}, the cross-section of {sections.family.id}"
        raise ValueError(msg)
    shape = SlotShape(sections, row)
    value = shape.value
    slots = sections.family.slots
    return (
        Outline("stator", 0, "stator lamination", _circle(value("outer_radius")), (_bore(shape),)),
        *(
            Outline("slot", slot, f"slot {slot + 1}", _slot(shape, _slot_turn(slot, slots)))
            for slot in range(slots)
        ),
        *(
            Outline(
                "winding",
                2 * slot + layer - 1,
                f"slot {slot + 1}, layer {layer}",
                coil_side(shape, layer, _slot_turn(slot, slots)),
            )
            for slot in range(slots)
            for layer in (1, 2)
        ),
        *_magnets(shape),
        _annulus("sleeve", "sleeve", value("rotor_radius"), value("magnet_radius")),
        _annulus("core", "rotor core", value("core_radius"), value("shaft_radius")),
        Outline("shaft", 0, "shaft", _circle(value("shaft_radius"))),
    )


def _slot_turn(slot: int, slots: int) -> Point:
    return complex(np.exp(2j * np.pi * (slot + 0.5) / slots))


def _circle(radius: float) -> Loop:
    ring = _Ring()
    ring.arc(complex(radius), np.pi)
    ring.arc(complex(-radius), np.pi)
    return ring.close()


def _annulus(part: Part, label: str, outer: float, inner: float) -> Outline:
    return Outline(part, 0, label, _circle(outer), (_circle(inner),))


def _upper_wall(shape: SlotShape) -> list[tuple[str, list[Point]]]:
    """The wall from bore to slot bottom as straight and curved pieces."""
    return [
        ("line", [shape.wall(shape.value("bore_radius")), shape.wedge_wall[0]]),
        ("curve", shape.wedge_wall),
        ("line", [shape.wedge_wall[-1], shape.wall(shape.value("slot_radius"))]),
    ]


def _add_walls(ring: _Ring, shape: SlotShape, turn: Point, bottom: float) -> None:
    """Up the lower wall, along the bottom, down the upper wall to the bore (left out)."""
    pieces = _upper_wall(shape)
    for kind, points in pieces:
        lower = [turn * point.conjugate() for point in points]
        if kind == "line":
            ring.line(lower[0])
        else:
            ring.curve(lower)
    corner = shape.wall(bottom)
    ring.arc(turn * corner.conjugate(), 2.0 * shape.half_angle(bottom))
    for kind, points in reversed(pieces):
        upper = [turn * point for point in reversed(points)]
        if kind == "line":
            ring.line(upper[0])
        else:
            ring.curve(upper)


def _bore(shape: SlotShape) -> Loop:
    """Bore and slots in one ring."""
    bore, slots = shape.value("bore_radius"), shape.sections.family.slots
    ring = _Ring()
    opening = shape.half_angle(bore)
    for slot in range(slots):
        turn = _slot_turn(slot, slots)
        _add_walls(ring, shape, turn, shape.value("slot_radius"))
        # Along the face of the next tooth.
        ring.arc(turn * shape.wall(bore), 2.0 * np.pi / slots - 2.0 * opening)
    return ring.close()


def _slot(shape: SlotShape, turn: Point) -> Loop:
    ring = _Ring()
    _add_walls(ring, shape, turn, shape.value("slot_radius"))
    bore = shape.value("bore_radius")
    ring.arc(turn * shape.wall(bore), -2.0 * shape.half_angle(bore))
    return ring.close()


def coil_side(shape: SlotShape, layer: int, turn: Point = 1.0) -> Loop:
    """Ring of layer 1 or 2 in the slot whose axis `turn` points along."""
    inner, outer = shape.value("wedge_radius"), shape.value("slot_radius")
    ring = _Ring()
    if shape.sections.family.coil_pitch == 1:
        # Coil i ends with its go side (layer 2) in slot i, beside tooth i: the clockwise half.
        low, high = shape.half_angle(inner), shape.half_angle(outer)
        if layer == 1:
            ring.line(complex(inner))
            ring.arc(complex(outer), high)
            ring.line(shape.wall(outer))
            ring.arc(shape.wall(inner), -low)
        else:
            ring.line(shape.wall(inner).conjugate())
            ring.arc(shape.wall(outer).conjugate(), high)
            ring.line(complex(outer))
            ring.arc(complex(inner), -low)
        return ring.close(turn)
    middle = shape.halving_radius
    inner, outer = (middle, outer) if layer == 1 else (inner, middle)
    ring.line(shape.wall(inner).conjugate())
    ring.arc(shape.wall(outer).conjugate(), 2.0 * shape.half_angle(outer))
    ring.line(shape.wall(outer))
    ring.arc(shape.wall(inner), -2.0 * shape.half_angle(inner))
    return ring.close(turn)


def _magnets(shape: SlotShape) -> list[Outline]:
    """One sector for each pole, drawn at rotor angle 0."""
    poles = shape.sections.family.poles
    inner, outer = shape.value("core_radius"), shape.value("magnet_radius")
    arc = 2.0 * np.pi / poles * shape.value("magnet_arc_ratio")
    found = []
    for pole in range(poles):
        turn = complex(np.exp(2j * np.pi * pole / poles))
        ring = _Ring()
        start, end = complex(np.exp(-0.5j * arc)), complex(np.exp(0.5j * arc))
        ring.line(inner * start)
        ring.arc(outer * start, arc)
        ring.line(outer * end)
        ring.arc(inner * end, -arc)
        found.append(Outline("magnet", pole, f"magnet {pole + 1}", ring.close(turn)))
    return found
