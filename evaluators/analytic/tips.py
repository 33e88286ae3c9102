"""The tooth tips beside a slot mouth: thin flanges that saturate before anything else does.

A half-closed slot is covered by two flanges. Each carries what its face collects from the gap and
what leaks across the mouth towards the tooth body, through a thickness that grows from the tip's
height at the mouth to tip and wedge together at the root; there the flux turns into the body around
a corner. Torque current and magnets together saturate the flanges on one side of the teeth, where
the density of the bodies tells nothing of it.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.geometry.cross_sections import CrossSections

FloatArray = NDArray[np.float64]

PLACES = np.array([1.0, 3.0, 5.0, 6.0]) / 6.0
"""Where the flux of a flange is looked at, from the mouth (0) to the root (1)."""
WEIGHTS = np.array([3.0, 2.0, 3.0, 0.0]) / 8.0
"""Quadrature along the flange, exact for cubics; the root stands for the corner."""
CORNER = 0.25 * np.pi
"""Mean length of the lines that turn a right angle in a stream of thickness one."""
SMALLEST = 1e-4  # rad; a narrower flange is a point to the gap


@dataclass(frozen=True)
class ToothTips:
    """Flanges of n designs.

    Attributes
    ----------
    length, corner : arrays (n,), m
        From the mouth to the root, and the turn into the body; zero where the tooth has no flange.
    angle, sheet : arrays (n,), rad
        Arc of the bore below the flange, and below flange and corner.
    thickness : array (n, 4), m
        At `PLACES`.
    steepness : array (n,)
        Slope of the flange's underside.
    """

    length: FloatArray
    corner: FloatArray
    angle: FloatArray
    sheet: FloatArray
    thickness: FloatArray
    steepness: FloatArray

    @classmethod
    def of(cls, sections: CrossSections) -> ToothTips:
        """Flanges of the given cross-sections."""
        tip = sections.tip_radius - sections.bore_radius
        wedge = sections.wedge_radius - sections.tip_radius
        length = np.maximum(sections.tip_half_width - 0.5 * sections.tooth_width, 0.0)
        corner = np.minimum(CORNER * (tip + wedge), length)
        edge = sections.tip_half_width / sections.bore_radius
        root = edge - length / sections.bore_radius
        angle = np.maximum(np.arcsin(edge) - np.arcsin(root), SMALLEST)
        return cls(
            length=length,
            corner=corner,
            angle=angle,
            sheet=angle + corner / sections.bore_radius,
            thickness=tip[:, None] + wedge[:, None] * PLACES,
            steepness=np.where(length > 0.0, wedge / np.maximum(length, 1e-9), 0.0),
        )

    @property
    def stretches(self) -> FloatArray:
        """Length of iron that stands for each of `PLACES`, (n, 4) m."""
        return np.asarray(self.length[:, None] * WEIGHTS + self.corner[:, None] * (PLACES == 1.0))
