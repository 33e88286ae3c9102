"""Cross-sections of a batch of designs: dimensions, slot shape, areas, and what makes one invalid.

The stator tooth is symmetrical about its axis. Its half-width h depends on the radius r alone:
constant over the tip, linear over the wedge, constant over the body (parallel-sided tooth), so a
point of the slot wall lies at distance h(r) from the tooth axis. All lengths in metres.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.geometry.variables import VARIABLE_NAMES
from evaluators.machine.task.task import Construction
from evaluators.machine.winding.families import Family

FloatArray = NDArray[np.float64]

MILLI = 1e-3
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(8)
SMALLEST_SHAFT_RADIUS = 0.5e-3  # below this no core is left to carry torque or the magnets


@dataclass(frozen=True)
class CrossSections:
    """Dimensions of n designs of one family; every attribute but the family is an array (n,).

    Attributes
    ----------
    shaft_radius, core_radius, magnet_radius, rotor_radius, bore_radius : array (n,)
        Outer radii of shaft, rotor core (= inner radius of the magnets), magnets, sleeve; radius
        of the stator bore. m.
    tip_radius, wedge_radius, slot_radius, outer_radius : array (n,)
        Radii where the tip ends, where the wedge ends and the winding begins, of the slot bottom,
        and of the stator outside. m.
    tooth_width : array (n,)
        Of the body, m.
    tip_half_width : array (n,)
        Distance of the tip's side from the tooth axis, m.
    magnet_arc_ratio : array (n,)
        Magnet arc over pole pitch.

    Raises
    ------
    ValueError
        If a radius does not grow outwards or a width is not positive, naming the first offender.
    """

    family: Family
    shaft_radius: FloatArray
    core_radius: FloatArray
    magnet_radius: FloatArray
    rotor_radius: FloatArray
    bore_radius: FloatArray
    tip_radius: FloatArray
    wedge_radius: FloatArray
    slot_radius: FloatArray
    outer_radius: FloatArray
    tooth_width: FloatArray
    tip_half_width: FloatArray
    magnet_arc_ratio: FloatArray

    def __post_init__(self) -> None:
        below: FloatArray = np.zeros_like(self.shaft_radius)
        name_below = "the axis"
        for name in RADII:
            radius: FloatArray = getattr(self, name)
            bad = np.flatnonzero(~(radius > below))
            if bad.size:
                row = int(bad[0])
                msg = (
                    f"design {row}: {name} = {radius[row]:.6g} m must be larger than "
                    f"{name_below} = {below[row]:.6g} m"
                )
                raise ValueError(msg)
            below, name_below = radius, name
        for name in ("tooth_width", "tip_half_width", "magnet_arc_ratio"):
            value: FloatArray = getattr(self, name)
            bad = np.flatnonzero(~(value > 0.0))
            if bad.size:
                msg = f"design {bad[0]}: {name} = {value[bad[0]]:.6g} must be positive"
                raise ValueError(msg)

    def __len__(self) -> int:
        return int(self.bore_radius.size)

    def rows(self, selection: NDArray[np.bool_] | NDArray[np.int64] | slice) -> CrossSections:
        """The cross-sections of the selected designs only."""
        kept = {
            item.name: getattr(self, item.name)[selection]
            for item in fields(self)
            if item.name != "family"
        }
        return CrossSections(family=self.family, **kept)

    # -- the tooth and the slot ---------------------------------------------------------------

    def tooth_half_width(self, radius: FloatArray) -> FloatArray:
        """Half-width h of the tooth at `radius`, shape (n, ...) in and out, m."""
        extra = (1,) * (radius.ndim - 1)
        tip = self.tip_radius.reshape(-1, *extra)
        wedge = self.wedge_radius.reshape(-1, *extra)
        narrow = self.tip_half_width.reshape(-1, *extra)
        body = 0.5 * self.tooth_width.reshape(-1, *extra)
        share = np.clip((radius - tip) / (wedge - tip), 0.0, 1.0)
        return np.asarray(narrow + share * (body - narrow))

    def slot_angle(self, radius: FloatArray) -> FloatArray:
        """Angle between the walls of one slot at `radius`, shape (n, ...) in and out, rad."""
        half = np.arcsin(self.tooth_half_width(radius) / radius)
        return np.asarray(2.0 * np.pi / self.family.slots - 2.0 * half)

    @property
    def slot_opening_angle(self) -> FloatArray:
        """Angle of the slot opening at the bore, rad."""
        return self.slot_angle(self.bore_radius)

    @property
    def slot_opening(self) -> FloatArray:
        """Chord of the slot opening at the bore, m."""
        return np.asarray(2.0 * self.bore_radius * np.sin(0.5 * self.slot_opening_angle))

    @property
    def yoke_thickness(self) -> FloatArray:
        """Radial thickness of the stator yoke behind the slots, m."""
        return self.outer_radius - self.slot_radius

    @property
    def core_thickness(self) -> FloatArray:
        """Radial thickness of the rotor core between shaft and magnets, m."""
        return self.core_radius - self.shaft_radius

    @property
    def magnetic_gap(self) -> FloatArray:
        """Radial distance from magnet surface to bore: sleeve and clearance, m."""
        return self.bore_radius - self.magnet_radius

    # -- areas ------------------------------------------------------------------------------

    @property
    def slot_area(self) -> FloatArray:
        """Area of the wound part of one slot, between wedge and slot bottom, m2."""
        outer = _tooth_sector_area(self.slot_radius, 0.5 * self.tooth_width)
        inner = _tooth_sector_area(self.wedge_radius, 0.5 * self.tooth_width)
        ring = np.pi / self.family.slots * (self.slot_radius**2 - self.wedge_radius**2)
        return np.asarray(ring - (outer - inner))

    @property
    def slot_mouth_area(self) -> FloatArray:
        """Area of one slot between bore and winding (tip and wedge), m2."""
        tip = (
            np.pi / self.family.slots * (self.tip_radius**2 - self.bore_radius**2)
            - _tooth_sector_area(self.tip_radius, self.tip_half_width)
            + _tooth_sector_area(self.bore_radius, self.tip_half_width)
        )
        # The wedge by quadrature of angle times radius: smooth, so 8 points are exact to rounding.
        half = 0.5 * (self.wedge_radius - self.tip_radius)[:, None]
        radius = self.tip_radius[:, None] + half * (1.0 + _NODES)
        wedge = np.sum(_WEIGHTS * half * radius * self.slot_angle(radius), axis=1)
        return np.asarray(tip + wedge)

    @property
    def stator_area(self) -> FloatArray:
        """Iron area of the stator, m2."""
        ring = np.pi * (self.outer_radius**2 - self.bore_radius**2)
        return np.asarray(ring - self.family.slots * (self.slot_area + self.slot_mouth_area))

    @property
    def yoke_area(self) -> FloatArray:
        """Iron area outside the slot bottom, m2."""
        return np.asarray(np.pi * (self.outer_radius**2 - self.slot_radius**2))

    @property
    def teeth_area(self) -> FloatArray:
        """Iron area of all teeth between bore and slot bottom, m2."""
        return self.stator_area - self.yoke_area

    @property
    def magnet_area(self) -> FloatArray:
        """Area of all magnets, m2."""
        ring = np.pi * (self.magnet_radius**2 - self.core_radius**2)
        return np.asarray(self.magnet_arc_ratio * ring)

    @property
    def sleeve_area(self) -> FloatArray:
        """Area of the sleeve, m2."""
        return np.asarray(np.pi * (self.rotor_radius**2 - self.magnet_radius**2))

    @property
    def core_area(self) -> FloatArray:
        """Area of the rotor core without the shaft, m2."""
        return np.asarray(np.pi * (self.core_radius**2 - self.shaft_radius**2))

    @property
    def shaft_area(self) -> FloatArray:
        """Area of the shaft, m2."""
        return np.asarray(np.pi * self.shaft_radius**2)

    @property
    def mean_slot_radius(self) -> FloatArray:
        """Radius half-way down the wound part of the slot, m."""
        return 0.5 * (self.wedge_radius + self.slot_radius)

    def end_turn_length(self, construction: Construction) -> FloatArray:
        """Length of one end turn (one side of the machine) of a coil, m.

        Half a circle over the mean width of the coil, plus a straight piece at each side. A coil
        round one tooth has its sides beside each other in the slot, so it spans the tooth and half
        a slot; longer coils span the pitch at mid-slot. (Common practice for random-wound coils;
        Pyrhonen, Jokinen, Hrabovcova, Design of Rotating Electrical Machines, 2nd ed. 2014,
        ch. 5.)
        """
        radius = self.mean_slot_radius
        if self.family.coil_pitch == 1:
            width = self.tooth_width + 0.5 * radius * self.slot_angle(radius)
        else:
            width = 2.0 * np.pi * radius * self.family.coil_pitch / self.family.slots
        return np.asarray(0.5 * np.pi * width + 2.0 * construction.end_turn_extension)


RADII = (
    "shaft_radius",
    "core_radius",
    "magnet_radius",
    "rotor_radius",
    "bore_radius",
    "tip_radius",
    "wedge_radius",
    "slot_radius",
    "outer_radius",
)


def _tooth_sector_area(radius: FloatArray, half_width: FloatArray) -> FloatArray:
    """Area of a parallel-sided tooth out to `radius`: integral of 2 asin(h/r) r dr."""
    return np.asarray(
        radius**2 * np.arcsin(half_width / radius) + half_width * np.sqrt(radius**2 - half_width**2)
    )


def batch_length(designs: Mapping[str, FloatArray]) -> int:
    """Number of designs in a batch.

    Raises
    ------
    ValueError
        If a design variable is missing or the arrays are not all of one length (n,).
    """
    missing = [name for name in VARIABLE_NAMES if name not in designs]
    if missing:
        msg = f"the batch lacks {', '.join(missing)}"
        raise ValueError(msg)
    shapes = {name: np.shape(designs[name]) for name in VARIABLE_NAMES}
    first = shapes[VARIABLE_NAMES[0]]
    uneven = [name for name, shape in shapes.items() if shape != first or len(shape) != 1]
    if uneven:
        msg = f"every variable must be an array (n,), but {uneven[0]} has shape {shapes[uneven[0]]}"
        raise ValueError(msg)
    return int(first[0])


def cross_sections(
    family: Family, designs: Mapping[str, FloatArray], construction: Construction
) -> tuple[CrossSections, NDArray[np.int64], NDArray[np.str_]]:
    """Cross-sections of the designs that have one.

    Parameters
    ----------
    family : Family
    designs : mapping of variable name to array (n,)
        In the units of the names' suffixes.
    construction : Construction
        For the narrowest slot opening and the insulation.

    Returns
    -------
    sections : CrossSections
        Of the k valid designs.
    valid : array (k,) of int
        Their rows in the batch.
    reasons : array (n,) of str
        Why a design is none, naming variable, value and limit; empty where it is.

    Raises
    ------
    ValueError
        If a variable is missing or lengths differ.
    """
    batch_length(designs)  # refuses what is no batch
    value = {name: np.asarray(designs[name], dtype=np.float64) for name in VARIABLE_NAMES}
    dimensions = _dimensions(family, value)
    reasons = _refusals(family, construction, value, dimensions)
    valid = np.flatnonzero([not reason for reason in reasons])
    rows = {name: dimension[valid] for name, dimension in dimensions.items()}
    return CrossSections(family=family, **rows), valid, np.array(reasons, dtype=np.str_)


def _dimensions(family: Family, value: Mapping[str, FloatArray]) -> dict[str, FloatArray]:
    """Attributes of `CrossSections` by name, (n,), of whatever the variables say."""
    rotor = value["rotor_radius_mm"] * MILLI
    magnet = rotor - value["sleeve_thickness_mm"] * MILLI
    core = magnet - value["magnet_thickness_mm"] * MILLI
    bore = rotor + value["clearance_mm"] * MILLI
    tip = bore + value["tip_height_mm"] * MILLI
    wedge = tip + value["wedge_height_mm"] * MILLI
    slot = wedge + value["slot_depth_ratio"] * bore

    half_pitch = np.pi / family.slots
    tooth = value["tooth_width_ratio"] * 2.0 * bore * np.sin(half_pitch)
    yoke = value["yoke_ratio"] * tooth * family.slots / (2.0 * np.pi * family.pole_pairs)
    span = value["tip_span_ratio"]
    with np.errstate(invalid="ignore"):  # infinite numbers are refused below
        straight = np.arcsin(np.clip(0.5 * tooth / bore, 0.0, 1.0))
        closing = straight + (span - 1.0) * (half_pitch - straight)
        tip_half = np.where(span <= 1.0, 0.5 * span * tooth, bore * np.sin(closing))
    return {
        "shaft_radius": value["core_ratio"] * core,
        "core_radius": core,
        "magnet_radius": magnet,
        "rotor_radius": rotor,
        "bore_radius": bore,
        "tip_radius": tip,
        "wedge_radius": wedge,
        "slot_radius": slot,
        "outer_radius": slot + yoke,
        "tooth_width": tooth,
        "tip_half_width": tip_half,
        "magnet_arc_ratio": value["magnet_arc_ratio"],
    }


def _refusals(
    family: Family,
    construction: Construction,
    value: Mapping[str, FloatArray],
    dimensions: Mapping[str, FloatArray],
) -> list[str]:
    """Why a design is no cross-section, the first reason of each; empty where it is one."""
    reasons = [""] * value[VARIABLE_NAMES[0]].size

    def refuse(bad: NDArray[np.bool_], text: str, *values: FloatArray) -> None:
        for row in np.flatnonzero(bad):
            if not reasons[row]:
                reasons[row] = text.format(*(float(item[row]) for item in values))

    finite = np.all([np.isfinite(item) for item in value.values()], axis=0)
    refuse(~finite, "a design variable is not a finite number")
    for name in VARIABLE_NAMES:
        refuse(~(value[name] > 0.0), name + " = {0:.4g} must be positive", value[name])
    refuse(
        ~(dimensions["shaft_radius"] >= SMALLEST_SHAFT_RADIUS),
        "sleeve_thickness_mm = {0:.4g} and magnet_thickness_mm = {1:.4g} leave no room for core "
        "and shaft inside rotor_radius_mm = {2:.4g} (shaft radius must be at least 0.5 mm)",
        value["sleeve_thickness_mm"],
        value["magnet_thickness_mm"],
        value["rotor_radius_mm"],
    )
    for name, below in (("core_ratio", 1.0), ("tooth_width_ratio", 1.0), ("tip_span_ratio", 2.0)):
        refuse(
            ~(value[name] < below), name + f" = {{0:.4g}} must be less than {below:g}", value[name]
        )
    refuse(
        ~(value["magnet_arc_ratio"] <= 1.0),
        "magnet_arc_ratio = {0:.4g} must be at most 1",
        value["magnet_arc_ratio"],
    )
    bore, wedge = dimensions["bore_radius"], dimensions["wedge_radius"]
    tooth, tip_half = dimensions["tooth_width"], dimensions["tip_half_width"]
    half_pitch = np.pi / family.slots
    with np.errstate(invalid="ignore"):
        opening = 2.0 * bore * np.sin(half_pitch - np.arcsin(np.clip(tip_half / bore, -1.0, 1.0)))
        top = 2.0 * wedge * np.sin(half_pitch - np.arcsin(np.clip(0.5 * tooth / wedge, -1.0, 1.0)))
    limit = construction.minimum_slot_opening
    refuse(
        ~(opening >= limit),
        "slot opening = {0:.4g} mm must be at least " + f"{limit / MILLI:.4g} mm: reduce "
        "tip_span_ratio = {1:.4g} or tooth_width_ratio = {2:.4g}",
        opening / MILLI,
        value["tip_span_ratio"],
        value["tooth_width_ratio"],
    )
    least = 2.0 * construction.slot_insulation
    refuse(
        ~(top > least),
        "the slot is {0:.4g} mm wide where the winding begins, but its insulation alone takes "
        f"{least / MILLI:.4g} mm: reduce tooth_width_ratio = {{1:.4g}}",
        top / MILLI,
        value["tooth_width_ratio"],
    )
    return reasons
