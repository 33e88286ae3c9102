"""The fronts of a study as one table that knows what its columns mean."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import pyarrow as pa

from evaluators.machine.geometry.variables import VARIABLES
from evaluators.machine.metrics import METRIC
from optimizer.archive.schema import PARTS_KEY
from studies.errors import ResultsError
from studies.stored.families import stored_families
from studies.stored.layout import Results


@dataclass(frozen=True)
class FrontTable:
    """All fronts below each other.

    Attributes
    ----------
    table : pyarrow.Table
        With `design` and `family` first; every column carries unit and description.
    damaged : tuple of str
        Parts that could not be read, whose rows are missing.
    """

    table: pa.Table
    damaged: tuple[str, ...]

    @property
    def names(self) -> list[str]:
        """Names of the columns."""
        return list(self.table.schema.names)

    def unit(self, name: str) -> str:
        """Unit of a column, empty for a pure number or text."""
        unit = _about(self.table.schema.field(name)).get("unit", "")
        return "" if unit == "1" else unit

    def meaning(self, name: str) -> str:
        """Description of a column."""
        return _about(self.table.schema.field(name)).get("description", "")

    def rows(self) -> list[list[Any]]:
        """Rows as plain values; times become text."""
        columns = [self.table[name].to_pylist() for name in self.names]
        plain = [
            [item.isoformat() if hasattr(item, "isoformat") else item for item in column]
            for column in columns
        ]
        return [list(row) for row in zip(*plain, strict=True)]


def _about(field: pa.Field) -> dict[str, str]:
    return {key.decode(): value.decode() for key, value in (field.metadata or {}).items()}


def front_table(results: Results) -> FrontTable:
    """Fronts of all families stored, in the order of the study.

    Raises
    ------
    ResultsError
        If no family has a feasible design.
    """
    tables, damaged = [], []
    for stored in stored_families(results):
        front = stored.front
        damaged += [str(path) for path in stored.damaged]
        if not front.num_rows:
            continue
        kept = {k: v for k, v in (front.schema.metadata or {}).items() if k != PARTS_KEY}
        ids = _text_column(
            "design", "family, its search from the second on, evaluation number", stored.front_ids
        )
        family = _text_column("family", "slots, pole pairs, suspension pole pairs", stored.family)
        table = front.replace_schema_metadata(kept)
        for position, (name, values) in enumerate((ids, family)):
            column = values if isinstance(values, list) else [values] * front.num_rows
            table = table.add_column(position, name, pa.array(column, type=pa.string()))
        tables.append(_described(table))
    if not tables:
        msg = f"{results.folder}: no family has a feasible design, so there is no front to export"
        raise ResultsError(msg)
    # Each family's own identity would contradict the others': only column metadata is kept.
    joined = pa.concat_tables([item.replace_schema_metadata(None) for item in tables])
    return FrontTable(joined, tuple(damaged))


def _text_column(name: str, meaning: str, values: Any) -> tuple[pa.Field, Any]:
    about = {"unit": "", "role": "identity", "description": meaning}
    return pa.field(name, pa.string(), metadata=about), values


def _described(table: pa.Table) -> pa.Table:
    """Give the variables unit and definition, which the archive itself does not know."""
    schema = table.schema
    for item in VARIABLES:
        position = schema.get_field_index(item.name)
        if position >= 0:
            about = {"unit": item.unit, "role": "variable", "description": item.definition}
            schema = schema.set(position, schema.field(position).with_metadata(about))
    return table.cast(schema)


def heading(front: FrontTable, name: str, currency: str) -> str:
    """Unit and meaning of a column for a reader."""
    unit = front.unit(name)
    unit = currency if unit == "money" else unit
    source = METRIC[name].source if name in METRIC else ""
    parts = [f"unit: {unit}" if unit else "", front.meaning(name)]
    parts.append(f"source: {source}" if source not in ("", "definition") else "")
    return "\n".join(part for part in parts if part)
