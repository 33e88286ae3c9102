"""Balance grades against worked values of the standard's formula."""

from __future__ import annotations

import math

import pytest
from outside import OutsideChecks

from evaluators.machine.mechanics.balance import residual_unbalance

check = OutsideChecks(
    "mechanics", "own evaluation of ISO 21940-11:2016 (former ISO 1940-1; formula from memory)"
)
PRINTED = {"relative": 1e-6, "why": "printed digits"}


# Grade in mm/s, 1/min, kg; um, g mm.
@pytest.mark.parametrize(("grade", "rpm", "mass", "offset_um", "unbalance_gmm"), [
    (2.5, 30_000, 5.0, 0.7957747, 3.978874),
    (2.5, 3_000, 100.0, 7.957747, 795.7747),
    (1.0, 60_000, 1.2, 0.1591549, 0.1909859),
    (6.3, 3_000, 40.0, 20.05352, 802.1409),
])  # fmt: skip
def test_grades(
    grade: float, rpm: float, mass: float, offset_um: float, unbalance_gmm: float
) -> None:
    w = rpm * math.pi / 30.0
    rest = residual_unbalance(grade * 1e-3, mass, w, w)
    check("eccentricity of a balance grade", rest.eccentricity * 1e6, offset_um, **PRINTED)
    check("unbalance of a balance grade", rest.unbalance * 1e6, unbalance_gmm, **PRINTED)


def test_rotating_force() -> None:
    """G 2.5, 30 000 1/min, 5 kg: 39.26991 N; at half the speed a quarter of it."""
    w = 30_000 * math.pi / 30.0
    force = [residual_unbalance(2.5e-3, 5.0, w * share, w).force for share in (1.0, 0.5)]
    check("rotating force of the unbalance", force, [39.26991, 0.25 * 39.26991], **PRINTED)
