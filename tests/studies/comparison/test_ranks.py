"""Rank tests against a statistics library, printed tables and counting by hand."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest
from outside import OutsideChecks
from scipy import stats

from studies.comparison.ranks import (
    holm,
    kruskal_wallis,
    least_p,
    midranks,
    rank_sum_p,
    sizes_needed,
    superiority,
)

check = OutsideChecks("studies")
SCIPY = "scipy.stats"


@pytest.mark.parametrize(("first", "second"), [(1, 1), (3, 3), (3, 7), (6, 5), (9, 9), (20, 20)])
def test_rank_sum_agrees_with_scipy(first: int, second: int) -> None:
    generator = np.random.default_rng(first)
    for shift in (0.0, 0.7, 5.0):
        a, b = generator.normal(size=first), generator.normal(size=second) + shift
        wanted = stats.mannwhitneyu(a, b, method="exact").pvalue
        check(
            "p-value of the exact rank-sum test",
            rank_sum_p(a, b),
            wanted,
            relative=1e-12,
            why="rounding of sums",
            source=SCIPY,
        )
        assert rank_sum_p(b, a) == pytest.approx(wanted, rel=1e-12)  # rounding


def test_rank_sum_with_ties_counts_every_way_to_deal_the_ranks() -> None:
    a, b = [1.0, 2.0, 2.0, 5.0], [2.0, 3.0, 3.0, 4.0, 5.0]
    ranks = stats.rankdata([*a, *b])
    assert midranks([*a, *b]).tolist() == ranks.tolist()
    sums = np.array([sum(chosen) for chosen in combinations(ranks, len(a))])
    middle = sums.mean()
    far = abs(ranks[: len(a)].sum() - middle)
    # Ranks are multiples of a half, so the sums and their comparison are exact.
    assert rank_sum_p(a, b) == pytest.approx(np.mean(np.abs(sums - middle) >= far), rel=1e-12)


def test_samples_that_are_equal_are_not_told_apart() -> None:
    same = [0.3, 0.4, 0.5, 0.6]
    assert rank_sum_p(same, same) == 1.0
    assert rank_sum_p([0.5] * 3, [0.5] * 5) == 1.0
    assert superiority(same, same) == 0.5
    assert kruskal_wallis([same, same, same]).p == 1.0
    assert kruskal_wallis([[1.0, 1.0], [1.0, 1.0], [1.0]]).p == 1.0


# Largest U with a two-sided p of at most 0.05 (Mann and Whitney's table as printed in textbooks of
# nonparametric statistics, from memory).
CRITICAL = {
    (4, 4): 0,
    (4, 5): 1,
    (5, 5): 2,
    (5, 6): 3,
    (6, 6): 5,
    (7, 7): 8,
    (8, 8): 13,
    (10, 10): 23,
}


def samples_with(u: int, first: int, second: int) -> tuple[list[float], list[float]]:
    """Two samples without ties of which `u` pairs have the first ahead."""
    beaten = [min(max(u - second * item, 0), second) for item in range(first)]
    return [count + 0.5 + 0.01 * item for item, count in enumerate(beaten)], [
        float(item) for item in range(1, second + 1)
    ]


@pytest.mark.parametrize("sizes", CRITICAL)
def test_rank_sum_has_the_printed_critical_values(sizes: tuple[int, int]) -> None:
    largest = max(
        u for u in range(sizes[0] * sizes[1] // 2) if rank_sum_p(*samples_with(u, *sizes)) <= 0.05
    )
    check.same(
        "largest U of the rank-sum test at two-sided 5 %",
        largest,
        CRITICAL[sizes],
        source="table of Mann and Whitney's U in textbooks, from memory",
    )


def test_least_p_is_that_of_samples_apart() -> None:
    for first, second in ((1, 1), (3, 3), (4, 6), (6, 6)):
        apart = list(range(first)), list(range(100, 100 + second))
        assert least_p(first, second) == pytest.approx(rank_sum_p(*apart), rel=1e-12)  # rounding
    # 2/20 for three against three cannot reach 0.05, 2/70 for four against four can.
    assert sizes_needed(0.05, 1) == 4
    assert least_p(6, 6) * 15 <= 0.05 < least_p(5, 5) * 15
    assert sizes_needed(0.05, 15) == 6


def test_superiority_is_the_probability_and_fits_the_rank_sum() -> None:
    a, b = np.array([3.0, 4.0, 4.0]), np.array([1.0, 3.0, 4.0, 9.0])
    ahead = sum(float(x > y) + 0.5 * float(x == y) for x in a for y in b)
    assert superiority(a, b) == ahead / 12.0
    check(
        "effect size A times both sizes, the statistic U",
        superiority(a, b) * 12.0,
        stats.mannwhitneyu(a, b).statistic,
        relative=1e-12,
        why="rounding",
        source=SCIPY,
    )
    assert superiority(b, a) == pytest.approx(1.0 - superiority(a, b), rel=1e-12)  # rounding


# Sizes of three samples, H, and its exact p to three digits (table of Kruskal and Wallis 1952 as
# printed in textbooks, from memory).
KRUSKAL = [
    ([[1, 2], [3, 4], [5, 6]], 4.571, 0.067),
    ([[1, 2, 3], [4, 5], [6, 7]], 5.357, 0.029),
    ([[1, 2, 3], [4, 5, 6], [7, 8, 9]], 7.200, 0.004),
]


@pytest.mark.parametrize(("samples", "statistic", "p"), KRUSKAL)
def test_kruskal_wallis_has_the_printed_values(
    samples: list[list[float]], statistic: float, p: float
) -> None:
    found = kruskal_wallis(samples)
    assert found.exact
    source = "table of Kruskal and Wallis's H in textbooks, from memory"
    why = "three printed decimals"
    check("H of samples apart", found.statistic, statistic, absolute=5e-4, why=why, source=source)
    check("p-value of that H", found.p, p, absolute=5e-4, why=why, source=source)


def test_kruskal_wallis_against_scipy() -> None:
    generator = np.random.default_rng(7)
    samples = [np.round(generator.normal(size=8) + 0.5 * item, 1) for item in range(4)]  # with ties
    found = kruskal_wallis(samples)
    wanted = stats.kruskal(*samples)
    check(
        "H with ties",
        found.statistic,
        wanted.statistic,
        relative=1e-10,
        why="rounding of a difference of large sums",
        source=SCIPY,
    )
    assert not found.exact
    # A chi-square approximation for samples of eight, and 20,000 random orders.
    assert found.p == pytest.approx(wanted.pvalue, abs=0.01)
    again = kruskal_wallis(samples)
    assert again == found


def test_holm_as_worked_by_hand() -> None:
    # 4 x 0.01, 3 x 0.02, then never less than before (Holm 1979, worked by hand).
    assert holm([0.03, 0.01, 0.02, 0.5]) == pytest.approx([0.06, 0.04, 0.06, 0.5], rel=1e-12)
    assert holm([0.6, 0.7]) == [1.0, 1.0]
    assert holm([]) == []
