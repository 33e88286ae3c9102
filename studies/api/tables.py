"""Arrow tables from rows and from the tables that the commands write."""

from __future__ import annotations

import io
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import pyarrow as pa
from pyarrow import csv

from evaluators.machine.geometry.variables import VARIABLES
from evaluators.machine.metrics import METRIC
from studies.errors import ResultsError
from studies.stored.layout import Results, open_results

Folder = str | Path
Folders = Folder | Sequence[Folder]

ABOUT = {
    **{name: (item.unit, item.definition) for name, item in METRIC.items()},
    **{item.name: (item.unit, item.definition) for item in VARIABLES},
}


def table_of(rows: Sequence[Mapping[str, Any]], names: Sequence[str] = ()) -> pa.Table:
    """A table of rows; `names` are its columns where there is no row."""
    if not rows:
        return pa.table({name: pa.array([], pa.null()) for name in names})
    return described(pa.Table.from_pylist([dict(row) for row in rows]))


def table_of_csv(text: str) -> pa.Table:
    """A table of what a command writes as comma-separated values."""
    return described(csv.read_csv(io.BytesIO(text.encode())))


def described(table: pa.Table) -> pa.Table:
    """Give the columns of metrics and variables their unit and definition."""
    fields = []
    for field in table.schema:
        unit, meaning = ABOUT.get(field.name, ("", ""))
        known = meaning and not field.metadata
        about = {"unit": unit, "description": meaning}
        fields.append(field.with_metadata(about) if known else field)
    return table.cast(pa.schema(fields, metadata=table.schema.metadata))


def opened(folders: Folders) -> list[Results]:
    """Results folders, each once.

    Raises
    ------
    ResultsError
        If none is given or one is none.
    """
    several = [folders] if isinstance(folders, str | Path) else list(folders)
    if not several:
        msg = "no results folder was given"
        raise ResultsError(msg)
    return [open_results(Path(item)) for item in dict.fromkeys(str(item) for item in several)]
