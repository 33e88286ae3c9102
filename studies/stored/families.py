"""What a study has stored of its families, as plain arrays and rows.

A family is searched once or several times; each search has an archive of its own, `Stored`.
Together they are a `StoredFamily`, whose front is made of the designs of all its searches.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from optimizer.archive.archive import ArchiveReader, is_archive, open_archive
from optimizer.fronts import non_dominated
from studies.errors import ResultsError
from studies.stored.identity import check_owner
from studies.stored.layout import Results
from studies.stored.naming import design_id, search_name, split_design_id, split_search_name
from studies.suggestions import suggest

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Stored:
    """The archive of one search of one family of one study.

    Attributes
    ----------
    study, family : str
    folder : Path
    objectives : tuple of str
        Names, in the order of the columns of `front_objectives`.
    search : int
        Which search of the family, from 1.
    """

    study: str
    family: str
    folder: Path
    objectives: tuple[str, ...]
    reader: ArchiveReader
    search: int = 1

    @property
    def name(self) -> str:
        """Name of the search, which its designs bear."""
        return search_name(self.family, self.search)

    @cached_property
    def counts(self) -> tuple[int, int, int]:
        """Evaluations stored, feasible ones, failed ones."""
        table = self.reader.table(["feasible", "status"])
        if not table.num_rows:
            return 0, 0, 0
        feasible = int(np.count_nonzero(table["feasible"].to_numpy()))
        failed = pc.sum(pc.not_equal(table["status"], "ok")).as_py()
        return table.num_rows, feasible, failed

    @cached_property
    def front(self) -> pa.Table:
        """Feasible rows that no other dominates, all columns, in order of evaluation."""
        table = self.reader.front()
        return table.sort_by("evaluation") if table.num_rows else table

    @cached_property
    def front_objectives(self) -> FloatArray:
        """Minimised values (n, m) of the front."""
        return matrix(self.front, [f"objective:{name}" for name in self.objectives])

    @cached_property
    def front_ids(self) -> list[str]:
        """Design ids of the front."""
        if not self.front.num_rows:
            return []
        return [design_id(self.name, item) for item in self.front["evaluation"].to_pylist()]

    def front_row(self, position: int) -> dict[str, Any]:
        """One design of the front with all columns."""
        found: dict[str, Any] = self.front.slice(position, 1).to_pylist()[0]
        return found


@dataclass(frozen=True)
class StoredFamily:
    """All searches of one family of one study, at least one."""

    searches: tuple[Stored, ...]

    @property
    def study(self) -> str:
        """Name of the study."""
        return self.searches[0].study

    @property
    def family(self) -> str:
        """Id of the family."""
        return self.searches[0].family

    @property
    def objectives(self) -> tuple[str, ...]:
        """Names, in the order of the columns of `front_objectives`."""
        return self.searches[0].objectives

    @property
    def settings(self) -> Mapping[str, Any]:
        """What the rows of the first search belong to; the others differ from it in the seed."""
        return self.searches[0].reader.settings

    @property
    def damaged(self) -> tuple[Path, ...]:
        """Parts that could not be read so far."""
        return tuple(path for item in self.searches for path in item.reader.damaged)

    @cached_property
    def columns(self) -> frozenset[str]:
        """Names of the columns stored."""
        return frozenset(name for item in self.searches for name in item.reader.schema.names)

    @cached_property
    def counts(self) -> tuple[int, int, int]:
        """Evaluations stored, feasible ones, failed ones, in all searches."""
        evaluations, feasible, failed = zip(*(item.counts for item in self.searches), strict=True)
        return sum(evaluations), sum(feasible), sum(failed)

    @cached_property
    def joined(self) -> tuple[pa.Table, tuple[str, ...]]:
        """The front of the designs of all searches, and the name of each row's search."""
        return joint_front(
            [(item.name, item.front) for item in self.searches if item.front.num_rows],
            self.objectives,
        )

    @property
    def front(self) -> pa.Table:
        """Feasible rows that no other of any search dominates, all columns.

        In the order of the searches and their evaluations.
        """
        return self.joined[0]

    @cached_property
    def front_objectives(self) -> FloatArray:
        """Minimised values (n, m) of the front."""
        return matrix(self.front, [f"objective:{name}" for name in self.objectives])

    @cached_property
    def front_ids(self) -> list[str]:
        """Design ids of the front."""
        front, owners = self.joined
        if not front.num_rows:
            return []
        numbers = front["evaluation"].to_pylist()
        return [design_id(name, item) for name, item in zip(owners, numbers, strict=True)]

    def front_row(self, position: int) -> dict[str, Any]:
        """One design of the front with all columns."""
        found: dict[str, Any] = self.front.slice(position, 1).to_pylist()[0]
        return found

    def table(self, columns: list[str]) -> pa.Table:
        """Columns of all rows, search after search in order of evaluation."""
        tables = [item.reader.table(columns) for item in self.searches]
        full = [table.replace_schema_metadata(None) for table in tables if table.num_rows]
        return pa.concat_tables(full) if full else tables[0]

    def row(self, design: str) -> dict[str, Any]:
        """One design with all columns.

        Raises
        ------
        ArchiveError
            If it is not there.
        """
        name, evaluation = split_design_id(design)
        search = next(item for item in self.searches if item.name == name)
        return search.reader.row(evaluation)


def joint_front(
    fronts: list[tuple[str, pa.Table]], objectives: tuple[str, ...]
) -> tuple[pa.Table, tuple[str, ...]]:
    """One front of several: the rows that no other dominates, and the name each came under.

    Parameters
    ----------
    fronts : list of (name, table)
        Tables with rows.
    objectives : tuple of str
    """
    if not fronts:
        return pa.table({}), ()
    owners = [name for name, table in fronts for _ in range(table.num_rows)]
    if len(fronts) == 1:
        return fronts[0][1], tuple(owners)
    joined = pa.concat_tables([table.replace_schema_metadata(None) for _, table in fronts])
    keep = non_dominated(matrix(joined, [f"objective:{name}" for name in objectives]))
    names = tuple(name for name, kept in zip(owners, keep.tolist(), strict=True) if kept)
    return joined.filter(pa.array(keep)).combine_chunks(), names


def matrix(table: pa.Table, names: list[str]) -> FloatArray:
    """Columns of a table as an array (n, columns); null becomes NaN."""
    stacked = np.empty((table.num_rows, len(names)))
    if table.num_rows:
        for position, name in enumerate(names):
            stacked[:, position] = table[name].to_numpy()
    return stacked


def stored_searches(results: Results, family: str) -> list[Stored]:
    """Archives of one family, in the order of their numbers; empty if it was never searched."""
    objectives = tuple(goal.name for goal in results.study.objectives)
    found = []
    for search in _numbers(results, family):
        name = search_name(family, search)
        folder, reader = results.search_folder(name), _opened(results, name)
        found.append(Stored(results.study.name, family, folder, objectives, reader, search))
    return found


def _numbers(results: Results, family: str) -> list[int]:
    """Numbers of the searches that have an archive, in order."""
    names = [family, *(item.name for item in results.folder.glob(f"{family}.*"))]
    numbers = {
        search
        for name in names
        for owner, search in [split_search_name(name)]
        if owner == family and search_name(family, search) == name
    }
    return [
        search
        for search in sorted(numbers)
        if is_archive(results.search_folder(search_name(family, search)))
    ]


def stored_families(results: Results) -> list[StoredFamily]:
    """Families searched so far, in the order of the study."""
    found = [stored_searches(results, family) for family in results.study.families]
    return [StoredFamily(tuple(searches)) for searches in found if searches]


def _opened(results: Results, name: str) -> ArchiveReader:
    """The archive of a search, if it belongs to the study beside it."""
    reader = open_archive(results.search_folder(name))
    check_owner(results, name, reader.settings)
    return reader


def stored_family(results: Results, family: str) -> StoredFamily:
    """All searches of one family.

    Raises
    ------
    ResultsError
        If the study has no such family, nothing of it is stored, or it is another study's.
    """
    _check_family(results, family)
    searches = stored_searches(results, family)
    if not searches:
        raise ResultsError(_nothing(results.search_folder(family)))
    return StoredFamily(tuple(searches))


def stored_search(results: Results, name: str) -> Stored:
    """One search of a family by its name, such as ``Q12p4s5`` or ``Q12p4s5.2``.

    Raises
    ------
    ResultsError
        As `stored_family`.
    """
    family, search = split_search_name(name)
    _check_family(results, family)
    folder = results.search_folder(name)
    if not is_archive(folder):
        there = _numbers(results, family)
        if there:
            stored = ", ".join(search_name(family, item) for item in there)
            msg = f"{folder}: no such search of {family} is stored; there are {stored}"
            raise ResultsError(msg)
        raise ResultsError(_nothing(folder))
    names = tuple(goal.name for goal in results.study.objectives)
    return Stored(results.study.name, family, folder, names, _opened(results, name), search)


def _check_family(results: Results, family: str) -> None:
    if family not in results.study.families:
        remedy = suggest(family, results.study.families)
        msg = f"{results.folder}: the study has no family {family!r}; {remedy}"
        raise ResultsError(msg)


def _nothing(folder: Path) -> str:
    return f"{folder}: nothing is stored of this family yet; `hovergap resume` searches it"
