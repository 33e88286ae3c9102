"""Attainment surfaces against counting, a closed case and the fronts themselves."""

from __future__ import annotations

import numpy as np
import pytest
from outside import OutsideChecks

from optimizer.fronts import hypervolume, non_dominated
from studies.comparison.attainment import attained_share, attainment_surface, levels

check = OutsideChecks("studies")


def fronts_of(searches: int, objectives: int, seed: int, size: int = 30) -> list[np.ndarray]:
    """Random fronts that cross each other."""
    generator = np.random.default_rng(seed)
    found = []
    for _ in range(searches):
        points = generator.random((size, objectives)) ** 2
        points += generator.random(objectives) * 0.2
        found.append(points[non_dominated(points)])
    return found


def attained(fronts: list[np.ndarray], places: np.ndarray) -> np.ndarray:
    """How many fronts attain each place, by comparing everything with everything."""
    return np.sum(
        [(front[:, None] <= places[None]).all(axis=2).any(axis=0) for front in fronts], axis=0
    )


@pytest.mark.parametrize("searches", [1, 2, 5])
def test_surface_bounds_what_is_attained(searches: int) -> None:
    fronts = fronts_of(searches, 2, seed=searches)
    # Between any two values of the points, so that no place lies on an edge, and on the points.
    values = np.unique(np.concatenate(fronts))
    ticks = np.concatenate([values, 0.5 * (values[1:] + values[:-1]), [-1.0, 9.0]])
    places = np.stack(np.meshgrid(ticks, ticks), axis=-1).reshape(-1, 2)
    counts = attained(fronts, places)
    for level in range(1, searches + 1):
        surface = attainment_surface(fronts, level)
        inside = (surface[:, None] <= places[None]).all(axis=2).any(axis=0)
        assert np.array_equal(inside, counts >= level)
        assert (np.diff(surface[:, 0]) > 0.0).all()
        assert (np.diff(surface[:, 1]) < 0.0).all()


def test_surfaces_of_equal_fronts_are_that_front() -> None:
    [front] = fronts_of(1, 2, seed=3)
    ordered = front[np.argsort(front[:, 0])]
    for level in levels(3):
        assert np.array_equal(attainment_surface([front] * 3, level), ordered)


def test_two_crossing_points_have_known_surfaces() -> None:
    """Two searches of one design each: their union, and the corner both dominate."""
    one, other = np.array([[1.0, 3.0]]), np.array([[2.0, 1.0]])
    assert attainment_surface([one, other], 1).tolist() == [[1.0, 3.0], [2.0, 1.0]]
    assert attainment_surface([one, other], 2).tolist() == [[2.0, 3.0]]
    # Boxes up to 4: 3 x 1 and 2 x 3 overlap in 2 x 1 of 16.
    assert attained_share([one, other], 1, 4.0) == pytest.approx(7.0 / 16.0)
    assert attained_share([one, other], 2, 4.0) == pytest.approx(2.0 / 16.0)
    nothing = np.zeros((0, 2))
    assert attained_share([one, nothing], 2, 4.0) == 0.0
    assert attained_share([one, nothing], 1, 4.0) == pytest.approx(3.0 / 16.0)
    assert len(attainment_surface([one, nothing], 2)) == 0
    assert attainment_surface([nothing, nothing], 1).shape == (0, 2)
    assert attained_share([nothing, nothing], 1, 4.0) == 0.0


def test_levels_are_best_median_and_worst() -> None:
    assert levels(1) == (1, 1, 1)
    assert levels(4) == (1, 2, 4)
    assert levels(5) == (1, 3, 5)


@pytest.mark.parametrize("objectives", [2, 3])
def test_attained_shares_by_sampling_and_by_their_sum(objectives: int) -> None:
    fronts = fronts_of(4, objectives, seed=11)
    reference = 1.1
    shares = [attained_share(fronts, level, reference) for level in range(1, 5)]
    places = np.random.default_rng(2).random((40_000, objectives)) * reference
    counts = attained(fronts, places)
    for level, share in enumerate(shares, start=1):
        check(
            "share of the box that so many searches attain",
            share,
            float(np.mean(counts >= level)),
            absolute=0.01,  # 40,000 samples: standard deviation 0.0025 at most, four of them
            why="four standard deviations of the sampling",
            source="definition, by sampling",
        )
    # Every place is counted once for each search that attains it.
    box = reference**objectives
    volumes = [hypervolume(front, np.full(objectives, reference)) / box for front in fronts]
    assert sum(shares) == pytest.approx(sum(volumes), rel=1e-9)  # rounding of many small boxes
    assert shares == sorted(shares, reverse=True)


def test_volumes_of_four_objectives_are_refused() -> None:
    fronts = fronts_of(2, 4, seed=1)
    with pytest.raises(ValueError, match="4 objectives"):
        attained_share(fronts, 2, 1.1)
    assert 0.0 < attained_share(fronts, 1, 1.1) < 1.0
