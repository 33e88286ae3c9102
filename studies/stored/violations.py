"""How far the evaluated designs of a family are from meeting all limits."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from studies.stored.families import StoredFamily, matrix
from studies.stored.naming import design_id


@dataclass(frozen=True)
class Violation:
    """How far one evaluated design is from meeting all limits."""

    design: str
    total: float
    margins: Mapping[str, float]


def least_violating(stored: StoredFamily, limits: list[str], count: int) -> list[Violation]:
    """Evaluated designs with the smallest sum of violated margins, best first.

    Parameters
    ----------
    stored : StoredFamily
    limits : list of str
        Names of the margins.
    count : int
        How many.
    """
    names = [f"margin:{name}" for name in limits]
    found = []
    for search in stored.searches:
        table = search.reader.table(["evaluation", "status", *names])
        if not table.num_rows:
            continue
        margins = matrix(table, names)
        good = np.asarray(table["status"].to_pylist()) == "ok"
        total = np.where(good, np.maximum(margins, 0.0).sum(axis=1), math.inf)
        order = np.argsort(total, kind="stable")[:count]
        evaluations = table["evaluation"].to_numpy()
        found += [
            Violation(
                design_id(search.name, int(evaluations[row])),
                float(total[row]),
                dict(zip(limits, margins[row].tolist(), strict=True)),
            )
            for row in order
            if math.isfinite(total[row])
        ]
    return sorted(found, key=lambda item: item.total)[:count]


def violation_statistics(stored: StoredFamily, limits: list[str]) -> dict[str, tuple[float, float]]:
    """Share of evaluated designs that break each limit, and the smallest violation or reserve."""
    names = [f"margin:{name}" for name in limits]
    table = stored.table(["status", *names])
    if not table.num_rows:
        return {}
    good = np.asarray(table["status"].to_pylist()) == "ok"
    margins = matrix(table, names)[good]
    if not len(margins):
        return {}
    return {
        name: (float(np.mean(column > 0.0)), float(column.min()))
        for name, column in zip(limits, margins.T, strict=True)
    }
