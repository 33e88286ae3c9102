"""A verification in words and tables."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.metrics import METRIC
from studies.running.progress import StatusLine, duration, speed
from studies.stored.naming import design_id
from studies.stored.verified import STORED, VerifiedRow
from studies.study_file.definition import Study
from studies.tables import number, percent, text_table
from studies.verification.run import Done, counted

FloatArray = NDArray[np.float64]

MOST_NAMED = 20  # designs named one by one; all are in the Parquet files


class VerifyLine(StatusLine):
    """Progress over all searches.

    Parameters
    ----------
    counts : dict of search to designs planned
    """

    def __init__(self, counts: dict[str, int]) -> None:
        super().__init__()
        self._counts = counts
        self._total = sum(counts.values())
        self._before = 0

    def show(self, search: str, done: int, rate: float) -> None:
        """Designs of `search` done so far, and designs a second (NaN if unknown)."""
        self.put(lambda: self._text(search, done, rate))

    def finish(self, search: str) -> None:
        """Turn to the next search."""
        self._before += self._counts[search]

    def _text(self, search: str, done: int, rate: float) -> str:
        parts = [f"{search}  {done:,}/{self._counts[search]:,}"]
        parts.append(f"all {self._before + done:,}/{self._total:,}")
        if math.isfinite(rate) and rate > 0.0:
            parts.append(f"left {duration((self._total - self._before - done) / rate)}")
            parts.append(speed(rate))
        return "  ".join(parts)


def search_text(done: Done, study: Study) -> str:
    """Deviations and broken limits of the designs of one search."""
    search, rows = done.plan.search, done.rows
    good = [row for row in rows if row.ok]
    broken = [row for row in good if not row.feasible]
    head = (
        f"{search}: {counted(len(rows))} verified by "
        f"{' and '.join(dict.fromkeys(row.evaluator for row in rows))} ({done.new:,} now); "
        f"{len(good) - len(broken):,} meet all limits"
    )
    parts = [head]
    if good:
        parts.append(_table(search, good, study))
    if broken:
        parts.append(_broken(search, broken, study))
    failed = [row for row in rows if not row.ok]
    if failed:
        lines = [
            f"{_name(search, row)} could not be evaluated: {row.values['reason']}" for row in failed
        ]
        parts.append(_shortened(lines))
    return "\n".join(parts)


@dataclass(frozen=True)
class _Quantity:
    """What is compared: its column, name for the reader, unit, and the sign of its column."""

    column: str
    name: str
    unit: str
    sign: float
    absolute: bool


def _quantities(study: Study) -> list[_Quantity]:
    """Objectives, then limited metrics. A share means nothing of what may pass through zero."""
    found: dict[str, _Quantity] = {}
    for goal in study.objectives:
        single = METRIC.get(goal.name)
        unit = _unit(single.unit, study) if single else ""
        signed = bool(single and single.signed)
        column = goal.name if single else f"objective:{goal.name}"
        sign = 1.0 if single else goal.sign
        found[goal.name] = _Quantity(column, goal.name, unit, sign, signed)
    for limit in study.limits:
        metric = METRIC[limit.metric]
        absolute = metric.signed or limit.value == 0.0
        unit = _unit(metric.unit, study)
        found.setdefault(limit.metric, _Quantity(limit.metric, limit.metric, unit, 1.0, absolute))
    return list(found.values())


def _unit(unit: str, study: Study) -> str:
    return {"1": "", "money": study.prices.currency}.get(unit, unit)


def _table(search: str, rows: Sequence[VerifiedRow], study: Study) -> str:
    body = []
    for item in _quantities(study):
        pairs = np.array(
            [(row.number(item.column), row.number(f"{STORED}{item.column}")) for row in rows]
        )
        change = item.sign * (pairs[:, 0] - pairs[:, 1])
        if not item.absolute:
            with np.errstate(divide="ignore", invalid="ignore"):
                change = np.where(pairs[:, 1] == pairs[:, 0], 0.0, change / np.abs(pairs[:, 1]))
        known = np.flatnonzero(np.isfinite(change))
        if not known.size:
            continue
        worst = int(known[np.argmax(np.abs(change[known]))])
        typical = item.sign * np.median(pairs[known], axis=0)
        body.append(
            [
                item.name,
                item.unit,
                number(float(typical[1])),
                number(float(typical[0])),
                _change(float(np.median(change[known])), item),
                _change(float(change[worst]), item),
                _name(search, rows[worst]) if change[worst] else "",
            ]
        )
    head = ["quantity", "unit", "stored", "verified", "deviation", "largest", "at design"]
    note = "Medians over the designs, and the deviation largest in size; shares are of the stored"
    return f"{text_table(head, body, left=2)}\n{note} value."


def _change(value: float, item: _Quantity) -> str:
    if item.absolute:
        return f"{'+' if value > 0.0 else ''}{number(value, 3)}"
    return f"{'+' if value > 0.0 else ''}{percent(value)}"


def _broken(search: str, rows: Sequence[VerifiedRow], study: Study) -> str:
    lines = []
    for row in rows:
        said = [
            f"{limit.text()}, is {number(row.number(limit.metric))}"
            for limit in study.limits
            if row.number(f"margin:{limit.name}") > 0.0
        ]
        lines.append(f"{_name(search, row)} breaks a limit: {'; '.join(said)}")
    return _shortened(lines)


def _shortened(lines: list[str]) -> str:
    if len(lines) <= MOST_NAMED:
        return "\n".join(lines)
    return "\n".join([*lines[:MOST_NAMED], f"... and {len(lines) - MOST_NAMED} more"])


def _name(search: str, row: VerifiedRow) -> str:
    return design_id(search, int(row.values["evaluation"]))
