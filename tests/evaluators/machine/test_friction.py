"""Gas friction against worked values, its own limits, and a solution of the disc equations."""

from __future__ import annotations

import math

import numpy as np
import pytest
from outside import OutsideChecks
from scipy.integrate import solve_bvp

from evaluators.machine.losses.friction import (
    disc_power,
    disc_torque_coefficient,
    gap_power,
    gap_reynolds,
    gap_torque_coefficient,
    laminar_gap_power,
)

RHO, MU = 1.2, 1.8e-5
RPM = math.pi / 30.0

check = OutsideChecks("losses")
GAP = "own evaluation of Bilgen, Boulos, J. Fluids Eng. 95, 1973"
DISC = "own evaluation of Daily, Nece, J. Basic Eng. 82, 1960 (from memory)"
PRINTED = {"relative": 5e-6, "why": "printed digits"}

# Radius, length, gap in mm, speed in 1/min; Reynolds number, exact laminar power, Bilgen and
# Boulos' power, Wendt's power (1933, as in Lathrop, Swinney) in W. Own evaluation.
WORKED = [
    (25, 50, 1, 120, 20.94395, 1.47955e-5, 1.32807e-5, None),
    (25, 50, 1, 1500, 261.7994, 0.00231179, 0.00384820, None),
    (25, 50, 1, 10_000, 1745.329, 0.102746, 0.396857, 0.421891),
    (25, 50, 1, 60_000, 10471.98, None, 35.4892, 37.5788),
    (40, 100, 1, 100_000, 27925.27, None, 1537.17, 1505.23),
]


@pytest.mark.parametrize(("r", "length", "gap", "rpm", "re", "laminar", "bilgen", "wendt"), WORKED)
def test_worked_gaps(
    r: float, length: float, gap: float, rpm: float, re: float, laminar: float | None,
    bilgen: float, wendt: float | None,
) -> None:  # fmt: skip
    r, length, gap, w = r / 1e3, length / 1e3, gap / 1e3, rpm * RPM
    assert gap_reynolds(r, gap, w, RHO, MU) == pytest.approx(re, rel=1e-6)  # printed digits
    coefficient = gap_torque_coefficient(re, gap / r)
    power = 0.5 * coefficient * math.pi * RHO * w**3 * r**4 * length
    check("friction of the gap by its torque coefficient", power, bilgen, **PRINTED, source=GAP)
    if laminar is not None:
        check(
            "friction of a laminar gap",
            laminar_gap_power(r, gap, length, w, MU),
            laminar,
            **PRINTED,
            source="own evaluation of Couette's flow between cylinders",
        )
    if wendt is not None:
        check(
            "friction of a turbulent gap, another correlation",
            power,
            wendt,
            relative=0.10,
            why="correlation against correlation",
            source="Wendt 1933, as in Lathrop, Swinney; own evaluation",
        )
    whole = gap_power(r, gap, length, w, RHO, MU)
    assert whole == pytest.approx(max(bilgen, laminar or 0.0), rel=5e-6)


def test_coefficient_is_continuous_where_the_published_ranges_meet() -> None:
    """The trap of 0.515/0.0325 together with the factor one half is a step by two at Re = 500."""
    published = {
        64.0: (10.0 / 64.0, 2.0 / 64.0**0.6),
        500.0: (2.0 / 500.0**0.6, 1.03 / 500.0**0.5),
        1e4: (1.03 / 1e4**0.5, 0.065 / 1e4**0.2),
    }
    for re, sides in published.items():
        check(
            "torque coefficient where the published ranges meet",
            [gap_torque_coefficient(re, 1.0)] * 2,
            sides,
            relative=0.10,
            why="the steps of the correlation itself",
            source="Bilgen, Boulos, J. Fluids Eng. 95, 1973",
        )
    re = np.geomspace(1.0, 1e6, 200_001)
    ratio = gap_torque_coefficient(re[1:], 0.04) / gap_torque_coefficient(re[:-1], 0.04)
    step = re[1] / re[0] - 1.0
    assert np.all(np.abs(ratio - 1.0) <= 1.01 * step)  # no faster than 1/Re anywhere


def test_slow_rotor_is_laminar() -> None:
    power = gap_power(0.025, 1e-3, 0.05, 1.0, RHO, MU)
    assert power == pytest.approx(float(laminar_gap_power(0.025, 1e-3, 0.05, 1.0, MU)), rel=1e-12)
    assert gap_power(0.025, 1e-3, 0.05, 0.0, RHO, MU) == 0.0
    check(
        "friction of a very thin laminar gap",
        laminar_gap_power(0.025, 1e-6, 0.05, 10.0, MU),
        2 * math.pi * 0.025**3 * 0.05 * MU * 100.0 / 1e-6,
        relative=1e-4,
        why="gap over radius is 4e-5",
        source="plane shear flow, 2 pi R³ L mu w²/delta",
    )


def test_roughness_factor_multiplies() -> None:
    smooth = gap_power(0.025, 1e-3, 0.05, 5000.0, RHO, MU)
    assert gap_power(0.025, 1e-3, 0.05, 5000.0, RHO, MU, 1.4) == pytest.approx(1.4 * smooth)


# Radius in mm, s, 1/min, C_m, power of both sides in W.
@pytest.mark.parametrize(("r", "s", "rpm", "coefficient", "power"), [
    (25, 0.04, 60_000, 0.00609835, 8.86346),
    (50, 0.05, 30_000, 0.00542872, 31.5608),
    (50, 0.02, 3_000, 0.0109347, 0.0635706),
])  # fmt: skip
def test_worked_discs(r: float, s: float, rpm: float, coefficient: float, power: float) -> None:
    r, w = r / 1e3, rpm * RPM
    re = RHO * w * r * r / MU
    found = disc_torque_coefficient(re, s)
    check("torque coefficient of an enclosed disc", found, coefficient, **PRINTED, source=DISC)
    found = disc_power(r, s * r, w, RHO, MU)
    check("friction of an enclosed disc", found, power, **PRINTED, source=DISC)


def test_narrow_laminar_disc_is_shear_flow() -> None:
    r, gap, w = 0.05, 0.2e-3, 2.0
    check(
        "friction of a narrow laminar disc",
        disc_power(r, gap, w, RHO, MU),
        math.pi * MU * w * r**4 / gap * w,
        relative=1e-12,
        why="the first regime is exact: rounding",
        source="linear profile of shear on both sides, moment pi mu w R⁴/gap",
    )


def test_enclosed_disc_has_less_drag_than_a_free_one() -> None:
    """Free laminar disc, C_m = 3.87/sqrt(Re) (Cochran 1934), from the von Karman equations."""

    def flow(_: np.ndarray, y: np.ndarray) -> np.ndarray:
        f, df, g, dg, h = y
        return np.vstack([df, f * f - g * g + h * df, dg, 2 * f * g + h * dg, -2 * f])

    def ends(a: np.ndarray, b: np.ndarray) -> np.ndarray:
        return np.array([a[0], a[2] - 1.0, a[4], b[0], b[2]])

    z = np.linspace(0.0, 14.0, 141)
    guess = np.vstack([z * np.exp(-z) / 2, 0 * z, np.exp(-z), -np.exp(-z), -0.8 * (1 - np.exp(-z))])
    solution = solve_bvp(flow, ends, z, guess, tol=1e-8)
    assert solution.success
    free = -2.0 * math.pi * solution.y[3, 0]  # both sides: 2 pi integral of r³ makes pi/2, twice
    assert free == pytest.approx(3.869952, rel=1e-5)
    enclosed = disc_torque_coefficient(5e4, 0.02) * math.sqrt(5e4)
    check.within(
        "drag of an enclosed laminar disc over that of a free one",
        enclosed / free,
        0.6,
        0.9,
        why="gas that turns along in the housing lowers the drag by 10 to 40 %",
        source="von Karman's equations integrated; 3.87/sqrt(Re) by Cochran 1934",
    )


def test_shaft_takes_away_the_middle() -> None:
    whole = disc_power(0.04, 1e-3, 3000.0, RHO, MU)
    ring = disc_power(0.04, 1e-3, 3000.0, RHO, MU, inner_radius=0.02)
    assert ring == pytest.approx(whole * (1.0 - 0.5**5), rel=1e-12)
    assert disc_power(0.04, 1e-3, 0.0, RHO, MU) == 0.0


def test_batches_keep_their_shape() -> None:
    r = np.linspace(0.02, 0.05, 7)
    assert gap_power(r, 1e-3, 0.05, 5000.0, RHO, MU).shape == (7,)
    assert disc_power(r, 1e-3, 5000.0, RHO, MU).shape == (7,)
