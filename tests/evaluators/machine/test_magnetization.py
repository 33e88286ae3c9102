"""H(B) against an open benchmark table, its own derivative, and the physics of a stack."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from outside import OutsideChecks

from evaluators.machine.materials import library as materials
from evaluators.machine.materials.library import ElectricalSteel, ShaftSteel
from evaluators.machine.materials.magnetization import MagnetizationCurve

MU_0 = 4e-7 * math.pi

check = OutsideChecks("materials")

# TEAM problem 13 (Nakata, Takahashi, Fujiwara), magnetization curve of its steel.
TEAM_13_B = [
    0, 0.0025, 0.005, 0.0125, 0.025, 0.05, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1.0, 1.1,
    1.2, 1.3, 1.4, 1.5, 1.55, 1.6, 1.65, 1.7, 1.75, 1.8,
]  # fmt: skip
TEAM_13_H = [
    0, 16, 30, 54, 93, 143, 191, 210, 222, 233, 247, 258, 272, 289, 313, 342, 377, 433, 509, 648,
    933, 1228, 1934, 2913, 4993, 7189, 9423,
]  # fmt: skip

CURVES = {
    **{
        f"{kind.__name__} {name}": materials.load(kind, name).magnetization
        for kind, word in ((ElectricalSteel, "electrical_steel"), (ShaftSteel, "shaft_steel"))
        for name in materials.available(word)
    },
    "TEAM 13": MagnetizationCurve(TEAM_13_H, TEAM_13_B),
}
every_curve = pytest.mark.parametrize("curve", CURVES.values(), ids=list(CURVES))


@every_curve
def test_points_of_the_table_are_met(curve: MagnetizationCurve) -> None:
    h = curve.field(curve.flux_density_points)
    # Interpolation reproduces its nodes to rounding.
    np.testing.assert_allclose(h, curve.field_points, rtol=1e-12, atol=1e-9)


@pytest.mark.parametrize(("current", "inner", "outer", "flux"), [
    (20.0, 0.9183099, 0.0668281, 0.003387282),
    (50.0, 1.451851, 1.137299, 0.01307828),
    (200.0, 1.656493, 1.575747, 0.01612306),
])  # fmt: skip
def test_ring_around_a_wire(current: float, inner: float, outer: float, flux: float) -> None:
    """Ring from 10 to 20 mm."""
    curve = CURVES["TEAM 13"]
    r = np.linspace(0.010, 0.020, 2001)
    b = curve.flux_density(current / (2.0 * math.pi * r))
    source = (
        "H = I/(2 pi r) exactly; B of the steel of TEAM problem 13 (Nakata, Takahashi, Fujiwara) "
        "by linear interpolation"
    )
    why = (
        "the reference runs straight between points, this curve bends: a tenth of the distance "
        "of the points, 0.05 and 0.1 T here"
    )
    for what, found, expected, tolerance in (
        ("density at the inside of a ring round a wire", b[0], inner, {"absolute": 0.01}),
        ("density at the outside of a ring round a wire", b[-1], outer, {"absolute": 0.005}),
        ("flux of a ring round a wire", np.trapezoid(b, r), flux, {"relative": 0.01}),
    ):
        unit = "T" if "absolute" in tolerance else ""
        check(what, found, expected, **tolerance, unit=unit, why=why, source=source)


@every_curve
def test_derivatives_agree_with_differences(curve: MagnetizationCurve) -> None:
    b = np.linspace(1e-3, 3.0, 1237)
    step = 1e-6
    slope = (curve.field(b + step) - curve.field(b - step)) / (2.0 * step)
    # Central differences of a cubic are exact to step² except across a knot (step × bend).
    np.testing.assert_allclose(curve.differential_reluctivity(b), slope, rtol=2e-3)
    nu, rate = curve.reluctivity(b * b)
    np.testing.assert_allclose(nu * b, curve.field(b), rtol=1e-12)
    high, _ = curve.reluctivity(b * b * (1.0 + step))
    low, _ = curve.reluctivity(b * b * (1.0 - step))
    # Where nu hardly changes the difference drowns in rounding, 1e-16 / 1e-6 of nu.
    noise = 1e-9 * nu / (b * b)
    difference = (high - low) / (2.0 * step * b * b)
    assert np.all(np.abs(rate - difference) <= 5e-3 * np.abs(rate) + noise)


@every_curve
def test_reluctivity_is_smooth_and_the_curve_monotone(curve: MagnetizationCurve) -> None:
    for knot in curve.flux_density_points[1:]:
        below, above = (knot - 1e-9) ** 2, (knot + 1e-9) ** 2
        nu_below, rate_below = curve.reluctivity(below)
        nu_above, rate_above = curve.reluctivity(above)
        # Distances of 1e-9 T move both by their slopes only; a jump would show at once.
        assert nu_below == pytest.approx(nu_above, rel=1e-5)
        if len(curve.field_points) > 2 and curve is not CURVES["TEAM 13"]:
            assert rate_below == pytest.approx(rate_above, rel=1e-4, abs=1e-3)
    b = np.linspace(0.0, 3.0, 30_001)
    assert np.all(np.diff(curve.field(b)) > 0.0)
    assert np.all(curve.differential_reluctivity(b) <= 1.0 / MU_0 * (1.0 + 1e-9))


@every_curve
def test_vacuum_beyond_the_table(curve: MagnetizationCurve) -> None:
    last = curve.flux_density_points[-1]
    check(
        "slope of every magnetization curve beyond its table",
        curve.field(last + 1.0) - curve.field(last),
        1.0 / MU_0,
        relative=1e-12,
        why="rounding",
        source="saturated iron rises as vacuum does",
    )


@every_curve
@given(b=st.floats(-4.0, 4.0))
def test_inverse_and_odd_symmetry(curve: MagnetizationCurve, b: float) -> None:
    h = curve.field(b)
    assert curve.field(-b) == -h
    # Newton stops at rounding of B; relative 1e-9 leaves room for the steep start.
    assert curve.flux_density(h) == pytest.approx(b, rel=1e-9, abs=1e-12)


def test_zero_field_is_regular() -> None:
    curve = CURVES["TEAM 13"]
    nu, rate = curve.reluctivity(0.0)
    assert np.isfinite(rate)
    assert nu == pytest.approx(curve.differential_reluctivity(0.0), rel=1e-12)  # H is odd at zero
    assert curve.field(0.0) == 0.0


def test_stack_carries_iron_and_insulation_in_parallel() -> None:
    curve = materials.load(ElectricalSteel, "M270-35A").magnetization
    stack = curve.laminated(0.95)
    iron = curve.flux_density_points
    h = curve.field(iron)
    expected = 0.95 * iron + 0.05 * MU_0 * h
    np.testing.assert_allclose(stack.flux_density(h), expected, rtol=1e-9, atol=1e-12)
    between = curve.flux_density(700.0)
    check(
        "density of a laminated stack between the points of its table",
        stack.flux_density(700.0),
        0.95 * between + 0.05 * MU_0 * 700,
        relative=1e-3,
        why="both are interpolated, each on its own, to well below a part in thousand",
        source="iron and insulation in parallel",
    )


@pytest.mark.parametrize(("h", "b", "word"), [
    ([0, 10, 5], [0, 0.1, 0.2], "increase"),
    ([1, 10], [0, 0.1], "origin"),
    ([0, 10], [0, 0.1, 0.2], "equally long"),
    ([0, 1e6, 2e6], [0, 1.5, 2.0], "below 1"),
])  # fmt: skip
def test_bad_tables_are_refused(h: list[float], b: list[float], word: str) -> None:
    with pytest.raises(ValueError, match=word):
        MagnetizationCurve(h, b)


def test_bad_stacking_factor_is_refused() -> None:
    with pytest.raises(ValueError, match=r"stacking_factor = 1\.2"):
        CURVES["TEAM 13"].laminated(1.2)
