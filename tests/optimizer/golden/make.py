"""Made ``schema_1`` beside this file: archives as the first version of the layout has them.

Run once for each new schema version, by the code that writes it, and never again: what it wrote
must stay readable. ``python tests/optimizer/golden/make.py tests/optimizer/golden/schema_1``
"""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np

from optimizer.archive import archive
from optimizer.problem import Column, Outcome, Variable
from optimizer.running.runner import run
from optimizer.settings import Settings


class Plate:
    """Every kind of column, failed rows with nulls, and a variable that is fixed."""

    variables = (
        Variable("width_mm", 1.0, 4.0),
        Variable("height_mm", 2.0, 2.0),
        Variable("angle_deg", -1.0, 1.0),
    )
    objectives = ("area_mm2", "excess")
    constraints = ("angle_at_most",)
    columns = (
        Column("area_mm2", "mm2", "metric", "width times height"),
        Column("steps", "", "metric", "whole millimetres of the width", "int64"),
        Column("wide", "", "metric", "wider than high", "bool"),
        Column("word", "", "metric", "the same in words", "string"),
    )

    def evaluate(self, x: np.ndarray) -> Outcome:
        width, height, angle = x.T
        area = width * height
        bad = angle < -0.75
        columns = {
            "area_mm2": np.where(bad, np.nan, area),
            "steps": np.where(bad, np.nan, np.floor(width)),
            "wide": width > height,
            "word": np.where(width > height, "wide", "high"),
        }
        return Outcome(
            np.column_stack([area, 4.0 - width + angle * angle]),
            (angle - 0.5)[:, None],
            np.where(bad, "invalid", "ok"),
            np.where(bad, "turned too far", ""),
            columns,
        )


SETTINGS = Settings(
    budget=30,
    seed=11,
    population=8,
    chunk=4,
    evaluator="plate",
    evaluator_version="2",
    labels={"study": "plates", "study_digest": "0123abcd"},
)


def stop_after(calls: int):
    """Stop a run when it asked that many times."""
    left = iter(range(calls))
    return lambda: next(left, None) is None


def main(folder: Path) -> None:
    archive.SHORTEST_INTERVAL_S = archive.LARGEST_SHARE = 0.0
    run(Plate(), folder / "finished", SETTINGS)
    # As it was when the process was killed: parts not merged, no front, no snapshot.
    run(Plate(), folder / "killed", SETTINGS, stop=stop_after(3))
    for name in ("front.parquet", ".front.crc", "state.npz"):
        (folder / "killed" / name).unlink()
    for lock in folder.glob("*/.lock"):
        lock.unlink()


if __name__ == "__main__":
    main(Path(sys.argv[1]))
