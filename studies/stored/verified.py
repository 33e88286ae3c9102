"""Stored designs evaluated again by another evaluator: where these values lie, and reading them.

``RESULTS/STUDY/FAMILY/verified-EVALUATOR`` is a folder of Parquet parts like those of an archive.
One row is one design: its ``evaluation``, the evaluator with version and settings, every metric
under its own name, ``objective:`` and ``margin:`` columns as in the archive, and beside each number
the archive's (``stored:``) and the deviation from it (``deviation:``, over the size of the
archive's number). The newest row of a design counts.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any, TypeVar
from urllib.parse import quote, unquote

import pyarrow as pa

from evaluators.machine.metrics import METRIC
from optimizer.archive.parts import DamagedPartError, check_part, part_paths, read_part
from optimizer.fronts import non_dominated
from studies.errors import ResultsError
from studies.stored.families import Stored, matrix
from studies.stored.layout import Results

PREFIX = "verified-"
STORED = "stored:"
DEVIATION = "deviation:"
_TRIES = 5  # parts are merged, and the small ones taken away, at the end of a verification
_T = TypeVar("_T")


@dataclass(frozen=True)
class VerifiedRow:
    """One design as another evaluator sees it; `values` are all columns of its row."""

    values: Mapping[str, Any]

    @property
    def evaluator(self) -> str:
        """Name and version of the evaluator."""
        return f"{self.values['evaluator']} {self.values['evaluator_version']}"

    @property
    def ok(self) -> bool:
        """Whether it could be evaluated."""
        return bool(self.values["status"] == "ok")

    @property
    def feasible(self) -> bool:
        """Whether it was evaluated and meets all limits."""
        return bool(self.values["feasible"])

    def number(self, name: str) -> float:
        """A number of the row; NaN if it is not there."""
        value = self.values.get(name)
        return math.nan if value is None else float(value)

    @property
    def metrics(self) -> dict[str, float]:
        """Metrics by name, only those that are numbers."""
        found = {name: self.number(name) for name in METRIC}
        return {name: value for name, value in found.items() if math.isfinite(value)}


@dataclass(frozen=True)
class VerifiedValues:
    """What one evaluator said of one family's designs.

    Attributes
    ----------
    evaluator : str
    rows : mapping of evaluation to VerifiedRow
    damaged : tuple of Path
        Parts that could not be read; their rows are missing.
    """

    evaluator: str
    rows: Mapping[int, VerifiedRow]
    damaged: tuple[Path, ...] = ()


def verified_folder(family_folder: Path, evaluator: str) -> Path:
    """Where the values of one evaluator lie; its name may hold any characters."""
    return family_folder / f"{PREFIX}{quote(evaluator, safe='')}"


def verified_evaluators(family_folder: Path) -> list[str]:
    """Evaluators with stored values, the one that was used last at the end."""
    found = [
        item for item in family_folder.glob(f"{PREFIX}*") if item.is_dir() and part_paths(item)
    ]
    newest = {item: max(part.stat().st_mtime for part in part_paths(item)) for item in found}
    return [
        unquote(item.name.removeprefix(PREFIX))
        for item in sorted(found, key=lambda item: (newest[item], item.name))
    ]


def read_verified(family_folder: Path, evaluator: str) -> VerifiedValues:
    """Read what one evaluator said of one family's designs; empty if nothing is there."""
    folder = verified_folder(family_folder, evaluator)
    if not folder.is_dir():
        return VerifiedValues(evaluator, {})
    return _retried(lambda: _read(folder, evaluator))


def _read(folder: Path, evaluator: str) -> VerifiedValues:
    rows: dict[int, VerifiedRow] = {}
    damaged = []
    for path in part_paths(folder):
        try:
            check_part(path)
            table = read_part(path)
            rows |= {int(row["evaluation"]): VerifiedRow(row) for row in table.to_pylist()}
        except DamagedPartError:
            damaged.append(path)
    return VerifiedValues(evaluator, dict(sorted(rows.items())), tuple(damaged))


def _retried(read: Callable[[], _T]) -> _T:
    for _ in range(_TRIES - 1):
        try:
            return read()
        except FileNotFoundError:
            continue
    return read()


def deviation(verified: float, stored: float) -> float:
    """Verified minus stored value over the size of the stored one; NaN where it has no meaning."""
    if verified == stored:
        return 0.0
    return (verified - stored) / abs(stored) if stored else math.nan


@dataclass(frozen=True)
class VerifiedCounts:
    """How much of a front was verified, and what became of it."""

    evaluator: str
    front: int
    verified: int
    broke_limit: int
    failed: int


@dataclass(frozen=True)
class VerifiedStored(Stored):
    """A family whose front counts with verified values where there are any.

    Of the archive's front, designs that fail or break a limit when verified are left out, and so
    are those that others then dominate. Designs behind that front are not drawn in: their values
    were never verified, and might be better than the verified ones by the model's error alone.
    """

    evaluator: str = ""
    only: bool = False
    """Leave out designs that were not verified."""

    @cached_property
    def values(self) -> VerifiedValues:
        """All verified rows of the family."""
        return read_verified(self.folder, self.evaluator)

    @cached_property
    def searched_front(self) -> pa.Table:
        """The front as the search found it."""
        return Stored(self.study, self.family, self.folder, self.objectives, self.reader).front

    @cached_property
    def verified_counts(self) -> VerifiedCounts:
        """What became of that front."""
        table = self.searched_front
        numbers = table["evaluation"].to_pylist() if table.num_rows else []
        rows = [self.values.rows[item] for item in numbers if item in self.values.rows]
        names = dict.fromkeys(row.evaluator for row in rows)
        return VerifiedCounts(
            evaluator=" and ".join(names) or self.evaluator,
            front=len(numbers),
            verified=len(rows),
            broke_limit=sum(row.ok and not row.feasible for row in rows),
            failed=sum(not row.ok for row in rows),
        )

    @cached_property
    def front(self) -> pa.Table:
        """The front of verified values, with the columns of the archive's."""
        table = self.searched_front
        if not table.num_rows:
            return table
        rows = self.values.rows
        kept = []
        for row in table.to_pylist():
            found = rows.get(row["evaluation"])
            if found is None and not self.only:
                kept.append(row)
            elif found is not None and found.feasible:
                kept.append({name: found.values.get(name, row[name]) for name in row})
        mixed = pa.Table.from_pylist(kept, schema=table.schema)
        if not kept:
            return mixed
        points = matrix(mixed, [f"objective:{name}" for name in self.objectives])
        return mixed.filter(pa.array(non_dominated(points)))


def with_verified(stored: Stored, evaluator: str, only: bool) -> VerifiedStored:
    """The family with verified values in its front."""
    return VerifiedStored(
        stored.study,
        stored.family,
        stored.folder,
        stored.objectives,
        stored.reader,
        evaluator,
        only,
    )


def evaluator_for(opened: Sequence[Results], wanted: str = "") -> str:
    """The evaluator whose values count: the one asked for, else the only one there is.

    Raises
    ------
    ResultsError
        If nothing was verified by it, or several evaluators were used and none is named.
    """
    there = sorted(
        {
            name
            for results in opened
            for family in results.study.families
            for name in verified_evaluators(results.family_folder(family))
        }
    )
    place = opened[0].folder
    if not there:
        msg = f"{place}: nothing is verified yet; `hovergap verify {place}` does it"
        raise ResultsError(msg)
    if wanted and wanted not in there:
        msg = f"{place}: nothing is verified by {wanted!r}; there are values of {', '.join(there)}"
        raise ResultsError(msg)
    if not wanted and len(there) > 1:
        msg = (
            f"{place}: there are verified values of {', '.join(there)}; say whose count with "
            "--verified-by NAME"
        )
        raise ResultsError(msg)
    return wanted or there[0]


def all_verified(family_folder: Path, evaluation: int) -> list[VerifiedRow]:
    """What every evaluator used so far said of one design."""
    found = [
        read_verified(family_folder, name).rows.get(evaluation)
        for name in verified_evaluators(family_folder)
    ]
    return [row for row in found if row is not None]
