"""What ranks tell about samples: whether they differ by more than chance, and by how much.

Everything is exact for small samples with ties: the distribution of a rank sum comes from counting
all ways to deal the ranks out, not from a normal or chi-square approximation.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import combinations
from math import comb, factorial, prod

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

MOST_ORDERS = 20_000  # that Kruskal and Wallis's test looks at, all of them where there are fewer


def midranks(values: ArrayLike) -> FloatArray:
    """Ranks (n,) from 1; equal values share the mean of theirs."""
    array = np.asarray(values, dtype=np.float64)
    _, place, counts = np.unique(array, return_inverse=True, return_counts=True)
    last = np.cumsum(counts)
    return np.asarray((last - 0.5 * (counts - 1))[place], dtype=np.float64)


def superiority(first: ArrayLike, second: ArrayLike) -> float:
    """Probability that a value of the first sample exceeds one of the second, ties counted half.

    The effect size A of Vargha and Delaney, J. Educ. Behav. Stat. 25 (2000) 101-132: 0.5 for no
    difference, 1 if every value of the first exceeds every one of the second.
    """
    a, b = np.asarray(first, dtype=np.float64), np.asarray(second, dtype=np.float64)
    larger, equal = a[:, None] > b[None], a[:, None] == b[None]
    return float(np.mean(larger + 0.5 * equal))


def rank_sum_p(first: ArrayLike, second: ArrayLike) -> float:
    """Two-sided p-value of the rank-sum test of two independent samples, exact also with ties.

    Mann and Whitney, Ann. Math. Stat. 18 (1947) 50-60: the share of all ways to deal the ranks out
    to the two samples that put the rank sum at least as far from its mean.
    """
    a, b = np.asarray(first, dtype=np.float64), np.asarray(second, dtype=np.float64)
    doubled = np.rint(2.0 * midranks(np.concatenate([a, b]))).astype(np.int64)
    size, total = len(a), int(doubled.sum())
    # Share of all subsets that hold k ranks and sum to s; halved with every rank dealt out.
    share = np.zeros((size + 1, total + 1))
    share[0, 0] = 1.0
    for rank in doubled.tolist():
        taken = share[:-1, : total + 1 - rank].copy()
        share *= 0.5
        share[1:, rank:] += 0.5 * taken
    mean = size * (len(doubled) + 1)
    far = abs(int(doubled[:size].sum()) - mean)
    ways = share[size]
    extreme = np.abs(np.arange(total + 1) - mean) >= far
    return float(min(ways[extreme].sum() / ways.sum(), 1.0))


def least_p(first: int, second: int) -> float:
    """Smallest p-value `rank_sum_p` can give for samples of these sizes."""
    return min(2.0 / comb(first + second, first), 1.0)


def sizes_needed(level: float, comparisons: int) -> int:
    """Values of each sample without which no comparison of so many can reach `level`.

    With Holm's correction, and samples of equal size.
    """
    size = 1
    while least_p(size, size) * comparisons > level:
        size += 1
    return size


def holm(p_values: Sequence[float]) -> list[float]:
    """P-values corrected for their number, in the order given.

    Holm, Scand. J. Stat. 6 (1979) 65-70: to be held against the level as they are; the chance of
    even one false decision then stays below it.
    """
    order = sorted(range(len(p_values)), key=lambda item: p_values[item])
    corrected = [0.0] * len(p_values)
    largest = 0.0
    for position, item in enumerate(order):
        largest = max(largest, min((len(order) - position) * p_values[item], 1.0))
        corrected[item] = largest
    return corrected


@dataclass(frozen=True)
class Overall:
    """Test of several samples at once.

    Attributes
    ----------
    statistic : float
        Kruskal and Wallis's H, corrected for ties.
    p : float
    orders : int
        Ways to deal the ranks out that were looked at.
    exact : bool
        Whether these are all there are.
    """

    statistic: float
    p: float
    orders: int
    exact: bool


def kruskal_wallis(samples: Sequence[ArrayLike]) -> Overall:
    """Whether some of several independent samples differ.

    Kruskal and Wallis, J. Am. Stat. Assoc. 47 (1952) 583-621. The p-value is the share of all
    ways to deal the ranks out with at least this H, or of `MOST_ORDERS` random ones of a fixed
    seed (the one at hand counted among them) where there are more.
    """
    sizes = [len(np.asarray(item)) for item in samples]
    ranks = midranks(np.concatenate([np.asarray(item, dtype=np.float64) for item in samples]))
    # Whole numbers: H grows with this sum, and equal sums must compare as equal.
    doubled = np.rint(2.0 * ranks).astype(np.int64)
    ends = np.cumsum(sizes)[:-1]

    def spread(dealt: NDArray[np.int64]) -> FloatArray:
        parts = np.split(dealt, ends, axis=-1)
        return np.asarray(
            sum(part.sum(axis=-1) ** 2 / size for part, size in zip(parts, sizes, strict=True)),
            dtype=np.float64,
        )

    count = len(ranks)
    _, ties = np.unique(doubled, return_counts=True)
    untied = 1.0 - float((ties**3 - ties).sum()) / max(count**3 - count, 1)
    here = float(spread(doubled))
    raw = 12.0 / (count * (count + 1)) * here / 4.0 - 3.0 * (count + 1)
    statistic = raw / untied if untied > 0.0 else 0.0
    ways = factorial(count) // prod(factorial(size) for size in sizes)
    if ways <= MOST_ORDERS:
        dealt = doubled[np.array(list(_dealt(tuple(range(count)), sizes)))]
    else:
        generator = np.random.default_rng(1)
        dealt = generator.permuted(np.tile(doubled, (MOST_ORDERS, 1)), axis=1)
        dealt[0] = doubled
    # Sums of squares over sizes that do not divide them are rounded.
    reached = spread(dealt) >= here * (1.0 - 1e-12)
    return Overall(statistic, float(np.mean(reached)), len(dealt), ways <= MOST_ORDERS)


def _dealt(rest: tuple[int, ...], sizes: Sequence[int]) -> Iterator[tuple[int, ...]]:
    """All ways to deal numbers out to samples of these sizes, sample after sample."""
    if len(sizes) == 1:
        yield rest
        return
    for chosen in combinations(rest, sizes[0]):
        left = tuple(item for item in rest if item not in chosen)
        for others in _dealt(left, sizes[1:]):
            yield chosen + others
