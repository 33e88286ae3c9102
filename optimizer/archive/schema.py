"""Columns of an archive: rows to tables and back."""

from __future__ import annotations

import json
from dataclasses import dataclass
from typing import Any

import numpy as np
import pyarrow as pa

from optimizer.archive.identity import IDENTITY_KEY, SCHEMA_VERSION, VERSION_KEY, identity_of
from optimizer.errors import ProblemError
from optimizer.problem import Column, FloatArray, IntArray, Outcome, Problem, join_outcomes
from optimizer.settings import Settings

PARTS_KEY = b"optimizer.parts"  # of front.parquet: which parts it was made of

_HEAD = (
    Column("evaluation", "", "identity", "number of the evaluation, from 0", "int64"),
    Column("generation", "", "identity", "generation of the search, from 0", "int64"),
)
_STATUS = (
    Column("status", "", "outcome", "ok, or the word for what went wrong", "string"),
    Column("reason", "", "outcome", "why the row failed; empty if it did not", "string"),
)
_TAIL = (
    Column("feasible", "", "outcome", "evaluated, and no margin above 0", "bool"),
    Column("evaluator", "", "origin", "name of the evaluator", "string"),
    Column("evaluator_version", "", "origin", "version of the evaluator", "string"),
    Column("seed", "", "origin", "seed of the search", "int64"),
    Column("time_s", "s", "origin", "wall time of the chunk shared among its rows"),
    Column("finished_at", "UTC", "origin", "when the chunk was finished", "string"),
)
_TYPES = {
    "float64": pa.float64(),
    "int64": pa.int64(),
    "bool": pa.bool_(),
    "string": pa.string(),
}
_SPECIAL = {"generation": pa.int32(), "finished_at": pa.timestamp("us", tz="UTC")}


@dataclass(frozen=True)
class Rows:
    """Evaluations on their way into the archive.

    Parameters
    ----------
    evaluations, generations : (n,) arrays of int
    x : (n, v) array
    outcome : Outcome
    time_s : (n,) array
    finished_at : (n,) array of int
        Microseconds since 1970 in UTC.
    """

    evaluations: IntArray
    generations: IntArray
    x: FloatArray
    outcome: Outcome
    time_s: FloatArray
    finished_at: IntArray

    def __len__(self) -> int:
        return len(self.evaluations)


def join_rows(parts: list[Rows]) -> Rows:
    """Put rows one below the other."""
    return Rows(
        np.concatenate([p.evaluations for p in parts]),
        np.concatenate([p.generations for p in parts]),
        np.concatenate([p.x for p in parts]),
        join_outcomes([p.outcome for p in parts]),
        np.concatenate([p.time_s for p in parts]),
        np.concatenate([p.finished_at for p in parts]),
    )


def archive_schema(problem: Problem, settings: Settings) -> pa.Schema:
    """Return the Arrow schema of every part of an archive.

    Raises
    ------
    ProblemError
        If a variable or column takes a name the archive itself needs.
    """
    variables = [
        Column(v.name, "", "variable", f"from {v.lower:g} to {v.upper:g}")
        for v in problem.variables
    ]
    objectives = [
        Column(f"objective:{name}", "", "objective", f"{name}, minimised value")
        for name in problem.objectives
    ]
    margins = [
        Column(f"margin:{name}", "1", "margin", f"{name}: met where <= 0")
        for name in problem.constraints
    ]
    columns = [*_HEAD, *variables, *_STATUS, *problem.columns, *objectives, *margins, *_TAIL]
    names = [column.name for column in columns]
    for name in names:
        if names.count(name) > 1:
            msg = f"the name {name} stands for two columns of the archive; choose another"
            raise ProblemError(msg)
    fields = []
    for column in columns:
        kind = _SPECIAL.get(column.name, _TYPES[column.kind])
        about = {"unit": column.unit, "role": column.role, "description": column.description}
        fields.append(pa.field(column.name, kind, metadata=about))
    identity = json.dumps(identity_of(problem, settings), sort_keys=True)
    metadata = {VERSION_KEY: str(SCHEMA_VERSION).encode(), IDENTITY_KEY: identity.encode()}
    return pa.schema(fields, metadata=metadata)


def to_table(rows: Rows, schema: pa.Schema, problem: Problem, settings: Settings) -> pa.Table:
    """Turn rows into a table; a number that is NaN becomes null."""
    outcome, count = rows.outcome, len(rows)
    values: dict[str, Any] = {
        "evaluation": rows.evaluations,
        "generation": rows.generations,
        "status": outcome.status,
        "reason": outcome.reason,
        **outcome.columns,
        "feasible": outcome.feasible,
        "evaluator": np.full(count, settings.evaluator),
        "evaluator_version": np.full(count, settings.evaluator_version),
        "seed": np.full(count, settings.seed),
        "time_s": rows.time_s,
        "finished_at": rows.finished_at,
    }
    values |= {v.name: rows.x[:, i] for i, v in enumerate(problem.variables)}
    for i, name in enumerate(problem.objectives):
        values[f"objective:{name}"] = outcome.objectives[:, i]
    for i, name in enumerate(problem.constraints):
        values[f"margin:{name}"] = outcome.constraints[:, i]
    arrays = []
    for item in schema:
        try:
            arrays.append(pa.array(values[item.name], type=item.type, from_pandas=True))
        except (pa.ArrowInvalid, pa.ArrowTypeError, pa.ArrowNotImplementedError) as error:
            msg = f"column {item.name} cannot be stored as {item.type}: {error}"
            raise ProblemError(msg) from error
    return pa.Table.from_arrays(arrays, schema=schema)


def needed_columns(problem: Problem) -> list[str]:
    """Names of the columns a search needs to replay an archive."""
    return [
        "evaluation",
        *(v.name for v in problem.variables),
        "status",
        *(f"objective:{name}" for name in problem.objectives),
        *(f"margin:{name}" for name in problem.constraints),
    ]


def from_table(table: pa.Table, problem: Problem) -> tuple[IntArray, FloatArray, Outcome]:
    """Return the numbers, designs and outcomes (without further columns) of a table."""

    def matrix(names: list[str]) -> FloatArray:
        stacked = np.empty((table.num_rows, len(names)))
        for i, name in enumerate(names):
            stacked[:, i] = table.column(name).to_numpy()
        return stacked

    outcome = Outcome(
        matrix([f"objective:{name}" for name in problem.objectives]),
        matrix([f"margin:{name}" for name in problem.constraints]),
        np.asarray(table.column("status").to_pylist(), dtype=np.str_),
    )
    evaluations = table.column("evaluation").to_numpy().astype(np.int64)
    return evaluations, matrix([v.name for v in problem.variables]), outcome


def full_outcome(table: pa.Table, problem: Problem) -> Outcome:
    """Return the outcomes of a table with reasons and further columns."""
    _, _, bare = from_table(table, problem)
    return Outcome(
        bare.objectives,
        bare.constraints,
        bare.status,
        np.asarray(table.column("reason").to_pylist(), dtype=np.str_),
        {c.name: table.column(c.name).to_numpy(zero_copy_only=False) for c in problem.columns},
    )
