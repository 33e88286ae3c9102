"""Closed outlines of every part of one cross-section, in millimetres.

Frame: x along the axis of tooth 0, counter-clockwise positive, origin on the shaft axis. An
outline is a ring of vertices; the edge that leaves a vertex is straight where its bulge is 0 and
otherwise an arc of the included angle 4 atan(bulge), counter-clockwise for a positive bulge (the
convention of polylines in DXF). All outlines run counter-clockwise, holes too.

Arcs about the shaft axis and straight tooth sides are exact. The sides of the wedge are conics
(the tooth's half-width is linear in the radius) and are drawn by `WEDGE_ARCS` arcs each.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Sequence
from dataclasses import dataclass, fields
from functools import cached_property
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.winding.families import Family
from evaluators.machine.winding.winding import Winding

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
    """One slot about the x axis, and the circles around it; lengths in metres.

    The wall of the slot at radius r lies at the angle pi/Q - asin(h(r)/r) from the slot's axis,
    h being the half-width of the tooth as in `CrossSections.tooth_half_width`.
    """

    family: Family
    shaft_radius: float
    core_radius: float
    magnet_radius: float
    rotor_radius: float
    bore_radius: float
    tip_radius: float
    wedge_radius: float
    slot_radius: float
    outer_radius: float
    tooth_width: float
    tip_half_width: float
    magnet_arc_ratio: float

    @classmethod
    def of(cls, sections: CrossSections, row: int) -> SlotShape:
        """Dimensions of design `row`."""
        names = [item.name for item in fields(cls) if item.name != "family"]
        return cls(sections.family, **{name: float(getattr(sections, name)[row]) for name in names})

    def half_angle(self, radius: float) -> float:
        """Half the angle between the walls at `radius`."""
        share = (radius - self.tip_radius) / (self.wedge_radius - self.tip_radius)
        share = min(max(share, 0.0), 1.0)
        half = self.tip_half_width + share * (0.5 * self.tooth_width - self.tip_half_width)
        return math.pi / self.family.slots - math.asin(half / radius)

    def wall(self, radius: float) -> Point:
        """Point of the wall at positive angle."""
        return cmath.rect(radius, self.half_angle(radius))

    @cached_property
    def wedge_wall(self) -> list[Point]:
        """Points from tip to wedge radius, two for each arc and one."""
        radii = np.linspace(self.tip_radius, self.wedge_radius, 2 * WEDGE_ARCS + 1)
        return [self.wall(float(radius)) for radius in radii]

    def wound_area(self, inner: float, outer: float) -> float:
        """Area between two radii of the wound part, m2."""
        half = 0.5 * self.tooth_width

        def tooth(radius: float) -> float:
            return radius**2 * math.asin(half / radius) + half * math.sqrt(radius**2 - half**2)

        ring = math.pi / self.family.slots * (outer**2 - inner**2)
        return ring - (tooth(outer) - tooth(inner))

    @cached_property
    def halving_radius(self) -> float:
        """Radius that divides the wound part into equal areas."""
        inner, outer = self.wedge_radius, self.slot_radius
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
    shape = SlotShape.of(sections, row)
    slots = sections.family.slots
    return (
        Outline("stator", 0, "stator lamination", _circle(shape.outer_radius), (_bore(shape),)),
        *(
            Outline("slot", slot, f"slot {slot + 1}", slot_ring(shape, slot_turn(slot, slots)))
            for slot in range(slots)
        ),
        *(
            Outline(
                "winding",
                2 * slot + layer - 1,
                f"slot {slot + 1}, layer {layer}",
                coil_side(shape, layer, slot_turn(slot, slots)),
            )
            for slot in range(slots)
            for layer in (1, 2)
        ),
        *rotor_outlines(shape),
    )


def rotor_outlines(shape: SlotShape) -> tuple[Outline, ...]:
    """Magnets, sleeve, core and shaft at rotor angle 0."""
    return (
        *_magnets(shape),
        _annulus("sleeve", "sleeve", shape.rotor_radius, shape.magnet_radius),
        _annulus("core", "rotor core", shape.core_radius, shape.shaft_radius),
        Outline("shaft", 0, "shaft", _circle(shape.shaft_radius)),
    )


def slot_turn(slot: int, slots: int) -> Point:
    """Unit vector along the axis of a slot."""
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
        ("line", [shape.wall(shape.bore_radius), shape.wedge_wall[0]]),
        ("curve", shape.wedge_wall),
        ("line", [shape.wedge_wall[-1], shape.wall(shape.slot_radius)]),
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
    bore, slots = shape.bore_radius, shape.family.slots
    ring = _Ring()
    opening = shape.half_angle(bore)
    for slot in range(slots):
        turn = slot_turn(slot, slots)
        _add_walls(ring, shape, turn, shape.slot_radius)
        # Along the face of the next tooth.
        ring.arc(turn * shape.wall(bore), 2.0 * np.pi / slots - 2.0 * opening)
    return ring.close()


def slot_ring(shape: SlotShape, turn: Point = 1.0) -> Loop:
    """Ring of one slot with its mouth."""
    ring = _Ring()
    _add_walls(ring, shape, turn, shape.slot_radius)
    bore = shape.bore_radius
    ring.arc(turn * shape.wall(bore), -2.0 * shape.half_angle(bore))
    return ring.close()


def coil_side(shape: SlotShape, layer: int, turn: Point = 1.0) -> Loop:
    """Ring of layer 1 or 2 in the slot whose axis `turn` points along."""
    inner, outer = shape.wedge_radius, shape.slot_radius
    ring = _Ring()
    if shape.family.coil_pitch == 1:
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
    poles = shape.family.poles
    inner, outer = shape.core_radius, shape.magnet_radius
    arc = 2.0 * np.pi / poles * shape.magnet_arc_ratio
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
