"""Operators of the search against the distributions their sources define."""

from __future__ import annotations

import numpy as np
import pytest
from outside import OutsideChecks
from scipy import stats

from optimizer.search.variation import (
    ETA_CROSSOVER,
    ETA_MUTATION,
    MUTATION_SPREAD,
    differential,
    draw_pairs,
    latin_hypercube,
    polynomial_mutation,
    simulated_binary,
)

ROWS = 20_000
# Probability that a right operator fails a distribution test for one seed; seeds are fixed.
RARE = 1e-3

check = OutsideChecks("search")
CROSSOVER = "Deb, Agrawal, Complex Systems 9 (1995) 115-148"
MUTATION = "Deb, Goyal, Computer Science and Informatics 26 (1996) 30-45"


def by_chance(what: str, p: float, source: str) -> None:
    """Chance of the sample, or a rarer one, if the operator is right."""
    why = "a right operator falls below one time in a thousand; seeds are fixed"
    check.within(f"chance of {what}", p, RARE, 1.0, why=why, source=source)


def generator() -> np.random.Generator:
    return np.random.Generator(np.random.PCG64(8))


def test_latin_hypercube_has_one_point_in_each_slice() -> None:
    x = latin_hypercube(50, 3, generator())
    assert (np.sort(np.floor(x * 50), axis=0) == np.arange(50)[:, None]).all()


def test_crossover_spreads_as_deb_and_agrawal_define() -> None:
    # Far from the bounds. Their density of the spread b is (eta + 1)/2 b^eta up to 1 and
    # (eta + 1)/2 b^-(eta + 2) beyond, so its distribution function is as below.
    a, b = np.full((ROWS, 1), 0.49), np.full((ROWS, 1), 0.51)
    child = simulated_binary(a, b, generator())[:, 0]
    crossed = child[child != 0.49]
    # Half of the variables cross: binomial, five standard deviations.
    assert abs(len(crossed) - ROWS / 2) < 5 * np.sqrt(ROWS / 4)
    spread = np.abs(crossed - 0.5) / 0.01
    power = ETA_CROSSOVER + 1.0

    def distribution(s: np.ndarray) -> np.ndarray:
        return np.where(s < 1.0, 0.5 * s**power, 1.0 - 0.5 * np.maximum(s, 1.0) ** -power)

    p = stats.kstest(spread, distribution).pvalue
    by_chance("the spread of simulated binary crossover", p, CROSSOVER)
    above = (crossed > 0.5).mean()
    assert abs(above - 0.5) < 5 * 0.5 / np.sqrt(len(crossed))  # five standard deviations


def test_crossover_near_a_bound_is_cut_there() -> None:
    # Parents at .001 and .101: downwards the spread ends at 1 + 2 (.001 / .1) = 1.02, and what
    # lies beyond is shared out in proportion: the distribution is divided by its value there.
    a, b = np.full((ROWS, 1), 0.001), np.full((ROWS, 1), 0.101)
    child = simulated_binary(a, b, generator())[:, 0]
    spread = (0.051 - child[(child < 0.051) & (child != 0.001)]) / 0.05
    power, end = ETA_CROSSOVER + 1.0, 1.02

    def distribution(s: np.ndarray) -> np.ndarray:
        whole = np.where(s < 1.0, 0.5 * s**power, 1.0 - 0.5 * np.maximum(s, 1.0) ** -power)
        return whole / (1.0 - 0.5 * end**-power)

    p = stats.kstest(spread, distribution).pvalue
    by_chance("the spread of crossover next to a bound", p, CROSSOVER)


def test_mutation_moves_as_deb_and_goyal_define() -> None:
    # In the middle of the box with one variable, which always moves. Down by d has the
    # distribution ((1 - d)^(eta + 1) - 0.5^(eta + 1)) / (1 - 0.5^(eta + 1)) / 2; here its mean
    # over the index eta, whose logarithm is evenly distributed.
    x = np.full((ROWS, 1), 0.5)
    moved = polynomial_mutation(x, np.zeros(ROWS, dtype=bool), generator())[:, 0]
    step = np.abs(moved - 0.5)
    node, share = np.polynomial.legendre.leggauss(40)
    power = ETA_MUTATION * np.exp(MUTATION_SPREAD * node) + 1.0
    cut = 0.5**power

    def distribution(d: np.ndarray) -> np.ndarray:
        left = ((1.0 - d[:, None]) ** power - cut) / (1.0 - cut)
        return 1.0 - left @ share / 2.0

    p = stats.kstest(step, distribution).pvalue
    by_chance("the steps of polynomial mutation", p, MUTATION)
    assert abs((moved > 0.5).mean() - 0.5) < 5 * 0.5 / np.sqrt(ROWS)  # five standard deviations


def test_a_variable_moves_with_chance_one_over_their_number() -> None:
    x = np.full((ROWS, 8), 0.5)
    moved = (polynomial_mutation(x, np.zeros(ROWS, dtype=bool), generator()) != x).mean(axis=0)
    deviation = np.sqrt(1 / 8 * 7 / 8 / ROWS)
    assert (np.abs(moved - 1 / 8) < 5 * deviation).all()


def test_an_unchanged_row_always_moves() -> None:
    x = np.full((2_000, 8), 0.5)
    unchanged = np.arange(2_000) % 2 == 0
    moved = (polynomial_mutation(x, unchanged, generator()) != x).any(axis=1)
    assert moved[unchanged].all()
    assert not moved[~unchanged].all()


@pytest.mark.parametrize("corner", [0.0, 1e-15, 0.3, 1.0])
def test_no_operator_leaves_the_box(corner: float) -> None:
    random = generator()
    near = np.clip(corner + 1e-3 * random.standard_normal((3, 3_000, 4)), 0.0, 1.0)
    near[:, :500] = corner
    a, b, c = near
    for child in (
        simulated_binary(a, b, random),
        differential(a, b, c, random),
        polynomial_mutation(a, np.ones(3_000, dtype=bool), random),
    ):
        assert np.isfinite(child).all()
        assert (child >= 0.0).all()
        assert (child <= 1.0).all()


def test_differential_is_half_the_difference_added_where_there_is_room() -> None:
    random = generator()
    base, a, b = 0.4 + 0.2 * random.random((3, 100, 2))
    assert np.array_equal(differential(base, a, b, random), base + 0.5 * (a - b))


def test_pairs_differ_and_come_equally_often() -> None:
    pools = np.tile(np.array([[3, 5, 7, 9]]), (ROWS, 1))
    pairs = draw_pairs(pools, generator())
    assert (pairs[:, 0] != pairs[:, 1]).all()
    counts = np.array([(pairs[:, 1] == member).sum() for member in (3, 5, 7, 9)])
    by_chance("the pairs drawn", stats.chisquare(counts).pvalue, "all pairs equally often")
