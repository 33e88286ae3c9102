"""One budget for all families: who shows no prospect makes room for the others.

The budget is spent in rounds, each shared evenly among the searches still going on. After a
round a family is given up, with all its searches, if it could not catch up at its own pace; its
searches are judged together, for were one of them cut short alone, they could no longer be held
against each other. The judgement rests on the
first rows of each archive alone, so that an interrupted sweep comes to the same one.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from optimizer.archive.archive import is_archive, open_archive
from optimizer.fronts import hypervolume, hypervolume_estimate, non_dominated
from optimizer.running.tally import EXACT_OBJECTIVES
from studies.stored.families import matrix
from studies.stored.layout import Results
from studies.stored.naming import family_of

FloatArray = NDArray[np.float64]

ROUNDS = 5
_CORNER = 1.1  # reference point, so that the ends of a front count too


@dataclass(frozen=True)
class Rows:
    """Feasible rows of one family among the first ``wanted`` of each of its searches.

    Attributes
    ----------
    evaluations : (n,) array of int
    objectives : (n, m) array
    wanted : int
    """

    evaluations: NDArray[np.int64]
    objectives: FloatArray
    wanted: int

    def front(self, first: int) -> FloatArray:
        """Front (k, m) of the feasible rows among the ``first``."""
        points = self.objectives[self.evaluations < first]
        return points[non_dominated(points)] if len(points) else points


def read_rows(results: Results, quota: Mapping[str, int]) -> dict[str, Rows]:
    """Read what :func:`prospects` judges by.

    Parameters
    ----------
    results : Results
    quota : mapping of search to int
        How many rows of each search count.

    Returns
    -------
    dict of family to Rows
    """
    goals = [f"objective:{goal.name}" for goal in results.study.objectives]
    parts: dict[str, list[Rows]] = {}
    for name, wanted in quota.items():
        parts.setdefault(family_of(name), []).append(_rows(results, name, goals, wanted))
    return {
        family: Rows(
            np.concatenate([item.evaluations for item in found]),
            np.concatenate([item.objectives for item in found]),
            max(item.wanted for item in found),
        )
        for family, found in parts.items()
    }


def _rows(results: Results, name: str, goals: list[str], wanted: int) -> Rows:
    folder = results.search_folder(name)
    none = Rows(np.zeros(0, dtype=np.int64), np.zeros((0, len(goals))), wanted)
    if not is_archive(folder):
        return none
    table = open_archive(folder).table(["evaluation", "feasible", *goals])
    if not table.num_rows:
        return none
    evaluations = table["evaluation"].to_numpy()
    chosen = table["feasible"].to_numpy() & (evaluations < wanted)
    return Rows(evaluations[chosen], matrix(table, goals)[chosen], wanted)


def prospects(rows: Mapping[str, Rows], most: Mapping[str, int]) -> dict[str, str]:
    """Families to be given up, with the reason.

    A family goes if it has no feasible design though others have; or if none of its designs is
    on the joint front, and its hypervolume in the box of all fronts, growing as over the second
    half of its rows, would not reach that of the best family with all it could still get.

    Parameters
    ----------
    rows : mapping of family to Rows
    most : mapping of family to int
        Evaluations each of its searches could hold in the end.
    """
    fronts = {family: item.front(item.wanted) for family, item in rows.items()}
    found = {family: front for family, front in fronts.items() if len(front)}
    if not found:
        return {}
    gone = {
        family: f"no feasible design in {rows[family].wanted:,} evaluations, other families have"
        for family in rows
        if family not in found
    }
    everything = np.concatenate(list(found.values()))
    best = non_dominated(everything)
    owner = np.repeat(list(found), [len(front) for front in found.values()])
    low, high = everything.min(axis=0), everything.max(axis=0)
    span = np.where(high > low, high - low, 1.0)
    measure = hypervolume if len(low) <= EXACT_OBJECTIVES else hypervolume_estimate

    def volume(front: FloatArray) -> float:
        return measure((front - low) / span, np.full(len(low), _CORNER)) if len(front) else 0.0

    volumes = {family: volume(front) for family, front in found.items()}
    leader = max(volumes.values())
    for family, now in volumes.items():
        if best[owner == family].any():
            continue
        wanted = rows[family].wanted
        half = wanted // 2
        pace = (now - volume(rows[family].front(half))) / (wanted - half)
        if now + pace * max(most[family] - wanted, 0) < leader:
            gone[family] = (
                f"after {wanted:,} evaluations others dominate its whole front, and at its pace "
                "it would not catch up"
            )
    return gone
