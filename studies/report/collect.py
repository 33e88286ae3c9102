"""What a report shows, read from the results folders: fronts, context, statistics."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from evaluators.machine.metrics import METRICS
from evaluators.machine.winding.winding import Winding
from optimizer.fronts import hypervolume, non_dominated, normalise
from studies.comparison.certainty import Certainty, order_certainty
from studies.comparison.numbers import REFERENCE, Comparison, Member, compare_families
from studies.errors import ResultsError
from studies.report.columns import Column, report_columns, stored_names, values
from studies.report.thinning import spread
from studies.report.verified import Verified, verified_values
from studies.stored.families import Stored, StoredFamily, matrix
from studies.stored.layout import Results
from studies.stored.naming import split_design_id

FloatArray = NDArray[np.float64]

SHOWN = 100
"""Designs of one front shown in full."""
CONTEXT = 20_000
"""Other feasible designs drawn in the background, of all families together."""
CONTEXT_NUMBERS = 2_400_000
"""Numbers kept of them; each takes 2.7 bytes of the page, which shall stay below 10 MB."""
CHECKPOINTS = 40
"""Points of the curve of search progress."""


@dataclass(frozen=True)
class FamilyData:
    """One family in the report.

    Attributes
    ----------
    shown : Table
        The designs of the front that have a card, in order of evaluation.
    ids : list of str
    values : array (n, columns)
        Of the designs shown.
    front_values : array (k, columns)
        Of the whole front.
    context : array (c, columns)
        Other feasible designs, the rest of the front among them.
    progress : tuple of array (points, 2)
        Of each search, evaluations and hypervolume of what was found until then, on the report's
        scale.
    compromise : int or None
        Row of `shown`.
    """

    member: Member
    results: Results
    winding: Winding
    shown: pa.Table
    ids: list[str]
    values: FloatArray
    front_values: FloatArray
    context: FloatArray
    progress: tuple[FloatArray, ...]
    compromise: int | None
    verified: dict[str, Verified]

    @property
    def label(self) -> str:
        """Name in the report."""
        return self.member.label

    @property
    def front_size(self) -> int:
        """Designs on the whole front."""
        return len(self.front_values)


@dataclass(frozen=True)
class ReportData:
    """Everything the page is made of."""

    opened: tuple[Results, ...]
    comparison: Comparison
    columns: tuple[Column, ...]
    families: tuple[FamilyData, ...]
    certainty: Certainty | None

    def position(self, name: str) -> int:
        """Index of the column called `name`."""
        return next(i for i, column in enumerate(self.columns) if column.name == name)


def collect(opened: Sequence[Results], shown: int = SHOWN) -> ReportData:
    """Read all families of one or several studies.

    Raises
    ------
    ResultsError
        If nothing is stored, the studies have different objectives or currencies, or no family
        has a feasible design.
    """
    comparison = compare_families(opened)
    currencies = {results.study.prices.currency for results in opened}
    if len(currencies) > 1:
        msg = (
            f"the studies count in {' and '.join(sorted(currencies))}, so their costs cannot be "
            "drawn on one axis"
        )
        raise ResultsError(msg)
    if not any(len(member.stored.front_ids) for member in comparison.members):
        msg = (
            f"{opened[0].folder}: no design meets all limits, so there is no front to report; "
            "`hovergap compare` says what comes nearest"
        )
        raise ResultsError(msg)
    there = {name for member in comparison.members for name in member.stored.columns}
    metrics = [metric.name for metric in METRICS if metric.name in there]
    columns = report_columns(comparison.objectives, metrics, currencies.pop())
    feasible = [member.stored.counts[1] for member in comparison.members]
    step = max(1, -(-sum(feasible) // min(CONTEXT, CONTEXT_NUMBERS // len(columns))))
    families = tuple(
        _family(member, comparison, columns, shown, step) for member in comparison.members
    )
    return ReportData(tuple(opened), comparison, columns, families, order_certainty(comparison))


def _family(
    member: Member,
    comparison: Comparison,
    columns: tuple[Column, ...],
    shown: int,
    step: int,
) -> FamilyData:
    stored = member.stored
    front = stored.front
    points = stored.front_objectives
    rows = np.zeros(0, dtype=np.int64)
    if len(points):
        rows = spread(normalise(points, comparison.ideal, comparison.nadir), shown)
        if member.compromise is not None and member.compromise not in rows:
            rows = np.sort(np.append(rows, member.compromise))
    chosen = front.take(pa.array(rows)) if front.num_rows else front
    goals = comparison.objectives
    ids = [stored.front_ids[int(row)] for row in rows]
    compromise = None
    if member.compromise is not None:
        compromise = int(np.flatnonzero(rows == member.compromise)[0])
    return FamilyData(
        member=member,
        results=member.results,
        winding=member.results.study.winding(stored.family),
        shown=chosen,
        ids=ids,
        values=values(chosen, columns, goals),
        front_values=values(front, columns, goals),
        context=_context(stored, columns, comparison, set(ids), step),
        progress=tuple(_progress(search, comparison) for search in stored.searches),
        compromise=compromise,
        verified=verified_values(stored),
    )


def _context(
    stored: StoredFamily,
    columns: tuple[Column, ...],
    comparison: Comparison,
    shown: set[str],
    step: int,
) -> FloatArray:
    """Every `step`-th feasible design of all searches that is not shown."""
    taken: dict[str, list[int]] = {}
    for design in shown:
        name, evaluation = split_design_id(design)
        taken.setdefault(name, []).append(evaluation)
    found = [np.zeros((0, len(columns)))]
    for search in stored.searches:
        known = [name for name in stored_names(columns) if name in search.reader.schema.names]
        table = search.reader.table(["evaluation", "feasible", *known])
        if table.num_rows:
            others = ~np.isin(table["evaluation"].to_numpy(), taken.get(search.name, []))
            keep = pa.array(table["feasible"].to_numpy() & others)
            found.append(values(table.filter(keep), columns, comparison.objectives))
    return np.concatenate(found)[::step]


def _progress(stored: Stored, comparison: Comparison) -> FloatArray:
    """Hypervolume of the designs found until each checkpoint, as a share of the common box."""
    names = [f"objective:{goal.name}" for goal in comparison.objectives]
    table = stored.reader.table(["evaluation", "feasible", *names])
    if not table.num_rows or not np.isfinite(comparison.ideal).all():
        return np.zeros((0, 2))
    feasible = np.flatnonzero(table["feasible"].to_numpy())
    points = normalise(matrix(table, names)[feasible], comparison.ideal, comparison.nadir)
    corner = np.full(len(names), REFERENCE)
    total = table.num_rows
    curve = []
    front = np.zeros((0, len(names)))
    before = 0
    for end in np.unique(np.linspace(0, total, CHECKPOINTS + 1).astype(int)[1:]):
        count = int(np.searchsorted(feasible, end))
        if count > before:
            front = np.concatenate([front, points[before:count]])
            front = front[non_dominated(front)]
            before = count
        reached = hypervolume(front, corner) / REFERENCE ** len(names) if len(front) else 0.0
        curve.append((float(end), reached))
    return np.array(curve)
