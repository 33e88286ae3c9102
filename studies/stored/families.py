"""What a study has stored for one family, as plain arrays and rows."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from optimizer.archive.archive import ArchiveReader, is_archive, open_archive
from studies.errors import ResultsError
from studies.stored.layout import Results
from studies.suggestions import suggest

FloatArray = NDArray[np.float64]

DESIGN_ID = re.compile(r"(.+)-(\d{1,12})")


def design_id(family: str, evaluation: int) -> str:
    """Name of one evaluated design, such as ``Q12p4s5-001234``."""
    return f"{family}-{evaluation:06d}"


def split_design_id(text: str) -> tuple[str, int]:
    """Family and evaluation number of a design id.

    Raises
    ------
    ResultsError
        If it is none.
    """
    match = DESIGN_ID.fullmatch(text)
    if match is None:
        msg = f"{text!r} is no design; write family and evaluation as in Q12p4s5-001234"
        raise ResultsError(msg)
    return match[1], int(match[2])


@dataclass(frozen=True)
class Stored:
    """One family's archive of one study.

    Attributes
    ----------
    study, family : str
    folder : Path
    objectives : tuple of str
        Names, in the order of the columns of `front_objectives`.
    """

    study: str
    family: str
    folder: Path
    objectives: tuple[str, ...]
    reader: ArchiveReader

    @cached_property
    def counts(self) -> tuple[int, int, int]:
        """Evaluations stored, feasible ones, failed ones."""
        table = self.reader.table(["feasible", "status"])
        if not table.num_rows:
            return 0, 0, 0
        feasible = int(np.count_nonzero(table["feasible"].to_numpy()))
        failed = sum(word != "ok" for word in table["status"].to_pylist())
        return table.num_rows, feasible, failed

    @cached_property
    def front(self) -> pa.Table:
        """Feasible rows that no other dominates, all columns, in order of evaluation."""
        table = self.reader.front()
        if not table.num_rows:
            return table
        settings = self.reader.settings
        wanted = [f"objective:{name}" for name in settings["objectives"]]
        wanted += [f"margin:{name}" for name in settings["constraints"]]
        missing = [name for name in wanted if name not in table.column_names]
        if missing:
            msg = (
                f"{self.folder}: has parts of another study, which lack the column {missing[0]}; "
                f"`hovergap resume {self.folder.parent}` sets them aside"
            )
            raise ResultsError(msg)
        return table.sort_by("evaluation")

    @cached_property
    def front_objectives(self) -> FloatArray:
        """Minimised values (n, m) of the front."""
        return matrix(self.front, [f"objective:{name}" for name in self.objectives])

    @cached_property
    def front_ids(self) -> list[str]:
        """Design ids of the front."""
        if not self.front.num_rows:
            return []
        return [design_id(self.family, item) for item in self.front["evaluation"].to_pylist()]

    def front_row(self, position: int) -> dict[str, Any]:
        """One design of the front with all columns."""
        found: dict[str, Any] = self.front.slice(position, 1).to_pylist()[0]
        return found


def matrix(table: pa.Table, names: list[str]) -> FloatArray:
    """Columns of a table as an array (n, columns); null becomes NaN."""
    stacked = np.empty((table.num_rows, len(names)))
    if table.num_rows:
        for position, name in enumerate(names):
            stacked[:, position] = table[name].to_numpy()
    return stacked


def stored_families(results: Results) -> list[Stored]:
    """Archives of the families searched so far, in the order of the study."""
    names = tuple(goal.name for goal in results.study.objectives)
    found = []
    for family in results.study.families:
        folder = results.family_folder(family)
        if is_archive(folder):
            reader = _opened(results, folder)
            found.append(Stored(results.study.name, family, folder, names, reader))
    return found


def _opened(results: Results, folder: Path) -> ArchiveReader:
    """The archive, if its objectives and limits are those of the study beside it."""
    reader = open_archive(folder)
    study = results.study
    kinds = (
        ("objectives", "objectives", [goal.name for goal in study.objectives]),
        ("limits", "constraints", [limit.name for limit in study.limits]),
    )
    for word, key, wanted in kinds:
        there = list(reader.settings[key])
        if there != wanted:
            odd = sorted({*there} ^ {*wanted})
            differs = f"only one of them has {odd[0]}" if odd else "their order differs"
            msg = (
                f"{folder}: holds another study than {results.folder / 'study.toml'} says: its "
                f"{word} are others ({differs}); put the study or the family's folder back"
            )
            raise ResultsError(msg)
    return reader


def stored_family(results: Results, family: str) -> Stored:
    """Archive of one family.

    Raises
    ------
    ResultsError
        If the study has no such family, nothing of it is stored, or it is another study's.
    """
    if family not in results.study.families:
        remedy = suggest(family, results.study.families)
        msg = f"{results.folder}: the study has no family {family!r}; {remedy}"
        raise ResultsError(msg)
    folder = results.family_folder(family)
    if not is_archive(folder):
        msg = f"{folder}: nothing is stored of this family yet; `hovergap resume` searches it"
        raise ResultsError(msg)
    names = tuple(goal.name for goal in results.study.objectives)
    return Stored(results.study.name, family, folder, names, _opened(results, folder))


@dataclass(frozen=True)
class Violation:
    """How far one evaluated design is from meeting all limits."""

    design: str
    total: float
    margins: Mapping[str, float]


def least_violating(stored: Stored, limits: list[str], count: int) -> list[Violation]:
    """Evaluated designs with the smallest sum of violated margins, best first.

    Parameters
    ----------
    stored : Stored
    limits : list of str
        Names of the margins.
    count : int
        How many.
    """
    names = [f"margin:{name}" for name in limits]
    table = stored.reader.table(["evaluation", "status", *names])
    if not table.num_rows:
        return []
    margins = matrix(table, names)
    good = np.asarray(table["status"].to_pylist()) == "ok"
    total = np.where(good, np.maximum(margins, 0.0).sum(axis=1), math.inf)
    order = np.argsort(total, kind="stable")[:count]
    evaluations = table["evaluation"].to_numpy()
    return [
        Violation(
            design_id(stored.family, int(evaluations[row])),
            float(total[row]),
            dict(zip(limits, margins[row].tolist(), strict=True)),
        )
        for row in order
        if math.isfinite(total[row])
    ]


def violation_statistics(stored: Stored, limits: list[str]) -> dict[str, tuple[float, float]]:
    """Share of evaluated designs that break each limit, and the smallest violation or reserve."""
    names = [f"margin:{name}" for name in limits]
    table = stored.reader.table(["status", *names])
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
