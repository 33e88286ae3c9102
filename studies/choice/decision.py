"""The best few designs of each family, what each gives away, and which one is taken."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from optimizer.fronts import non_dominated
from studies.choice.candidates import Pool
from studies.choice.preferences import Preferences
from studies.choice.ranking import Scale, achievement, scale_of, weighted_sum
from studies.errors import ResultsError
from studies.stored.naming import split_design_id

FloatArray = NDArray[np.float64]

SMALLEST_BEST = 0.1
"""Best value over the range below which a difference is no longer told in per cent of the best."""


@dataclass(frozen=True)
class Ranked:
    """One design in the ranking.

    Attributes
    ----------
    design : str
    pool : Pool
        Its family.
    score : float
        The smaller the better.
    place : int
        Among all candidates, from 1.
    values : array (c,)
        In their own sense.
    deciding : int
        The criterion that weighs most against it.
    """

    design: str
    pool: Pool
    score: float
    place: int
    values: FloatArray
    deciding: int


@dataclass(frozen=True)
class Decision:
    """A ranking and the design taken.

    Attributes
    ----------
    wanted : Preferences
    pools : tuple of Pool
    ranked : tuple of Ranked
        Best few of each family, by score.
    best : array (c,)
        Best value of each criterion over all candidates, in its own sense.
    best_design : tuple of str
        Who has it.
    scale : Scale
        Minimised values.
    taken : Ranked
    """

    wanted: Preferences
    pools: tuple[Pool, ...]
    ranked: tuple[Ranked, ...]
    best: FloatArray
    best_design: tuple[str, ...]
    scale: Scale
    taken: Ranked

    def given_away(self, item: Ranked) -> FloatArray:
        """What a design gives away against the best value of each criterion, (c,), 0 or more."""
        signs = np.array([criterion.sign for criterion in self.wanted.criteria])
        return np.asarray(signs * (item.values - self.best))

    def given_share(self, item: Ranked) -> FloatArray:
        """The same over the best value, (c,); NaN where that is next to nothing."""
        size = np.abs(self.best)
        usable = size >= SMALLEST_BEST * self.scale.span
        return np.where(usable, self.given_away(item) / np.where(usable, size, 1.0), np.nan)


def decide(pools: list[Pool], wanted: Preferences, count: int, take: str = "") -> Decision | None:
    """Rank all candidates; None if there are none.

    Parameters
    ----------
    pools : list of Pool
    wanted : Preferences
    count : int
        Designs of each family to show; only such that no other of the family beats in every
        criterion.
    take : str
        Design to be taken instead of the best one.

    Raises
    ------
    ResultsError
        If `take` is no candidate.
    """
    signs = np.array([item.sign for item in wanted.criteria])
    weights = np.array([item.weight for item in wanted.criteria])
    owner = np.repeat(np.arange(len(pools)), [len(pool.values) for pool in pools])
    values = np.concatenate([pool.values for pool in pools])
    if not len(values):
        return None
    minimised = values * signs
    scale = scale_of(minimised)
    aspiration = np.array(
        [
            ideal if item.aspiration is None else item.sign * item.aspiration
            for item, ideal in zip(wanted.criteria, scale.ideal.tolist(), strict=True)
        ]
    )
    if wanted.method == "sum":
        aspiration = scale.ideal
        scores = weighted_sum(minimised, weights, scale)
    else:
        scores = achievement(minimised, aspiration, weights, scale)
    against = weights * (minimised - aspiration) / scale.span
    order = np.argsort(scores, kind="stable")
    places = np.empty(len(order), dtype=np.int64)
    places[order] = np.arange(1, len(order) + 1)
    first = np.concatenate([[0], np.cumsum([len(pool.values) for pool in pools])])

    def ranked(row: int) -> Ranked:
        pool = pools[owner[row]]
        return Ranked(
            design=pool.design(row - int(first[owner[row]])),
            pool=pool,
            score=float(scores[row]),
            place=int(places[row]),
            values=values[row],
            deciding=int(np.argmax(against[row])),
        )

    shown: list[Ranked] = []
    for k, pool in enumerate(pools):
        rows = np.arange(first[k], first[k + 1])
        if len(pool.values):
            rows = rows[non_dominated(minimised[rows])]
            shown += [
                ranked(int(row)) for row in rows[np.argsort(scores[rows], kind="stable")][:count]
            ]
    shown.sort(key=lambda item: item.place)
    best_rows = np.argmin(minimised, axis=0)
    return Decision(
        wanted=wanted,
        pools=tuple(pools),
        ranked=tuple(shown),
        best=values[best_rows, np.arange(len(signs))],
        best_design=tuple(ranked(int(row)).design for row in best_rows),
        scale=scale,
        taken=ranked(_row_of(pools, take) if take else int(order[0])),
    )


def _row_of(pools: list[Pool], take: str) -> int:
    """Row of a design among all candidates."""
    before = 0
    found = []
    folder, _, design = take.rpartition("/")
    search, number = split_design_id(design)
    for pool in pools:
        if search in pool.searches and folder in ("", pool.results.folder.name):
            own = pool.owner == pool.searches.index(search)
            found += [
                before + int(row) for row in np.flatnonzero(own & (pool.evaluations == number))
            ]
        before += len(pool.values)
    if len(found) == 1:
        return found[0]
    if found:
        msg = f"{take}: several studies have such a design; write STUDY/{take}"
    else:
        msg = (
            f"{take}: is not among the candidates; it is not stored, or breaks a limit of the "
            "study or one given here"
        )
    raise ResultsError(msg)
