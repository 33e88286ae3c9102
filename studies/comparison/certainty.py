"""How sure the order of the families is: their searches held against each other one by one.

A search is a random process, so the hypervolume a family reaches depends on its seed too. Several
searches of each family show how much: on the scale of the whole comparison each search has a
hypervolume of its own, and ranks tell whether those of two families differ by more than chance.

The test takes all searches as independent. Those of one study are, by their seeds, but for the
first search of each family, which all start from the study's own seed.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations, pairwise
from typing import Any

import numpy as np
from numpy.typing import NDArray

from optimizer.fronts import hypervolume, normalise
from studies.comparison.numbers import REFERENCE, Comparison
from studies.comparison.ranks import (
    Overall,
    holm,
    kruskal_wallis,
    least_p,
    rank_sum_p,
    sizes_needed,
    superiority,
)
from studies.stored.verified import VerifiedFamily

FloatArray = NDArray[np.float64]

LEVEL = 0.05  # chance of one wrong decision among all pairs of families that is put up with


@dataclass(frozen=True)
class FamilySearches:
    """The searches of one family.

    Attributes
    ----------
    label : str
    names : tuple of str
    seeds, evaluations : tuple of int
    fronts : tuple of array (n, m)
        Of each search alone, on the common scale.
    hypervolumes : array (n,)
        Share of the common box that each of them dominates.
    """

    label: str
    names: tuple[str, ...]
    seeds: tuple[int, ...]
    evaluations: tuple[int, ...]
    fronts: tuple[FloatArray, ...]
    hypervolumes: FloatArray

    @property
    def median(self) -> float:
        """Median of the hypervolumes."""
        return float(np.median(self.hypervolumes))

    def __len__(self) -> int:
        return len(self.names)


@dataclass(frozen=True)
class Pair:
    """Two families, the one with the larger median first.

    Attributes
    ----------
    first, second : str
    pairs, ahead, equal : int
        Pairs of a search of each, and in how many of them the first has the larger or the same
        hypervolume.
    probability : float
        That a search of the first reaches more than one of the second (`ranks.superiority`).
    p : float
        Of the rank-sum test alone.
    corrected : float
        The same corrected for the number of pairs of families.
    """

    first: str
    second: str
    pairs: int
    ahead: int
    equal: int
    probability: float
    p: float
    corrected: float

    @property
    def sure(self) -> bool:
        """Whether chance alone would hardly put them in this order."""
        return self.corrected <= LEVEL


@dataclass(frozen=True)
class Certainty:
    """How sure the order is.

    Attributes
    ----------
    families : tuple of FamilySearches
        The one with the largest median first.
    pairs : tuple of Pair
        Of all families, in that order.
    overall : Overall or None
        Test of all families together; None for fewer than three.
    least_p : float
        Smallest p-value that any two of the families can give, before the correction.
    needed : int
        Searches of each family with which two families could be told apart.
    """

    families: tuple[FamilySearches, ...]
    pairs: tuple[Pair, ...]
    overall: Overall | None
    least_p: float
    needed: int

    @property
    def can_decide(self) -> bool:
        """Whether any two families could be told apart by so few searches."""
        return bool(self.pairs) and self.least_p * len(self.pairs) <= LEVEL

    @property
    def efforts(self) -> tuple[int, int]:
        """Fewest and most evaluations of a search."""
        counts = [count for family in self.families for count in family.evaluations]
        return min(counts), max(counts)

    def neighbours(self) -> list[Pair]:
        """Pairs that follow each other in the order."""
        found = {(pair.first, pair.second): pair for pair in self.pairs}
        labels = [family.label for family in self.families]
        return [found[pair] for pair in pairwise(labels)]


def needed_searches(families: int) -> int:
    """Searches of each of so many families with which two of them could be told apart."""
    return sizes_needed(LEVEL, max(families * (families - 1) // 2, 1))


def order_certainty(comparison: Comparison) -> Certainty | None:
    """How sure the order of the families of a comparison is.

    None if every family was searched once only, if there is no front at all, or if verified values
    count: few of them are verified of each search, and not the same share of each.
    """
    members = comparison.members
    if (
        all(len(member.stored.searches) == 1 for member in members)
        or not np.isfinite(comparison.ideal).all()
        or any(isinstance(member.stored, VerifiedFamily) for member in members)
    ):
        return None
    corner = np.full(len(comparison.objectives), REFERENCE)
    found = []
    for member in members:
        prefix = member.label.removesuffix(member.stored.family)
        searches = member.stored.searches
        fronts = tuple(
            normalise(points, comparison.ideal, comparison.nadir) if len(points) else points
            for points in (search.front_objectives for search in searches)
        )
        volumes = [
            hypervolume(front, corner) / float(np.prod(corner)) if len(front) else 0.0
            for front in fronts
        ]
        found.append(
            FamilySearches(
                label=member.label,
                names=tuple(f"{prefix}{search.name}" for search in searches),
                seeds=tuple(int(search.reader.settings["seed"]) for search in searches),
                evaluations=tuple(search.counts[0] for search in searches),
                fronts=fronts,
                hypervolumes=np.array(volumes),
            )
        )
    found.sort(key=lambda family: family.median, reverse=True)
    return _judged(tuple(found))


def _judged(families: tuple[FamilySearches, ...]) -> Certainty:
    couples = list(combinations(families, 2))
    plain = [rank_sum_p(a.hypervolumes, b.hypervolumes) for a, b in couples]
    pairs = [
        Pair(
            first=a.label,
            second=b.label,
            pairs=len(a) * len(b),
            ahead=int((a.hypervolumes[:, None] > b.hypervolumes).sum()),
            equal=int((a.hypervolumes[:, None] == b.hypervolumes).sum()),
            probability=superiority(a.hypervolumes, b.hypervolumes),
            p=p,
            corrected=corrected,
        )
        for (a, b), p, corrected in zip(couples, plain, holm(plain), strict=True)
    ]
    several = len(families) > 2
    return Certainty(
        families=families,
        pairs=tuple(pairs),
        overall=kruskal_wallis([item.hypervolumes for item in families]) if several else None,
        least_p=min((least_p(len(a), len(b)) for a, b in couples), default=1.0),
        needed=needed_searches(len(families)),
    )


def certainty_json(certainty: Certainty | None) -> dict[str, Any] | None:
    """The certainty as values of JSON."""
    if certainty is None:
        return None
    overall = certainty.overall
    return {
        "level": LEVEL,
        "searches": search_rows(certainty),
        "pairs": pair_rows(certainty),
        "overall": overall and {"kruskal_wallis_H": overall.statistic, "p": overall.p},
        "smallest_possible_p": certainty.least_p,
        "searches_needed": certainty.needed,
    }


def search_rows(certainty: Certainty) -> list[dict[str, Any]]:
    """One row a search."""
    return [
        {
            "label": family.label,
            "search": name,
            "seed": seed,
            "evaluations": count,
            "front_size": len(front),
            "hypervolume": float(volume),
        }
        for family in certainty.families
        for name, seed, count, front, volume in zip(
            family.names,
            family.seeds,
            family.evaluations,
            family.fronts,
            family.hypervolumes,
            strict=True,
        )
    ]


def pair_rows(certainty: Certainty) -> list[dict[str, Any]]:
    """One row a pair of families."""
    return [
        {
            "first": pair.first,
            "second": pair.second,
            "pairs_of_searches": pair.pairs,
            "first_ahead": pair.ahead,
            "equal": pair.equal,
            "probability": pair.probability,
            "p": pair.p,
            "p_corrected": pair.corrected,
        }
        for pair in certainty.pairs
    ]
