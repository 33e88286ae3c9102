"""Runs: the same rows however often they are interrupted, extended, or shared out."""

from __future__ import annotations

import itertools
import math
import time

import numpy as np
import pytest

from optimizer.archive import archive as archive_module
from optimizer.archive import merging
from optimizer.archive.archive import open_archive
from optimizer.archive.parts import part_paths
from optimizer.errors import ArchiveMismatchError, ProblemError
from optimizer.fronts import hypervolume
from optimizer.problem import Column, Outcome, Variable
from optimizer.running import runner as runner_module
from optimizer.running.progress import Progress
from optimizer.running.runner import run
from optimizer.running.tally import BOX_ROWS
from optimizer.settings import Settings
from optimizer.workers.pool import Pool


def settings(budget: int = 730, **changes) -> Settings:
    return Settings(budget=budget, seed=5, population=100, **changes)


def stop_after(calls: int):
    """A stop that lets ``calls`` chunks start."""
    left = iter(range(calls + 1))
    return lambda: next(left, None) is None


def test_the_same_settings_give_the_same_rows(tmp_path, failing_plates, rows_of) -> None:
    first = run(failing_plates, tmp_path / "a", settings())
    second = run(failing_plates, tmp_path / "b", settings())
    assert rows_of(tmp_path / "a").equals(rows_of(tmp_path / "b"))
    assert (first.hypervolume, first.front_size) == (second.hypervolume, second.front_size)
    run(failing_plates, tmp_path / "c", Settings(budget=730, seed=6, population=100))
    assert (
        not rows_of(tmp_path / "c")
        .select(["x_mm"])
        .equals(rows_of(tmp_path / "a").select(["x_mm"]))
    )


@pytest.mark.parametrize("budget", [1, 25, 60, 100, 101])
def test_exactly_the_budget_is_stored(tmp_path, plates, budget) -> None:
    summary = run(plates, tmp_path, settings(budget))
    assert summary.evaluations == summary.new == budget
    assert open_archive(tmp_path).table(["evaluation"])["evaluation"].to_pylist() == list(
        range(budget)
    )


@pytest.mark.parametrize("state", ["kept", "missing", "damaged", "older", "of another run"])
def test_a_run_in_pieces_equals_a_run_at_once(
    tmp_path, failing_plates, rows_of, state, monkeypatch
) -> None:
    monkeypatch.setattr(merging, "MERGE_FROM", 10**9)
    whole, pieces, other = tmp_path / "whole", tmp_path / "pieces", tmp_path / "other"
    expected = run(failing_plates, whole, settings())
    if state == "of another run":
        run(failing_plates, other, Settings(budget=100, seed=99))
    older = None
    total = 0
    # Budgets that end within chunks and generations, and stops within generations.
    for budget, stop in ((10, None), (130, None), (450, stop_after(5)), (730, stop_after(9))):
        total += run(failing_plates, pieces, settings(budget), stop=stop).new
        path = pieces / "state.npz"
        if state == "missing":
            path.unlink()
        elif state == "damaged":
            data = path.read_bytes()
            path.write_bytes(data[: len(data) // 2] + b"x" + data[len(data) // 2 + 1 :])
        elif state == "older":
            older = older or path.read_bytes()
            path.write_bytes(older)
        elif state == "of another run":
            path.write_bytes((other / "state.npz").read_bytes())
    last = run(failing_plates, pieces, settings())
    assert total + last.new == 730
    assert rows_of(pieces).equals(rows_of(whole))
    assert last.hypervolume == expected.hypervolume
    assert (last.feasible, last.failed, last.front_size, last.first_feasible) == (
        expected.feasible,
        expected.failed,
        expected.front_size,
        expected.first_feasible,
    )
    first, second = (open_archive(f).front()["evaluation"] for f in (pieces, whole))
    assert first.equals(second)


def test_a_stop_ends_before_the_next_chunk(tmp_path, plates) -> None:
    calls = []
    evaluate = plates.evaluate
    plates.evaluate = lambda x: calls.append(len(x)) or evaluate(x)
    summary = run(plates, tmp_path, settings(), stop=lambda: len(calls) == 6)
    assert summary.stopped
    assert summary.new == 6 * 25


def test_the_snapshot_saves_the_replay(tmp_path, plates, monkeypatch) -> None:
    run(plates, tmp_path, settings(700))
    told = []
    tell = runner_module.DecompositionSearch.tell
    monkeypatch.setattr(
        runner_module.DecompositionSearch,
        "tell",
        lambda self, outcome: told.append(1) or tell(self, outcome),
    )
    run(plates, tmp_path, settings(800))
    assert len(told) == 1
    (tmp_path / "state.npz").unlink()
    run(plates, tmp_path, settings(900))
    assert len(told) == 1 + 9


def test_a_finished_run_does_nothing_more(tmp_path, plates, monkeypatch) -> None:
    before = run(plates, tmp_path, settings())
    monkeypatch.setattr(plates, "evaluate", None)
    after = run(plates, tmp_path, settings())
    assert after.new == 0
    assert (after.evaluations, after.hypervolume) == (before.evaluations, before.hypervolume)
    # A smaller budget takes nothing away.
    assert run(plates, tmp_path, settings(200)).evaluations == 730
    assert open_archive(tmp_path).rows == 730


@pytest.mark.parametrize("workers", [1, 2, 3])
def test_workers_do_not_change_the_rows(tmp_path, rows_of, failing_plates, workers) -> None:
    run(failing_plates, tmp_path / "serial", settings())
    with Pool(workers) as pool:
        run(failing_plates, tmp_path / "pool", settings(), pool)
    assert rows_of(tmp_path / "pool").equals(rows_of(tmp_path / "serial"))


def test_ctrl_c_keeps_what_is_finished(tmp_path, plates, rows_of, monkeypatch) -> None:
    run(plates, tmp_path / "whole", settings())
    evaluate, calls = plates.evaluate, iter(range(100))

    def interrupted(x: np.ndarray) -> Outcome:
        if next(calls) == 9:
            raise KeyboardInterrupt
        return evaluate(x)

    monkeypatch.setattr(plates, "evaluate", interrupted)
    with pytest.raises(KeyboardInterrupt):
        run(plates, tmp_path / "pieces", settings())
    assert open_archive(tmp_path / "pieces").rows == 225
    assert open_archive(tmp_path / "pieces").front().num_rows > 0
    run(plates, tmp_path / "pieces", settings())
    assert rows_of(tmp_path / "pieces").equals(rows_of(tmp_path / "whole"))


def test_a_stop_while_the_archive_is_read_again_loses_nothing(tmp_path, plates, rows_of) -> None:
    expected = run(plates, tmp_path, settings())
    before, front = rows_of(tmp_path), open_archive(tmp_path).front()
    (tmp_path / "state.npz").unlink()
    summary = run(plates, tmp_path, settings(), stop=stop_after(3))
    assert summary.stopped
    assert (summary.evaluations, summary.feasible) == (expected.evaluations, expected.feasible)
    assert open_archive(tmp_path).front()["evaluation"].equals(front["evaluation"])
    assert run(plates, tmp_path, settings()).hypervolume == expected.hypervolume
    assert rows_of(tmp_path).equals(before)


def test_an_archive_of_another_search_is_told_from_its_designs(tmp_path, plates, monkeypatch):
    run(plates, tmp_path, settings())
    (tmp_path / "state.npz").unlink()
    ask = runner_module.DecompositionSearch.ask
    # As a library whose numbers differ in the last bit from the third generation on.
    monkeypatch.setattr(
        runner_module.DecompositionSearch,
        "ask",
        lambda self: np.nextafter(ask(self), 9.0) if self.generation == 2 else ask(self),
    )
    with pytest.raises(ArchiveMismatchError, match="evaluation 200 is not the design"):
        run(plates, tmp_path, settings())
    assert open_archive(tmp_path).rows == 730


def test_an_evaluation_that_always_raises_fills_the_budget_with_failed_rows(tmp_path, plates):
    def broken(x: np.ndarray) -> Outcome:
        msg = "no field solution"
        raise RuntimeError(msg)

    plates.evaluate = broken
    summary = run(plates, tmp_path, settings(250))
    assert (summary.evaluations, summary.failed, summary.front_size) == (250, 250, 0)
    assert summary.first_feasible is None
    assert summary.hypervolume == 0.0
    reader = open_archive(tmp_path)
    assert set(reader.table(["reason"])["reason"].to_pylist()) == {
        "RuntimeError: no field solution"
    }
    assert reader.front().num_rows == 0


def test_a_broken_contract_ends_the_run_and_keeps_the_rows_before(tmp_path, plates, monkeypatch):
    evaluate, calls = plates.evaluate, iter(range(100))
    monkeypatch.setattr(plates, "evaluate", lambda x: evaluate(x if next(calls) < 6 else x[:1]))
    with pytest.raises(ProblemError, match="objectives of shape"):
        run(plates, tmp_path, settings())
    assert open_archive(tmp_path).rows == 150


def test_progress_and_summary_agree_with_the_rows(tmp_path, failing_plates, monkeypatch) -> None:
    monkeypatch.setattr("optimizer.running.meter.SHORTEST_INTERVAL_S", 0.0)
    monkeypatch.setattr("optimizer.running.meter.LARGEST_SHARE", 0.0)
    said: list[Progress] = []
    summary = run(failing_plates, tmp_path, settings(2_000), progress=said.append)
    table = open_archive(tmp_path).table()
    feasible = table["feasible"].to_numpy()
    last = said[-1]
    assert last.evaluations == summary.evaluations == last.budget == 2_000
    assert last.feasible == summary.feasible == feasible.sum()
    assert last.failed == summary.failed == table["status"].to_pylist().count("failed")
    assert last.first_feasible == summary.first_feasible == int(np.argmax(feasible))
    assert last.seconds_left == 0.0
    volumes = [one.hypervolume for one in said]
    assert all(b >= a for a, b in itertools.pairwise(volumes))
    assert volumes[-1] > 0.5
    # The stated box: best and worst of the feasible rows up to the generation that made twenty.
    whole = np.cumsum(feasible).searchsorted(BOX_ROWS) // 100 * 100 + 100
    points = np.column_stack([table[f"objective:{n}"].to_numpy() for n in ("near", "far")])
    early = points[:whole][feasible[:whole]]
    low, high = early.min(axis=0), early.max(axis=0)
    scaled = (points[feasible] - low) / (high - low)
    # The same volume from all rows instead of the front kept along the way.
    assert summary.hypervolume == pytest.approx(hypervolume(scaled, [1.0, 1.0]), rel=1e-12)


def test_the_rate_leaves_out_rows_from_the_archive(tmp_path, plates, monkeypatch) -> None:
    run(plates, tmp_path, settings(5_000))
    (tmp_path / "state.npz").unlink()
    evaluate = plates.evaluate

    def slow(x: np.ndarray) -> Outcome:
        time.sleep(0.05)
        return evaluate(x)

    monkeypatch.setattr(plates, "evaluate", slow)
    said: list[Progress] = []
    summary = run(plates, tmp_path, settings(5_200), progress=said.append)
    assert summary.new == 200
    assert math.isnan(said[0].rate)  # nothing new yet
    # 25 designs in 50 ms are 500 a second at most; with the replay it would be thousands.
    assert 50.0 < said[-1].rate <= 500.0


def test_slow_chunks_are_stored_as_they_finish(tmp_path, plates, monkeypatch) -> None:
    monkeypatch.setattr(archive_module, "SHORTEST_INTERVAL_S", 0.02)
    monkeypatch.setattr(archive_module, "LARGEST_SHARE", 0.0)
    monkeypatch.setattr(merging, "MERGE_FROM", 10**9)
    evaluate, seen = plates.evaluate, []

    def slow(x: np.ndarray) -> Outcome:
        seen.append(open_archive(tmp_path).rows)
        time.sleep(0.3)
        return evaluate(x)

    monkeypatch.setattr(plates, "evaluate", slow)
    run(plates, tmp_path, settings(125))
    assert seen == [0, 25, 50, 75, 100]
    assert len(part_paths(tmp_path)) == 5


class OneBest:
    """A single objective without constraints or further columns."""

    variables = (Variable("a", -2.0, 5.0), Variable("b", -2.0, 5.0))
    objectives = ("bowl",)
    constraints = ()
    columns = ()

    def evaluate(self, x: np.ndarray) -> Outcome:
        return Outcome(((x - 1.0) ** 2).sum(axis=1)[:, None], np.zeros((len(x), 0)))


def test_one_objective_gives_a_front_of_one(tmp_path) -> None:
    summary = run(OneBest(), tmp_path, settings(3_000))
    front = open_archive(tmp_path).front()
    assert summary.front_size == front.num_rows == 1
    assert front["objective:bowl"][0].as_py() < 1e-6  # 0 is best, at (1, 1)


def test_a_name_the_archive_needs_is_refused(tmp_path, plates) -> None:
    plates.columns = (*plates.columns, Column("status"))
    with pytest.raises(ProblemError, match="the name status stands for two columns"):
        run(plates, tmp_path, settings())


def test_a_column_of_the_wrong_kind_is_named(tmp_path, plates) -> None:
    plates.columns = (plates.columns[0], Column("word", kind="float64"))
    with pytest.raises(ProblemError, match="column word cannot be stored as double"):
        run(plates, tmp_path, settings())
