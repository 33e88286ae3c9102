"""What a metric is, and the sources that several metrics share."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Metric:
    """One metric.

    `smaller_is_better` is None where neither direction is better in itself; `signed` metrics may
    be negative. `source` names where the definition or the formula comes from.
    """

    name: str
    unit: str
    group: str
    definition: str
    source: str
    smaller_is_better: bool | None = None
    signed: bool = False


STRESS = "Maxwell stress in the gap"
DESIGN = "definition"
ZHU = "Zhu, Howe, Chan, IEEE Trans. Magn. 38(1), 2002"
CHIBA = "Chiba et al., Magnetic Bearings and Bearingless Drives, 2005"
RING = "orthotropic ring (Lekhnitskii, Anisotropic Plates, 1968) on segments on a disc"
