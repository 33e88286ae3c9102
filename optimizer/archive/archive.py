"""The archive of a search: every evaluation as a row of immutable Parquet parts.

A folder holds ``archive.json`` (what the rows belong to), ``part-*.parquet``, ``front.parquet``
(the feasible rows no other dominates), ``state.npz`` (a shortcut for resuming), and
``quarantine/`` with parts that were found damaged.
"""

from __future__ import annotations

import json
import time
import zlib
from contextlib import ExitStack
from pathlib import Path
from typing import Self

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from optimizer.archive.durable import make_folder, remove, remove_leftovers, write_durably
from optimizer.archive.identity import (
    IDENTITY_NAME,
    check_owner,
    differences,
    identity_of,
    read_identity,
    written_identity,
)
from optimizer.archive.lock import writer_lock
from optimizer.archive.merging import MERGED_ROWS, piled_up, small
from optimizer.archive.parts import (
    DamagedPartError,
    check_part,
    encode,
    next_number,
    part_paths,
    part_schema,
    parts_digest,
    read_part,
    set_aside,
    write_part,
)
from optimizer.archive.reader import FRONT_CHECK_NAME, FRONT_NAME
from optimizer.archive.reader import ArchiveReader as ArchiveReader
from optimizer.archive.reader import is_archive as is_archive
from optimizer.archive.reader import open_archive as open_archive
from optimizer.archive.schema import (
    PARTS_KEY,
    Rows,
    archive_schema,
    from_table,
    full_outcome,
    join_rows,
    needed_columns,
    to_table,
)
from optimizer.errors import ArchiveError, ArchiveMismatchError
from optimizer.problem import BoolArray, FloatArray, IntArray, Outcome, Problem
from optimizer.settings import Settings

SHORTEST_INTERVAL_S = 1.0  # between two parts
# A part is held back until the run has lasted this many times what the last part took to write.
LARGEST_SHARE = 20.0


class Archive:
    """The one writer of an archive; use it as a context manager.

    Parameters
    ----------
    folder : Path
        Made if it does not exist. Parts found there are checked byte by byte; those that are
        damaged or belong to another archive are moved to ``quarantine/`` and named in
        :attr:`damaged`.
    problem : Problem
    settings : Settings

    Raises
    ------
    ArchiveMismatchError
        If the folder holds rows of another problem or other settings.
    ArchiveLockedError
        If another process writes there.
    ArchiveError
        If the folder cannot be read or written.
    """

    def __init__(self, folder: Path, problem: Problem, settings: Settings) -> None:
        self.folder = folder
        self.damaged: tuple[Path, ...] = ()
        self._problem, self._settings = problem, settings
        self._schema = archive_schema(problem, settings)
        self._identity = identity_of(problem, settings)
        self._waiting: list[Rows] = []
        self._rows: dict[Path, int] = {}  # of each part
        self._written_at = time.monotonic()
        self._interval = SHORTEST_INTERVAL_S
        make_folder(folder)
        with ExitStack() as stack:
            stack.enter_context(writer_lock(folder))
            self._settle_identity()
            remove_leftovers(folder)
            self._load()
            self._number = next_number(folder)
            self._exit = stack.pop_all()

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *raised: object) -> None:
        with self._exit:
            self.flush()

    @property
    def end(self) -> int:
        """One more than the largest evaluation stored when the archive was opened."""
        return len(self._place)

    def stored(self, first: int, rows: int) -> tuple[BoolArray, FloatArray, Outcome]:
        """Return what was stored of ``rows`` evaluations from ``first`` on.

        Returns
        -------
        present : (rows,) array of bool
        x : (present, v) array
        outcome : Outcome
            Without further columns.
        """
        place = self._place[first : first + rows]
        present = np.zeros(rows, dtype=np.bool_)
        present[: len(place)] = place >= 0
        chosen = place[place >= 0]
        return present, self._x[chosen], self._outcome.rows(chosen)

    def complete(self, rows: int) -> bool:
        """Whether the first ``rows`` evaluations are all stored."""
        return len(self._place) >= rows and bool((self._place[:rows] >= 0).all())

    def recall(self, evaluations: IntArray) -> Outcome:
        """Return stored outcomes with all columns, in the order given.

        Raises
        ------
        ArchiveError
            If what is waiting cannot be written, or a row is not there.
        """
        self.flush()
        table = open_archive(self.folder).rows_of(evaluations)
        places = np.searchsorted(table["evaluation"].to_numpy(), evaluations)
        if table.num_rows != len(np.unique(evaluations)):
            msg = f"{self.folder}: rows stored before are gone; run the same command again"
            raise ArchiveError(msg)
        return full_outcome(table, self._problem).rows(places)

    def add(self, rows: Rows) -> None:
        """Take finished rows; they are written now, or together with others about a second later.

        Raises
        ------
        ArchiveError
            If they cannot be written.
        """
        self._waiting.append(rows)
        if time.monotonic() - self._written_at >= self._interval:
            self.flush()

    def flush(self) -> None:
        """Write all rows taken so far.

        Raises
        ------
        ArchiveError
            If they cannot be written; they are kept and the next flush tries again.
        """
        if not self._waiting:
            return
        begin = time.monotonic()
        table = to_table(join_rows(self._waiting), self._schema, self._problem, self._settings)
        self._write(table)
        self._waiting.clear()
        self._interval = max(SHORTEST_INTERVAL_S, LARGEST_SHARE * (time.monotonic() - begin))
        self._merge(piled_up(self._rows))
        self._written_at = time.monotonic()

    def finish(self, front: IntArray) -> None:
        """Write what is waiting, merge small parts, and write the front.

        Parameters
        ----------
        front : (n,) array of int
            Evaluations of the feasible rows no other dominates.

        Raises
        ------
        ArchiveError
            If something cannot be written.
        """
        self.flush()
        self._merge(small(self._rows))
        wanted = pa.array(np.sort(front), type=pa.int64())
        tables = []
        for path in part_paths(self.folder):
            table = self._checked(path)
            if table is not None:
                tables.append(table.filter(pc.is_in(table["evaluation"], value_set=wanted)))
        chosen = pa.concat_tables(tables) if tables else self._schema.empty_table()
        made_of = {**(self._schema.metadata or {}), PARTS_KEY: parts_digest(self.folder)}
        table = _in_order(chosen).replace_schema_metadata(made_of)
        data = encode(table)
        write_durably(self.folder / FRONT_NAME, data)
        write_durably(self.folder / FRONT_CHECK_NAME, f"{zlib.crc32(data):08x}".encode())

    def _settle_identity(self) -> None:
        stored = read_identity(self.folder)
        if stored is not None and stored != self._identity:
            msg = (
                f"{self.folder} holds evaluations of another study or of other settings"
                f" ({'; '.join(differences(stored, self._identity))}); use another folder, or"
                " settings as they were"
            )
            raise ArchiveMismatchError(msg)
        if written_identity(self.folder) != self._identity:
            text = json.dumps(self._identity, indent=1, sort_keys=True) + "\n"
            write_durably(self.folder / IDENTITY_NAME, text.encode())

    def _load(self) -> None:
        names = needed_columns(self._problem)
        tables, damaged = [], []
        for path in part_paths(self.folder):
            table = self._checked(path, names)
            if table is None:
                damaged.append(set_aside(path))
            else:
                tables.append(table)
                self._rows[path] = table.num_rows
        self.damaged = tuple(damaged)
        table = pa.concat_tables(tables) if tables else self._schema.empty_table().select(names)
        evaluations, self._x, self._outcome = from_table(table, self._problem)
        self._place = np.full(int(evaluations.max(initial=-1)) + 1, -1)
        self._place[evaluations] = np.arange(len(evaluations))

    def _checked(self, path: Path, columns: list[str] | None = None) -> pa.Table | None:
        """Return a part, or None if it is damaged or belongs elsewhere."""
        try:
            check_part(path)
            schema = part_schema(path)
            check_owner(path, schema, self._identity)
            return read_part(path, columns) if schema.equals(self._schema) else None
        except DamagedPartError:
            return None

    def _write(self, table: pa.Table) -> Path:
        path = write_part(self.folder, self._number, table)
        self._rows[path] = table.num_rows
        self._number += 1
        return path

    def _merge(self, paths: list[Path]) -> None:
        """Turn many small parts into few; a crash in between leaves rows twice, never lost."""
        tables = {path: self._checked(path) for path in paths}
        sound = {path: table for path, table in tables.items() if table is not None}
        if len(sound) < 2:
            return
        merged = _in_order(pa.concat_tables(sound.values()))
        for start in range(0, merged.num_rows, MERGED_ROWS):
            path = self._write(merged.slice(start, MERGED_ROWS))
            if self._checked(path) is None:
                msg = f"{path} reads back changed; the disk is not reliable"
                raise ArchiveError(msg)
        for path in sound:
            remove(path)
            del self._rows[path]


def _in_order(table: pa.Table) -> pa.Table:
    """Return the rows in order of ``evaluation``, each once."""
    _, first = np.unique(table["evaluation"].to_numpy(), return_index=True)
    return table.take(pa.array(first)).combine_chunks()
