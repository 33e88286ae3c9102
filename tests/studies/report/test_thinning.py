"""The spread choice of a front."""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from studies.report.thinning import spread


@settings(max_examples=50, deadline=None)
@given(size=st.integers(5, 200), count=st.integers(4, 40), seed=st.integers(0, 1000))
def test_ends_are_kept_and_every_point_has_a_chosen_one_near(
    size: int, count: int, seed: int
) -> None:
    points = np.random.default_rng(seed).random((size, 3))
    rows = spread(points, count)
    assert len(rows) == min(size, max(count, 4))
    assert (np.diff(rows) > 0).all()
    for column in points.T:
        assert int(np.argmin(column)) in rows
    if size <= count:
        return
    # Farthest-point choice: no point lies farther from the chosen ones than those from each other.
    chosen = points[rows]
    apart = np.linalg.norm(chosen[:, None] - chosen[None], axis=2)
    np.fill_diagonal(apart, np.inf)
    left = np.linalg.norm(points[:, None] - chosen[None], axis=2).min(axis=1).max()
    later = np.sort(apart.min(axis=1))[4:]  # the first four are given, not chosen by distance
    if later.size:
        assert left <= later.max() + 1e-12


def test_few_points_are_all_kept() -> None:
    np.testing.assert_array_equal(spread(np.eye(3), 10), [0, 1, 2])
