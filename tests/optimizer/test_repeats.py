"""No design is paid for twice."""

from __future__ import annotations

import numpy as np
import pytest

from optimizer.archive.archive import open_archive
from optimizer.problem import Column, Outcome
from optimizer.running import runner as runner_module
from optimizer.running.repeats import Repeats
from optimizer.running.runner import run
from optimizer.settings import Settings
from optimizer.workers.pool import Pool

SETTINGS = Settings(budget=730, seed=5, population=100)


@pytest.fixture(autouse=True)
def _coarse(monkeypatch) -> None:
    """Designs on a grid so coarse that the search comes back to them."""
    ask = runner_module.DecompositionSearch.ask
    monkeypatch.setattr(
        runner_module.DecompositionSearch, "ask", lambda self: np.round(ask(self) * 2.0) / 2.0
    )


class Counted:
    """Wraps a problem and remembers each design it was paid for."""

    def __init__(self, problem) -> None:
        self.paid: list[bytes] = []
        evaluate = problem.evaluate
        problem.columns = (
            *problem.columns,
            Column("whole", kind="int64"),
            Column("flag", kind="bool"),
        )

        def counting(x: np.ndarray) -> Outcome:
            self.paid += [row.tobytes() for row in np.ascontiguousarray(x + 0.0)]
            found = evaluate(x)
            whole = np.where(found.ok, np.round(x[:, 0] * 2.0), np.nan)
            columns = {**found.columns, "whole": whole, "flag": x[:, 2] > 0.0}
            return Outcome(found.objectives, found.constraints, found.status, found.reason, columns)

        problem.evaluate = counting


def test_a_design_is_paid_for_once_and_its_repeats_say_so(tmp_path, failing_plates) -> None:
    counted = Counted(failing_plates)
    # Whole chunks: of one cut by the budget more is evaluated than stored.
    run(failing_plates, tmp_path, Settings(budget=725, seed=5, population=100))
    assert len(counted.paid) == len(set(counted.paid)) < 725
    rows = open_archive(tmp_path).table().to_pylist()
    assert len(rows) == 725
    names = [v.name for v in failing_plates.variables]
    first: dict[tuple, dict] = {}
    own = {"evaluation", "generation", "reason", "time_s", "finished_at"}
    failed = 0
    for row in rows:
        original = first.setdefault(tuple(row[name] for name in names), row)
        if original is row:
            assert "repeat" not in row["reason"]
            continue
        note = f"repeat of evaluation {original['evaluation']}"
        assert row["reason"] == (f"{original['reason']}; {note}" if original["reason"] else note)
        assert row["time_s"] == 0.0
        assert {k: v for k, v in row.items() if k not in own} == {
            k: v for k, v in original.items() if k not in own
        }
        failed += row["status"] == "failed"
    assert len(first) == len(counted.paid)
    assert failed > 0  # so that rows with nulls were copied too


@pytest.mark.parametrize("snapshot", [True, False])
def test_interruptions_change_nothing_and_pay_for_nothing_twice(
    tmp_path, failing_plates, rows_of, snapshot
) -> None:
    counted = Counted(failing_plates)
    run(failing_plates, tmp_path / "whole", SETTINGS)
    once = set(counted.paid)
    counted.paid.clear()
    for budget in (100, 200, 500, 730):  # whole chunks, which are never evaluated in part
        run(failing_plates, tmp_path / "pieces", Settings(budget=budget, seed=5, population=100))
        if not snapshot:
            (tmp_path / "pieces" / "state.npz").unlink()
    assert rows_of(tmp_path / "pieces").equals(rows_of(tmp_path / "whole"))
    assert sorted(counted.paid) == sorted(once)


@pytest.mark.parametrize("budget", [10, 133, 377])
def test_budgets_that_end_within_a_chunk(tmp_path, failing_plates, rows_of, budget) -> None:
    run(failing_plates, tmp_path / "whole", SETTINGS)
    run(failing_plates, tmp_path / "pieces", Settings(budget=budget, seed=5, population=100))
    assert open_archive(tmp_path / "pieces").rows == budget
    run(failing_plates, tmp_path / "pieces", SETTINGS)
    assert rows_of(tmp_path / "pieces").equals(rows_of(tmp_path / "whole"))


def test_the_workers_change_nothing(tmp_path, failing_plates, rows_of) -> None:
    run(failing_plates, tmp_path / "serial", SETTINGS)
    with Pool(2) as pool:
        run(failing_plates, tmp_path / "pool", SETTINGS, pool)
    assert rows_of(tmp_path / "pool").equals(rows_of(tmp_path / "serial"))


def test_a_source_is_the_first_of_its_kind_to_the_last_bit() -> None:
    repeats = Repeats()
    x = np.array([[1.0, 2.0], [1.0, 3.0], [1.0, 2.0], [np.nextafter(1.0, 2.0), 2.0]])
    assert repeats.sources(0, x).tolist() == [-1, -1, 0, -1]
    assert repeats.sources(4, x[::-1]).tolist() == [3, 0, 1, 0]
    zeros = np.array([[0.0, 5.0], [-0.0, 5.0]])
    assert repeats.sources(8, zeros).tolist() == [-1, 8]
