"""What is said about two families and chance."""

from __future__ import annotations

import numpy as np

from studies.comparison.certainty import FamilySearches, _judged
from studies.comparison.certainty_text import statements
from studies.comparison.ranks import rank_sum_p


def family(label: str, hypervolumes: list[float]) -> FamilySearches:
    count = len(hypervolumes)
    return FamilySearches(
        label=label,
        names=tuple(f"{label}.{k}" for k in range(count)),
        seeds=tuple(range(count)),
        evaluations=(100,) * count,
        fronts=(np.zeros((1, 2)),) * count,
        hypervolumes=np.array(hypervolumes),
    )


def first_sentence(a: FamilySearches, b: FamilySearches) -> str:
    return statements(_judged((a, b)))[0]


def test_clear_order_is_hardly_chance() -> None:
    low, high = [0.1, 0.2, 0.3, 0.4], [0.5, 0.6, 0.7, 0.8]
    # 2 of the 70 ways to deal eight ranks out: 0.029.
    assert first_sentence(family("A", high), family("B", low)) == (
        "A is before B in 16 of 16 pairs of searches (p = 0.029): hardly chance."
    )


def test_overlapping_searches_may_be_chance() -> None:
    said = first_sentence(family("A", [0.2, 0.4, 0.6, 0.8]), family("B", [0.1, 0.3, 0.5, 0.7]))
    # Rank sum 20 against a mean of 18: 48 of the 70 ways are as far off.
    assert said.endswith("(p = 0.69): may be chance.")


def test_ranks_against_the_medians_are_told() -> None:
    """The middle search is better, but nearly all others are worse."""
    first = [*(0.1 + 0.001 * np.arange(9)), 0.5, *(0.51 + 0.01 * np.arange(9))]
    second = [*(0.4 + 0.001 * np.arange(9)), 0.499, *(0.6 + 0.01 * np.arange(9))]
    assert np.median(first) > np.median(second)
    assert rank_sum_p(first, second) < 0.05
    said = first_sentence(family("A", first), family("B", second))
    assert said.endswith(": hardly chance, and against the order of their medians.")
