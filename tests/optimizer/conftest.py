"""Small problems shared by the tests of the optimizer; their optima are known exactly."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pytest

from optimizer.archive import archive as archive_module
from optimizer.archive import merging
from optimizer.archive.archive import open_archive
from optimizer.problem import Column, Outcome, Variable

# The folder is not importable under --import-mode=importlib, and scripts run by the tests
# import this package too.
ROOT = Path(__file__).parents[2]
TIME_COLUMNS = ("time_s", "finished_at")


class Plates:
    """Two objectives that pull apart, one constraint, a metric, a fixed variable.

    f1 = x^2 + d, f2 = (x - 2)^2 + d with d >= 0 the squared rest; feasible where x >= 0.5, so
    the front is x in [0.5, 2] with d = 0. About 20 % of the box fails when ``failing``.
    """

    def __init__(self, failing: bool = False) -> None:
        self.failing = failing
        self.variables = (
            Variable("x_mm", -1.0, 3.0),
            Variable("fixed_mm", 4.0, 4.0),
            Variable("y_mm", -1.0, 1.0),
            Variable("z_mm", 0.0, 2.0),
        )
        self.objectives = ("near", "far")
        self.constraints = ("right_of_half",)
        self.columns = (
            Column("rest_mm2", "mm2", "metric", "squared distance from the front's line"),
            Column("word", "", "metric", "a text", "string"),
        )

    def evaluate(self, x: np.ndarray) -> Outcome:
        rest = x[:, 2] ** 2 + (x[:, 3] - 1.0) ** 2
        objectives = np.column_stack([x[:, 0] ** 2 + rest, (x[:, 0] - 2.0) ** 2 + rest])
        status, reason = np.full(len(x), "ok"), np.full(len(x), "")
        if self.failing:
            # Neighbouring designs differ in whether they fail, so no region is lost.
            bad = np.modf(np.abs(x).sum(axis=1) * 1e6)[0] < 0.2
            status, reason = np.where(bad, "failed", "ok"), np.where(bad, "as planned", "")
            objectives[bad] = -1e9  # would dominate everything if it counted
        words = np.where(x[:, 0] > 1.0, "right", "left")
        columns = {"rest_mm2": rest, "word": words}
        return Outcome(objectives, 0.5 - x[:, :1], status, reason, columns)


@pytest.fixture
def plates() -> Plates:
    return Plates()


@pytest.fixture
def failing_plates() -> Plates:
    return Plates(failing=True)


@pytest.fixture
def rows_of():
    """All rows of an archive but the columns of time, as a table that compares exactly."""

    def read(folder: Path):
        table = open_archive(folder).table()
        return table.drop_columns(list(TIME_COLUMNS)).combine_chunks()

    return read


@pytest.fixture
def many_parts(monkeypatch) -> None:
    """Write every chunk as a part of its own, and leave the parts as they are."""
    monkeypatch.setattr(archive_module, "SHORTEST_INTERVAL_S", 0.0)
    monkeypatch.setattr(archive_module, "LARGEST_SHARE", 0.0)
    monkeypatch.setattr(merging, "MERGE_FROM", 10**9)
    monkeypatch.setattr(merging, "MERGE_MEANWHILE", 10**9)


@pytest.fixture
def python_path() -> dict[str, str]:
    import os

    return {**os.environ, "PYTHONPATH": str(ROOT)}


@pytest.fixture(autouse=True, scope="session")
def _send_by_value() -> None:
    """Let worker processes get the classes above, which they cannot import."""
    import cloudpickle

    cloudpickle.register_pickle_by_value(sys.modules[Plates.__module__])
