"""An evaluation that hangs, dies or eats all memory costs one row, and no longer than allowed."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import threading
import time

import cloudpickle
import numpy as np
import pytest

from optimizer.errors import ProblemError
from optimizer.problem import Column, Outcome, Variable
from optimizer.running.runner import run
from optimizer.settings import Settings
from optimizer.workers.dispatch import Chunk
from optimizer.workers.pool import Pool

cloudpickle.register_pickle_by_value(sys.modules[__name__])

LIMIT_S = 1.0
# A busy machine may take long to start a worker; what is shown is that nobody waits for an hour.
LONGEST_S = 60.0


class Cubes:
    """x cubed; ``trouble`` is called with each batch first."""

    variables = (Variable("x", 0.0, 1000.0),)
    objectives = ("cube",)
    constraints = ()
    columns = (Column("worker", kind="int64"),)

    def __init__(self, trouble=None) -> None:
        self.trouble = trouble

    def evaluate(self, x: np.ndarray) -> Outcome:
        if self.trouble is not None:
            self.trouble(x[:, 0])
        return Outcome(
            x**3, np.zeros((len(x), 0)), columns={"worker": np.full(len(x), os.getpid())}
        )


def chunks(count: int = 4, size: int = 5) -> list[Chunk]:
    x = np.arange(float(count * size))[:, None]
    return [Chunk(i * size, x[i * size : (i + 1) * size]) for i in range(count)]


def by_row(done) -> dict[int, tuple[float, str, str]]:
    """Objective, status and reason of each row."""
    rows = {}
    for one in done:
        outcome = one.outcome
        for i in range(len(outcome)):
            value = float(outcome.objectives[i, 0])
            rows[one.start + i] = (value, str(outcome.status[i]), str(outcome.reason[i]))
    return rows


def assert_only(rows, bad: dict[int, tuple[str, str]], count: int = 20) -> None:
    assert sorted(rows) == list(range(count))
    for number, (value, status, reason) in rows.items():
        assert (status, reason) == bad.get(number, ("ok", ""))
        assert np.isnan(value) if number in bad else value == float(number) ** 3


@pytest.mark.parametrize("workers", [1, 2])
def test_a_row_that_hangs_is_given_up_alone_and_in_time(workers) -> None:
    def hang(x: np.ndarray) -> None:
        if x[0] in (3.0, 7.0):
            time.sleep(3600.0)

    begin = time.monotonic()
    with Pool(workers, LIMIT_S) as pool:
        rows = by_row(pool.run(Cubes(hang), chunks()))
        late = ("timed out", "no answer within 1 s")
        assert_only(rows, {3: late, 7: late})
        assert time.monotonic() - begin < LONGEST_S
        # The same pool goes on with a full crew.
        assert_only(by_row(pool.run(Cubes(), chunks())), {})


def test_a_row_deaf_to_signals_is_given_up_too() -> None:
    def stubborn(x: np.ndarray) -> None:
        if x[0] == 11.0:
            for number in (signal.SIGTERM, signal.SIGINT, signal.SIGHUP):
                signal.signal(number, signal.SIG_IGN)
            while True:
                pass

    with Pool(2, LIMIT_S) as pool:
        rows = by_row(pool.run(Cubes(stubborn), chunks()))
    assert_only(rows, {11: ("timed out", "no answer within 1 s")})


def test_a_program_that_a_late_row_started_ends_with_it(tmp_path) -> None:
    note = tmp_path / "pid"

    def start(x: np.ndarray) -> None:
        if x[0] == 0.0:
            program = subprocess.Popen(["sleep", "3600"])
            note.write_text(str(program.pid))
            program.wait()

    with Pool(1, LIMIT_S) as pool:
        list(pool.run(Cubes(start), chunks(1)))
    deadline = time.monotonic() + 10.0
    while _alive(int(note.read_text())) and time.monotonic() < deadline:
        time.sleep(0.05)
    assert not _alive(int(note.read_text()))


def test_a_row_that_kills_its_worker_is_blamed_alone() -> None:
    def die(x: np.ndarray) -> None:
        if x[0] == 13.0:
            os._exit(3)

    with Pool(2, LONGEST_S) as pool:
        rows = by_row(pool.run(Cubes(die), chunks()))
    assert_only(rows, {13: ("failed", "worker died")})


def test_a_row_that_exhausts_memory_becomes_a_failed_row() -> None:
    def eat(x: np.ndarray) -> None:
        if x[0] == 6.0:
            import resource

            resource.setrlimit(resource.RLIMIT_AS, (2_000_000_000, 2_000_000_000))
            bytearray(4_000_000_000)

    with Pool(1, LONGEST_S) as pool:
        rows = by_row(pool.run(Cubes(eat), chunks()))
    assert_only(rows, {6: ("failed", "MemoryError")})


def test_a_worker_killed_from_outside_costs_no_row() -> None:
    def slow(x: np.ndarray) -> None:
        time.sleep(0.05)

    with Pool(2, LONGEST_S) as pool:
        work = pool.run(Cubes(slow), chunks())
        done = [next(work)]
        worker = int(done[0].outcome.columns["worker"][0])
        threading.Timer(0.07, os.kill, [worker, signal.SIGKILL]).start()
        done += list(work)
    assert_only(by_row(done), {})


def test_the_rest_of_a_run_and_its_archive_do_not_depend_on_the_workers(tmp_path, rows_of) -> None:
    def hang(x: np.ndarray) -> None:
        if 400.0 <= x[0] <= 410.0:
            time.sleep(3600.0)

    settings = Settings(budget=100, seed=4)
    for workers in (1, 2):
        with Pool(workers, LIMIT_S) as pool:
            run(Cubes(hang), tmp_path / str(workers), settings, pool)
    one, two = (rows_of(tmp_path / name).drop_columns(["worker"]) for name in ("1", "2"))
    assert one.equals(two)
    status, x = one["status"].to_pylist(), one["x"].to_pylist()
    assert "timed out" in status  # the first generation has one design in each hundredth
    assert [word == "timed out" for word in status] == [400.0 <= value <= 410.0 for value in x]


def test_a_caller_that_ends_early_leaves_nobody_at_work() -> None:
    def hang(x: np.ndarray) -> None:
        if x[0] > 4.0:
            time.sleep(3600.0)

    with Pool(2, 3600.0) as pool:
        work = pool.run(Cubes(hang), chunks())
        next(work)
        crew = _pids(pool)
        work.close()  # also workers that have only just been started
        assert not any(_alive(pid) for pid in crew if pid not in _pids(pool))
        assert_only(by_row(pool.run(Cubes(), chunks())), {})
    assert not any(_alive(pid) for pid in crew)


def test_a_worker_can_be_killed_as_soon_as_it_is_started() -> None:
    with Pool(1, LONGEST_S) as pool:
        pool._crew.man()
        worker = pool._crew.children[0]
        worker.kill()
        assert worker.process.poll() == -signal.SIGKILL
        assert_only(by_row(pool.run(Cubes(), chunks())), {})


def test_arguments_out_of_range_are_refused() -> None:
    for workers, limit in ((0, 1.0), (1, 0.0), (1, -1.0), (1, float("nan")), (1, float("inf"))):
        with pytest.raises(ProblemError, match="is wanted"):
            Pool(workers, limit)


def _pids(pool: Pool) -> set[int]:
    return {worker.process.pid for worker in pool._crew.children}


def _alive(pid: int) -> bool:
    try:
        with open(f"/proc/{pid}/stat") as file:
            return file.read().rsplit(")", 1)[1].split()[0] != "Z"
    except FileNotFoundError:
        return False
