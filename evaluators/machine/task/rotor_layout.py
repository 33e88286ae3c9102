"""The rotor beyond its active part, and what holds and limits its motion."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from evaluators.machine.checks import require
from evaluators.machine.quantity import FloatArray


class ShaftEnds(NamedTuple):
    """Dimensions of the shaft beyond the active part, arrays (n,) in m."""

    radius: FloatArray
    drive_length: FloatArray
    free_length: FloatArray


@dataclass(frozen=True)
class RotorLayout:
    """Shaft ends, mounted parts, touchdown bearings and suspension stiffness; SI units.

    The rotor is a beam of three pieces: the drive-side shaft end with the overhung part (an
    impeller, say) at its tip, the active part, and the free shaft end.

    Attributes
    ----------
    drive_end_length, free_end_length : float or None
        Of the shaft beyond the active part, m; None for one rotor diameter, a first guess that
        leaves room for touchdown bearing, sensors and seal.
    shaft_end_ratio : float
        Radius of the shaft ends over that of the shaft inside the core.
    overhung_mass : float
        Of the part mounted on the drive-side tip, kg.
    overhung_offset : float
        Distance of its centre of mass beyond the tip, m.
    overhung_transverse_inertia : float
        About a diameter through its own centre of mass, kg m2.
    free_end_mass : float
        Of a part on the free tip (thrust disc, sensor target), kg.
    suspension_stiffness : float or None
        Net stiffness of the position control, N/m; None for as much as the magnets' negative
        stiffness, the usual start of a design (Schweitzer, Maslen, Magnetic Bearings, 2009).
    bearing_stiffness : float
        Of a second radial bearing at the middle of the free shaft end, N/m; zero for none.
    damping_ratio : float
        Of the first bending mode under control, for the amplification factor.
    touchdown_ratio : float
        Clearance of the touchdown bearings over the mechanical clearance.
    eccentricity_ratio : float
        Displacement that operation may use, over the touchdown clearance (0.3 is the limit of
        zone A of ISO 14839-2).
    core_stiffening : float
        Share of the bending stiffness of a solid of shaft-steel modulus that the laminated core
        and the shrunk magnets add; 0 counts the shaft and the sleeve only.
    """

    drive_end_length: float | None = None
    free_end_length: float | None = None
    shaft_end_ratio: float = 1.0
    overhung_mass: float = 0.0
    overhung_offset: float = 0.0
    overhung_transverse_inertia: float = 0.0
    free_end_mass: float = 0.0
    suspension_stiffness: float | None = None
    bearing_stiffness: float = 0.0
    damping_ratio: float = 0.05
    touchdown_ratio: float = 0.5
    eccentricity_ratio: float = 0.3
    core_stiffening: float = 0.0

    def __post_init__(self) -> None:
        owner = "rotor"
        for name in ("drive_end_length", "free_end_length"):
            value = getattr(self, name)
            if value is not None:
                require(owner, f"{name} (m)", value, 1e-4, 10.0)
        require(owner, "shaft_end_ratio", self.shaft_end_ratio, 0.2, 5.0)
        require(owner, "overhung_mass (kg)", self.overhung_mass, 0.0, 1e4)
        require(owner, "overhung_offset (m)", self.overhung_offset, -1.0, 1.0)
        require(
            owner, "overhung_transverse_inertia (kg m2)", self.overhung_transverse_inertia, 0.0, 1e4
        )
        require(owner, "free_end_mass (kg)", self.free_end_mass, 0.0, 1e4)
        if self.suspension_stiffness is not None:
            require(owner, "suspension_stiffness (N/m)", self.suspension_stiffness, 1.0, 1e12)
        require(owner, "bearing_stiffness (N/m)", self.bearing_stiffness, 0.0, 1e12)
        require(owner, "damping_ratio", self.damping_ratio, 1e-4, 2.0)
        require(owner, "touchdown_ratio", self.touchdown_ratio, 0.05, 0.95)
        require(owner, "eccentricity_ratio", self.eccentricity_ratio, 0.0, 1.0)
        require(owner, "core_stiffening", self.core_stiffening, 0.0, 1.0)

    def ends(self, shaft_radius: FloatArray, rotor_radius: FloatArray) -> ShaftEnds:
        """Shaft ends of n designs from their shaft and rotor radii (n,) in m."""
        diameter = 2.0 * rotor_radius

        def long(length: float | None) -> FloatArray:
            return diameter if length is None else np.full_like(diameter, length)

        return ShaftEnds(
            radius=np.asarray(self.shaft_end_ratio * shaft_radius),
            drive_length=long(self.drive_end_length),
            free_length=long(self.free_end_length),
        )
