"""Reading an archive, also while it is being written."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import cached_property
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa

from optimizer.archive.identity import IDENTITY_NAME, check_owner, read_identity
from optimizer.archive.parts import (
    DamagedPartError,
    ForeignPartError,
    check_part,
    file_checksum,
    part_paths,
    part_schema,
    parts_digest,
    read_part,
)
from optimizer.archive.schema import PARTS_KEY
from optimizer.errors import ArchiveError, storage_error
from optimizer.fronts import non_dominated
from optimizer.problem import IntArray

FRONT_NAME = "front.parquet"
FRONT_CHECK_NAME = ".front.crc"
_TRIES = 5  # a writer that merges parts at the end of a run may take one away meanwhile


def is_archive(folder: Path | str) -> bool:
    """Whether a folder holds an archive, be it an empty one."""
    path = Path(folder)
    return (path / IDENTITY_NAME).is_file() or (path.is_dir() and bool(part_paths(path)))


def open_archive(folder: Path | str) -> ArchiveReader:
    """Open an archive for reading; nothing in it is changed and no lock is taken.

    Raises
    ------
    ArchiveError
        If there is no archive there, or it was written by a newer version.
    """
    path = Path(folder)
    if not is_archive(path):
        msg = f"{path} holds no archive; give the folder of one family of a study"
        raise ArchiveError(msg)
    settings = read_identity(path)
    if settings is None:
        msg = f"{path / IDENTITY_NAME} and all parts beside it are damaged; nothing can be read"
        raise ArchiveError(msg)
    return ArchiveReader(path, settings)


class ArchiveReader:
    """Rows of an archive as Arrow tables.

    Attributes
    ----------
    folder : Path
    settings : dict
        What the rows belong to: seed, population, chunk, evaluator, labels, variables with
        their bounds, objectives, constraints and columns.
    damaged : tuple of Path
        Parts found so far that cannot be read or belong to another archive; their rows are
        missing from the tables. :meth:`trouble` says what is wrong with one.
    """

    def __init__(self, folder: Path, settings: dict[str, Any]) -> None:
        self.folder = folder
        self.settings = settings
        self.damaged: tuple[Path, ...] = ()
        self._sound: set[Path] = set()

    @cached_property
    def schema(self) -> pa.Schema:
        """Columns with unit, role and description as metadata; empty before the first row."""
        for path in part_paths(self.folder):
            try:
                schema = part_schema(path)
                check_owner(path, schema, self.settings)
                return schema
            except (DamagedPartError, FileNotFoundError):
                continue
        return pa.schema([])

    @property
    def rows(self) -> int:
        """Number of evaluations stored."""
        return int(self.table(["evaluation"]).num_rows)

    def table(self, columns: Sequence[str] | None = None) -> pa.Table:
        """Return all rows in order of ``evaluation``, with the chosen columns or all.

        Raises
        ------
        ArchiveError
            If a column does not exist.
        """
        names = list(self.schema.names) if columns is None else list(columns)
        for name in names:
            if self.schema.names and name not in self.schema.names:
                msg = f"{self.folder} has no column {name}; it has {', '.join(self.schema.names)}"
                raise ArchiveError(msg)
        return self._retried(lambda: self._read(names))

    def front(self) -> pa.Table:
        """Return the feasible rows that no other dominates, with all columns.

        They come from ``front.parquet``, or from all rows if that is missing, damaged or not
        made of the parts that are there now.
        """
        return self._retried(self._front)

    def trouble(self, path: Path) -> str:
        """Say in words what is wrong with a part; empty if nothing is."""
        try:
            check_part(path)
            check_owner(path, part_schema(path), self.settings)
            read_part(path)
        except ForeignPartError as error:
            return f"belongs to another archive ({error})"
        except (DamagedPartError, FileNotFoundError):
            return "is damaged"
        return ""

    def row(self, evaluation: int) -> dict[str, Any]:
        """Return one row as a dictionary.

        Raises
        ------
        ArchiveError
            If it is not there.
        """
        found = self.rows_of(np.array([evaluation]))
        if found.num_rows:
            values: dict[str, Any] = found.slice(0, 1).to_pylist()[0]
            return values
        msg = f"{self.folder} has no evaluation {evaluation}; it has {self.rows} rows"
        raise ArchiveError(msg)

    def rows_of(self, evaluations: IntArray) -> pa.Table:
        """Return all columns of those of some rows that are there, in order of ``evaluation``."""
        return self._retried(lambda: self._rows(evaluations))

    def _rows(self, evaluations: IntArray) -> pa.Table:
        """Return all columns of some rows, without reading the other parts in full."""
        tables = []
        for path in part_paths(self.folder):
            try:
                numbers = self._part(path, ["evaluation"])["evaluation"].to_numpy()
                places = np.flatnonzero(np.isin(numbers, evaluations))
                if len(places):
                    tables.append(self._part(path).take(pa.array(places)))
            except DamagedPartError:
                self.damaged = tuple(sorted({*self.damaged, path}))
        if not tables:
            return self.schema.empty_table()
        table = pa.concat_tables(tables)
        _, first = np.unique(table["evaluation"].to_numpy(), return_index=True)
        return table.take(pa.array(first)).combine_chunks()

    def _read(self, names: list[str]) -> pa.Table:
        wanted = list(dict.fromkeys([*names, "evaluation"]))
        tables, damaged = [], []
        for path in part_paths(self.folder):
            try:
                tables.append(self._part(path, wanted))
            except DamagedPartError:
                damaged.append(path)
        self.damaged = tuple(sorted({*self.damaged, *damaged}))
        if not tables:
            known = [self.schema.field(name) for name in names if self.schema.names]
            return pa.schema(known).empty_table()
        table = pa.concat_tables(tables)
        numbers = table["evaluation"].to_numpy()
        if len(numbers) > 1 and not bool((numbers[1:] > numbers[:-1]).all()):
            # Out of order, or twice after a crash while parts were merged.
            _, first = np.unique(numbers, return_index=True)
            table = table.take(pa.array(first))
        return table.select(names)

    def _front(self) -> pa.Table:
        table = self._stored_front()
        if table is not None:
            return table
        names = [f"objective:{name}" for name in self.settings["objectives"]]
        table = self._read(["evaluation", "feasible", *names])
        if not table.num_rows:
            return self.schema.empty_table()
        feasible = np.flatnonzero(table["feasible"].to_numpy())
        points = np.column_stack([table[name].to_numpy()[feasible] for name in names])
        numbers = table["evaluation"].to_numpy()[feasible]
        return self._rows(numbers[non_dominated(points)])

    def _stored_front(self) -> pa.Table | None:
        path, check = self.folder / FRONT_NAME, self.folder / FRONT_CHECK_NAME
        try:
            if check.read_text(encoding="utf-8") != file_checksum(path):
                return None
            table = read_part(path)
        except (DamagedPartError, OSError, UnicodeDecodeError):
            return None
        made_of = (table.schema.metadata or {}).get(PARTS_KEY)
        return table if made_of == parts_digest(self.folder) else None

    def _part(self, path: Path, columns: Sequence[str] | None = None) -> pa.Table:
        if path not in self._sound:  # parts never change: once is enough
            check_part(path)
            table = read_part(path, columns)
            check_owner(path, table.schema, self.settings)
            self._sound.add(path)
            return table
        return read_part(path, columns)

    def _retried(self, read: Callable[[], pa.Table]) -> pa.Table:
        for _ in range(_TRIES - 1):
            try:
                return read()
            except FileNotFoundError:
                continue
        try:
            return read()
        except FileNotFoundError as error:
            raise storage_error(error, self.folder, "read") from error
