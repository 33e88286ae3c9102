"""Fronts and indicators against closed forms, brute force and properties."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays
from outside import OutsideChecks

import optimizer.fronts as fronts
from optimizer.fronts import (
    Front,
    additive_epsilon,
    compromise,
    coverage,
    hypervolume,
    hypervolume_estimate,
    igd_plus,
    non_dominated,
    normalise,
)

check = OutsideChecks("search")
DEFINITION = "the definition, point by point"

# Few distinct values, so that ties and equal points are common.
coarse = st.integers(0, 5).map(float)
points = st.integers(1, 4).flatmap(
    lambda m: st.integers(1, 25).flatmap(lambda n: arrays(np.float64, (n, m), elements=coarse))
)
pairs = st.integers(1, 3).flatmap(
    lambda m: st.tuples(
        *[
            st.integers(1, 12).flatmap(lambda n: arrays(np.float64, (n, m), elements=coarse))
            for _ in range(2)
        ]
    )
)


def brute_front(values: np.ndarray) -> np.ndarray:
    """First of equal points, and no point another one dominates: by the definition."""
    mask = np.ones(len(values), dtype=bool)
    for i, a in enumerate(values):
        for j, b in enumerate(values):
            if (b <= a).all() and ((b < a).any() or j < i):
                mask[i] = False
    return mask


@given(points)
def test_non_dominated_is_what_the_definition_says(values: np.ndarray) -> None:
    check.same("non-dominated points", non_dominated(values), brute_front(values),
               source=DEFINITION)  # fmt: skip


@pytest.mark.parametrize("sort_below", [0, 10_000])
@given(values=points, seed=st.integers(0, 9))
def test_a_growing_front_equals_the_front_of_all(sort_below, values, seed) -> None:
    # Both ways of adding, by sorting everything and by comparing with what is there.
    random = np.random.default_rng(seed)
    before, fronts._SORT_BELOW = fronts._SORT_BELOW, sort_below
    try:
        front, begin = Front(values.shape[1]), 0
        while begin < len(values):
            end = begin + 1 + int(random.integers(5))
            front.add(values[begin:end], np.arange(begin, min(end, len(values))))
            begin = end
    finally:
        fronts._SORT_BELOW = before
    assert np.array_equal(front.evaluations, np.flatnonzero(brute_front(values)))
    assert np.array_equal(front.points, values[front.evaluations])


def test_hypervolume_of_three_points_counted_by_hand() -> None:
    # Unit squares below (4, 4): 1 x 3 + 1 x 2 + 1 x 1.
    check(
        "hypervolume of three points",
        hypervolume([[1, 3], [2, 2], [3, 1]], [4, 4]),
        6.0,
        relative=1e-14,
        why="rounding",
        source="unit squares counted by hand",
    )


def share_of_integral(what: str, got: float, whole: float, step: float, source: str) -> None:
    """A sampled front has a little less than the integral: stairs of a step each."""
    check.within(
        f"hypervolume of {what}: what is missing of the integral, over the steps",
        (whole - got) / step,
        0.0,
        1.0,
        why="stairs between the samples miss less than one step in all, and never add",
        source=source,
    )


def test_hypervolume_of_finely_sampled_fronts_tends_to_the_integral() -> None:
    # 1.1 x 1.1 less the area under 1 - sqrt(f1): 1.21 - 1/3; or less a triangle.
    f = np.linspace(0.0, 1.0, 4001)
    got = hypervolume(np.column_stack([f, 1.0 - np.sqrt(f)]), [1.1, 1.1])
    source = "integral of ZDT1, Zitzler, Deb, Thiele, Evol. Comput. 8 (2000) 173-195"
    share_of_integral("the front of ZDT1", got, 1.21 - 1.0 / 3.0, 1.0 / 4000, source)
    got = hypervolume(np.column_stack([f, 1.0 - f]), [1.1, 1.1])
    source = "integral of MW2, Ma, Wang, IEEE Trans. Evol. Comput. 23 (2019) 972-986"
    share_of_integral("the straight front of MW2", got, 0.71, 1.0 / 4000, source)


def test_hypervolume_of_simplex_and_sphere_tends_to_the_integral() -> None:
    # Corner 1.1 cubed less the tetrahedron 1/6, or the eighth of the unit ball pi/6. The layer
    # missing between steps of h is at most three times h thick.
    steps = 100
    grid = np.array([(i, j) for i in range(steps + 1) for j in range(steps + 1 - i)]) / steps
    simplex = np.column_stack([grid, 1.0 - grid.sum(axis=1)])
    got = hypervolume(simplex, [1.1] * 3)
    source = "volume of a tetrahedron"
    share_of_integral("a simplex", got, 1.331 - 1.0 / 6.0, 3.0 / steps, source)
    sphere = simplex / np.linalg.norm(simplex, axis=1, keepdims=True)
    got = hypervolume(sphere, [1.1] * 3)
    source = "volume of an eighth of a ball"
    share_of_integral("a sphere", got, 1.331 - math.pi / 6.0, 3.0 / steps, source)


@given(points)
def test_hypervolume_counts_unit_cells(values: np.ndarray) -> None:
    # Coordinates are whole numbers, so the volume is a number of cells: counted one by one.
    m = values.shape[1]
    corners = np.stack(np.meshgrid(*[np.arange(6)] * m, indexing="ij"), axis=-1).reshape(-1, m)
    cells = sum(bool((values <= corner).all(axis=1).any()) for corner in corners)
    check(
        "hypervolume of any whole points in one to four objectives",
        hypervolume(values, [6.0] * m),
        cells,
        absolute=1e-9,
        why="whole numbers below 6^4 add up exactly but for rounding in the recursion",
        source="unit cells counted one by one",
    )


@given(pairs)
def test_coverage_and_epsilon_are_what_their_definitions_say(pair) -> None:
    a, b = pair
    covered = [any((p <= q).all() for p in a) for q in b]
    epsilon = max(min(max(p - q) for p in a) for q in b)
    check.same("coverage and additive epsilon", [coverage(a, b), additive_epsilon(a, b)],
               [sum(covered) / len(b), epsilon], source=DEFINITION)  # fmt: skip
    # Shifted by epsilon, a covers all of b; that is what epsilon means.
    assert coverage(a - epsilon, b) == 1.0
    distance = np.mean([min(np.linalg.norm(np.maximum(p - q, 0.0)) for p in a) for q in b])
    check("inverted generational distance plus", igd_plus(a, b), distance, relative=1e-12,
          absolute=1e-12, why="sums in another order", source=DEFINITION)  # fmt: skip


@given(pairs)
def test_more_points_never_lower_the_hypervolume(pair) -> None:
    a, b = pair
    corner = [6.0] * a.shape[1]
    both = hypervolume(np.concatenate([a, b]), corner)
    assert both >= max(hypervolume(a, corner), hypervolume(b, corner)) - 1e-9  # rounding


def test_the_estimated_hypervolume_is_near_repeatable_and_never_falls() -> None:
    random = np.random.default_rng(3)
    front = np.abs(random.normal(size=(120, 6)))
    front /= np.linalg.norm(front, axis=1, keepdims=True)
    corner = [1.1] * 6
    grown = [hypervolume_estimate(front[: n + 1], corner) for n in range(len(front))]
    assert (np.diff(grown) >= 0.0).all()
    assert grown[-1] == hypervolume_estimate(front, corner)
    check(
        "estimated hypervolume in six objectives",
        grown[-1],
        hypervolume(front, corner),
        relative=0.02,
        why="16384 samples: about 1/128 if they were random",
        source="exact hypervolume of the library",
    )
    assert hypervolume_estimate(front + 1.0, corner) == 0.0


def test_coverage_in_blocks_equals_coverage_at_once(monkeypatch) -> None:
    random = np.random.default_rng(5)
    a, b = random.random((40, 3)), random.random((60, 3))
    whole = coverage(a, b)
    monkeypatch.setattr(fronts, "_BLOCK_ELEMENTS", 500)
    assert coverage(a, b) == whole
    assert 0.0 < whole < 1.0


def test_empty_fronts_have_defined_figures() -> None:
    none, one = np.zeros((0, 2)), np.ones((1, 2))
    assert len(non_dominated(none)) == 0
    assert hypervolume(none, [1, 1]) == 0.0
    assert math.isnan(coverage(one, none))
    assert coverage(none, one) == 0.0
    assert additive_epsilon(none, one) == math.inf
    assert igd_plus(none, one) == math.inf
    with pytest.raises(ValueError, match="no point"):
        compromise(none)


def test_nan_and_unlike_fronts_are_refused() -> None:
    with pytest.raises(ValueError, match="NaN"):
        non_dominated([[np.nan, 1.0]])
    with pytest.raises(ValueError, match="2 and 3 objectives"):
        coverage(np.ones((1, 2)), np.ones((1, 3)))
    with pytest.raises(ValueError, match="reference has shape"):
        hypervolume([[1.0, 1.0]], [2.0])


def test_the_compromise_is_nearest_to_the_ideal_whatever_the_units() -> None:
    # On the circle (1 - cos t, 1 - sin t) the point nearest to (0, 0) is at 45 degrees.
    t = np.linspace(0.0, np.pi / 2.0, 91)
    front = np.column_stack([1.0 - np.cos(t), 1.0 - np.sin(t)])
    check.same(
        "compromise on a quarter of a circle, in two systems of units",
        [compromise(front), compromise(front * [1e3, 1e-3] + [7.0, -2.0])],
        [45, 45],
        source="nearest point to the ideal, by symmetry",
    )


def test_normalise_keeps_a_flat_objective_finite() -> None:
    got = normalise([[1.0, 5.0], [3.0, 5.0]])
    assert got.tolist() == [[0.0, 0.0], [1.0, 0.0]]
