"""Archives written by earlier versions stay readable, and can be continued."""

from __future__ import annotations

import importlib.util
import shutil
from dataclasses import replace
from pathlib import Path
from types import ModuleType

import numpy as np
import pyarrow as pa
import pytest

from optimizer.archive.archive import open_archive
from optimizer.archive.identity import SEARCH_VERSION
from optimizer.errors import ArchiveMismatchError
from optimizer.fronts import non_dominated
from optimizer.running.runner import run

GOLDEN = Path(__file__).parent / "golden"
ARCHIVES = {"finished": 30, "killed": 8}  # rows


@pytest.fixture(scope="module")
def made() -> ModuleType:
    """The script that made them, for its problem and settings."""
    spec = importlib.util.spec_from_file_location("make", GOLDEN / "make.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.fixture(params=list(ARCHIVES))
def old(request, tmp_path) -> Path:
    """A copy, for nothing may change the golden files themselves."""
    shutil.copytree(GOLDEN / "schema_1" / request.param, tmp_path / request.param)
    return tmp_path / request.param


def right(table: pa.Table, problem) -> None:
    """Every row holds what the problem says of its design."""
    x = np.column_stack([table[item.name].to_numpy() for item in problem.variables])
    outcome = problem.evaluate(x)
    assert table["status"].to_pylist() == outcome.status.tolist()
    assert table["reason"].to_pylist() == outcome.reason.tolist()
    assert table["feasible"].to_pylist() == outcome.feasible.tolist()
    # Powers and products may differ in the last bit between processors.
    for column, name in enumerate(problem.objectives):
        stored = table[f"objective:{name}"].to_numpy()[outcome.ok]
        assert stored == pytest.approx(outcome.objectives[outcome.ok, column], rel=1e-15)
    stored = table["margin:angle_at_most"].to_numpy()[outcome.ok]
    assert stored == pytest.approx(outcome.constraints[outcome.ok, 0], abs=1e-15)
    for name in ("wide", "word"):
        assert table[name].to_pylist() == outcome.columns[name].tolist()
    steps = [None if np.isnan(item) else int(item) for item in outcome.columns["steps"]]
    assert table["steps"].to_pylist() == steps
    assert {"invalid"} < set(table["status"].to_pylist())  # rows with nulls are among them


def test_rows_types_and_front_are_read(old, made) -> None:
    problem, rows = made.Plate(), ARCHIVES[old.name]
    reader = open_archive(old)
    assert reader.settings["schema_version"] == 1
    assert reader.settings["labels"] == {"study": "plates", "study_digest": "0123abcd"}
    table = reader.table()
    assert reader.damaged == ()
    assert table["evaluation"].to_pylist() == list(range(rows))
    right(table, problem)
    kinds = {"steps": pa.int64(), "wide": pa.bool_(), "word": pa.string(), "area_mm2": pa.float64()}
    assert {name: table.schema.field(name).type for name in kinds} == kinds
    assert table.schema.field("area_mm2").metadata[b"unit"] == b"mm2"
    feasible = np.flatnonzero(table["feasible"].to_numpy())
    points = np.column_stack(
        [table[f"objective:{name}"].to_numpy()[feasible] for name in problem.objectives]
    )
    front = reader.front()
    assert front["evaluation"].to_pylist() == feasible[non_dominated(points)].tolist()
    assert reader.row(7)["seed"] == 11
    assert {item.name for item in old.iterdir()} <= {
        "archive.json", "front.parquet", ".front.crc", "state.npz",
        *(path.name for path in old.glob("part-*")),
    }  # fmt: skip


def test_a_search_goes_on_from_them(old, made) -> None:
    problem, rows = made.Plate(), ARCHIVES[old.name]
    reader = open_archive(old)
    before = reader.table()
    if reader.settings["search"] != SEARCH_VERSION:
        # The same seed gives other designs now, so only reading makes sense.
        with pytest.raises(ArchiveMismatchError, match="search 'decomposition 1' there"):
            run(problem, old, made.SETTINGS)
        assert open_archive(old).table().equals(before)
        return
    # What was killed holds one generation: later ones depend on powers, whose last bit may
    # differ between processors, and resuming without a snapshot compares to the last bit.
    summary = run(problem, old, replace(made.SETTINGS, budget=46))
    assert summary.damaged == ()
    assert summary.new == 46 - rows
    after = open_archive(old).table()
    assert after["evaluation"].to_pylist() == list(range(46))
    right(after, problem)
    assert after.slice(0, rows).equals(before)  # times too: nothing is evaluated again


def test_they_refuse_other_settings(old, made) -> None:
    with pytest.raises(ArchiveMismatchError, match="seed 11 there and 12 here"):
        run(made.Plate(), old, replace(made.SETTINGS, seed=12))
