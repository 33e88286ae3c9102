"""Stored designs evaluated again by another evaluator: where these values lie, and reading them.

``RESULTS/STUDY/SEARCH/verified-EVALUATOR`` is a folder of Parquet parts like those of an archive.
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
from studies.stored.families import StoredFamily, matrix, stored_families
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
    """What one evaluator said of the designs of one search.

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


def verified_folder(folder: Path, evaluator: str) -> Path:
    """Where the values of one evaluator lie; its name may hold any characters."""
    return folder / f"{PREFIX}{quote(evaluator, safe='')}"


def verified_evaluators(folder: Path) -> list[str]:
    """Evaluators with stored values, the one that was used last at the end."""
    found = [item for item in folder.glob(f"{PREFIX}*") if item.is_dir() and part_paths(item)]
    newest = {item: max(part.stat().st_mtime for part in part_paths(item)) for item in found}
    return [
        unquote(item.name.removeprefix(PREFIX))
        for item in sorted(found, key=lambda item: (newest[item], item.name))
    ]


def read_verified(folder: Path, evaluator: str) -> VerifiedValues:
    """Read what one evaluator said of the designs of one search; empty if nothing is there."""
    place = verified_folder(folder, evaluator)
    if not place.is_dir():
        return VerifiedValues(evaluator, {})
    return _retried(lambda: _read(place, evaluator))


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
class VerifiedFamily(StoredFamily):
    """A family whose front counts with verified values where there are any.

    Of the front as it was searched, designs that fail or break a limit when verified are left
    out, and so are those that others then dominate. Designs behind that front are not drawn in:
    their values were never verified, and might be better than the verified ones by the model's
    error alone.
    """

    evaluator: str = ""
    only: bool = False
    """Leave out designs that were not verified."""

    @cached_property
    def values(self) -> dict[str, VerifiedValues]:
        """All verified rows by the name of their search."""
        return {item.name: read_verified(item.folder, self.evaluator) for item in self.searches}

    @property
    def damaged_values(self) -> tuple[Path, ...]:
        """Parts of verified values that could not be read."""
        return tuple(path for item in self.values.values() for path in item.damaged)

    @cached_property
    def _searched(self) -> tuple[pa.Table, tuple[str, ...], list[VerifiedRow | None]]:
        """The front as the search found it, whose each row is, and what was verified of it."""
        table, owners = StoredFamily(self.searches).joined
        numbers = table["evaluation"].to_pylist() if table.num_rows else []
        rows = [
            self.values[name].rows.get(number) for name, number in zip(owners, numbers, strict=True)
        ]
        return table, owners, rows

    @cached_property
    def verified_counts(self) -> VerifiedCounts:
        """What became of that front."""
        _, owners, found = self._searched
        rows = [row for row in found if row is not None]
        names = dict.fromkeys(row.evaluator for row in rows)
        return VerifiedCounts(
            evaluator=" and ".join(names) or self.evaluator,
            front=len(owners),
            verified=len(rows),
            broke_limit=sum(row.ok and not row.feasible for row in rows),
            failed=sum(not row.ok for row in rows),
        )

    @cached_property
    def joined(self) -> tuple[pa.Table, tuple[str, ...]]:
        """The front of verified values, with the columns of the archive's."""
        table, owners, verified = self._searched
        if not table.num_rows:
            return table, ()
        kept: list[tuple[str, dict[str, Any]]] = []
        for row, name, found in zip(table.to_pylist(), owners, verified, strict=True):
            if found is None and not self.only:
                kept.append((name, row))
            elif found is not None and found.feasible:
                kept.append((name, {key: found.values.get(key, row[key]) for key in row}))
        mixed = pa.Table.from_pylist([row for _, row in kept], schema=table.schema)
        if not kept:
            return mixed, ()
        best = non_dominated(matrix(mixed, [f"objective:{name}" for name in self.objectives]))
        names = tuple(name for (name, _), stays in zip(kept, best.tolist(), strict=True) if stays)
        return mixed.filter(pa.array(best)), names


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
            for family in stored_families(results)
            for search in family.searches
            for name in verified_evaluators(search.folder)
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


def all_verified(folder: Path, evaluation: int) -> list[VerifiedRow]:
    """What every evaluator used so far said of one design."""
    found = [
        read_verified(folder, name).rows.get(evaluation) for name in verified_evaluators(folder)
    ]
    return [row for row in found if row is not None]
