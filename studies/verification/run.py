"""Evaluating designs of one search again, stored as they come."""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from evaluators.machine.metrics import METRIC
from optimizer.archive.durable import make_folder, remove_leftovers
from optimizer.archive.lock import writer_lock
from optimizer.archive.parts import (
    DamagedPartError,
    check_part,
    next_number,
    part_paths,
    read_part,
    set_aside,
    write_part,
)
from optimizer.workers.dispatch import Chunk, Dispatcher, Finished, single_threaded
from studies.inspection.chosen import QUICK_CHUNK, QUICK_EVALUATOR, SLOW_CHUNK
from studies.problem import MachineProblem
from studies.stored.families import matrix
from studies.stored.verified import DEVIATION, STORED, VerifiedRow, deviation, verified_folder

IntArray = NDArray[np.int64]

NO_SETTINGS = "{}"


@dataclass(frozen=True)
class Plan:
    """What there is to do for one search of a family.

    Attributes
    ----------
    search : str
        Its name.
    folder : Path
        Of its archive.
    problem : MachineProblem
        With the evaluator that verifies.
    designs : Table
        Rows of the archive, all columns.
    """

    search: str
    folder: Path
    problem: MachineProblem
    designs: pa.Table

    @property
    def identity(self) -> dict[str, str]:
        """What a stored row must agree with to count as done."""
        return {
            "evaluator": self.problem.evaluator.name,
            "evaluator_version": self.problem.evaluator.version,
            "settings": json.dumps(self.problem.evaluator_settings, sort_keys=True),
        }

    def __len__(self) -> int:
        return int(self.designs.num_rows)


@dataclass(frozen=True)
class Done:
    """What a verification leaves behind for one search.

    Attributes
    ----------
    plan : Plan
    rows : list of VerifiedRow
        Of the planned designs, those done before among them.
    new : int
        Evaluated now.
    """

    plan: Plan
    rows: list[VerifiedRow]
    new: int

    @property
    def complete(self) -> bool:
        """Whether all planned designs are done."""
        return len(self.rows) == len(self.plan)


def verify_family(
    plan: Plan,
    dispatcher: Dispatcher,
    stop: Callable[[], bool],
    progress: Callable[[int, int], None],
    say: Callable[[str], None],
) -> Done:
    """Evaluate what is missing; every chunk is on disk before the next is counted.

    Parameters
    ----------
    plan : Plan
    dispatcher : Dispatcher
    stop : callable
        Asked before each chunk is started.
    progress : callable
        Called with designs done, and how many of them were evaluated since the last call.
    say : callable
        Called before anything is evaluated with what was verified before and is done again.

    Raises
    ------
    OptimizerError
        If the values cannot be stored, or another process is verifying the same search.
    """
    folder = verified_folder(plan.folder, plan.problem.evaluator_name)
    make_folder(folder)
    with writer_lock(folder), single_threaded():
        remove_leftovers(folder)
        found, damaged = _sound_rows(folder)
        rows, outdated = _current(found, plan)
        for text in _notices(plan, outdated, damaged):
            say(text)
        missing = np.array(
            [i for i, n in enumerate(plan.designs["evaluation"].to_pylist()) if n not in rows],
            dtype=np.int64,
        )
        before = len(rows)
        progress(before, 0)
        for finished, places in _evaluated(plan, missing, dispatcher, stop):
            table = _table(plan, places, finished)
            write_part(folder, next_number(folder), table)
            rows |= {int(row["evaluation"]): VerifiedRow(row) for row in table.to_pylist()}
            progress(len(rows), len(places))
        _merge(folder)
    ordered = [rows[key] for key in sorted(rows)]
    return Done(plan, ordered, len(rows) - before)


def _sound_rows(folder: Path) -> tuple[dict[int, dict[str, Any]], list[Path]]:
    """Rows of all sound parts, the newest of each design; damaged parts are set aside."""
    rows: dict[int, dict[str, Any]] = {}
    damaged = []
    for path in part_paths(folder):
        try:
            check_part(path)
            rows |= {int(row["evaluation"]): row for row in read_part(path).to_pylist()}
        except DamagedPartError:
            damaged.append(set_aside(path))
    return rows, damaged


def _current(
    found: dict[int, dict[str, Any]], plan: Plan
) -> tuple[dict[int, VerifiedRow], dict[str, int]]:
    """Planned designs that are done, and what the outdated ones were made by."""
    identity = plan.identity
    rows: dict[int, VerifiedRow] = {}
    outdated: dict[str, int] = {}
    for number in plan.designs["evaluation"].to_pylist():
        row = found.get(number)
        if row is None:
            continue
        if all(row[name] == value for name, value in identity.items()):
            rows[number] = VerifiedRow(row)
        else:
            made_by = f"{row['evaluator']} {row['evaluator_version']}"
            if row["settings"] != NO_SETTINGS:
                made_by += f" with settings {row['settings']}"
            outdated[made_by] = outdated.get(made_by, 0) + 1
    return rows, outdated


def _notices(plan: Plan, outdated: dict[str, int], damaged: list[Path]) -> Iterator[str]:
    identity = plan.identity
    now = f"{identity['evaluator']} {identity['evaluator_version']}"
    if identity["settings"] != NO_SETTINGS:
        now += f" with settings {identity['settings']}"
    for made_by, count in outdated.items():
        yield f"{plan.search}: {counted(count)} verified before by {made_by}, now again by {now}"
    for path in damaged:
        yield (
            f"{plan.search}: a damaged part was set aside as {path}; its designs are verified again"
        )


def counted(designs: int) -> str:
    """A number of designs in words."""
    return "1 design" if designs == 1 else f"{designs:,} designs"


def _evaluated(
    plan: Plan, missing: IntArray, dispatcher: Dispatcher, stop: Callable[[], bool]
) -> Iterator[tuple[Finished, IntArray]]:
    size = QUICK_CHUNK if plan.problem.evaluator_name == QUICK_EVALUATOR else SLOW_CHUNK
    names = [item.name for item in plan.problem.variables]
    x = matrix(plan.designs, names)

    def chunks() -> Iterator[Chunk]:
        for start in range(0, missing.size, size):
            if stop():
                return
            yield Chunk(start, x[missing[start : start + size]])

    for finished in dispatcher.run(plan.problem, chunks()):
        first = finished.start
        yield finished, missing[first : first + len(finished.outcome)]


def _table(plan: Plan, places: IntArray, finished: Finished) -> pa.Table:
    """Rows of one chunk with the archive's values beside them."""
    outcome, count = finished.outcome, len(places)
    stored = plan.designs.take(pa.array(places))
    when = datetime.fromtimestamp(finished.finished_at * 1e-6, tz=UTC)
    columns: dict[str, pa.Array] = {
        "evaluation": stored["evaluation"].combine_chunks(),
        "status": pa.array(outcome.status.tolist(), pa.string()),
        "reason": pa.array(outcome.reason.tolist(), pa.string()),
        "feasible": pa.array(np.asarray(outcome.feasible)),
        **{name: pa.array([text] * count, pa.string()) for name, text in plan.identity.items()},
        "time_s": pa.array(np.full(count, finished.seconds / count)),
        "finished_at": pa.array([when] * count, pa.timestamp("us", tz="UTC")),
    }
    numbers = {name: np.asarray(values) for name, values in outcome.columns.items()}
    for name, values in zip(plan.problem.objectives, outcome.objectives.T, strict=True):
        numbers[f"objective:{name}"] = values
    for name, values in zip(plan.problem.constraints, outcome.constraints.T, strict=True):
        numbers[f"margin:{name}"] = values
    columns |= {name: pa.array(values, pa.float64()) for name, values in numbers.items()}
    for name, values in numbers.items():
        if name in stored.column_names:
            old = stored[name].to_numpy().astype(np.float64)
            change = [deviation(new, was) for new, was in zip(values, old, strict=True)]
            columns[f"{STORED}{name}"] = pa.array(old)
            columns[f"{DEVIATION}{name}"] = pa.array(change, pa.float64())
    fields = [
        pa.field(name, array.type, metadata=_description(name)) for name, array in columns.items()
    ]
    return pa.Table.from_arrays(list(columns.values()), schema=pa.schema(fields))


def _description(name: str) -> dict[str, str]:
    if name in METRIC:
        return {"unit": METRIC[name].unit, "description": METRIC[name].definition}
    bare = name.removeprefix(STORED).removeprefix(DEVIATION)
    if name.startswith(DEVIATION):
        return {"unit": "1", "description": f"{bare}, verified minus stored, over size of stored"}
    unit = METRIC[bare].unit if bare in METRIC else ""
    return {"unit": unit, "description": f"{bare} in the archive"} if name != bare else {}


def _merge(folder: Path) -> None:
    """Put all parts into one; the newest row of each design stays.

    A crash in between leaves rows twice, which does no harm.
    """
    paths = part_paths(folder)
    if len(paths) < 2:
        return
    table = pa.concat_tables([read_part(path) for path in paths], promote_options="default")
    numbers = table["evaluation"].to_numpy()
    newest = {int(number): place for place, number in enumerate(numbers)}
    order = [newest[number] for number in sorted(newest)]
    write_part(folder, next_number(folder), table.take(pa.array(order)).combine_chunks())
    for path in paths:
        path.unlink(missing_ok=True)
