"""What workers bring and what their deaths cost; run with ``-m benchmark -s``.

Ratios within one run: other work on the machine counts in all of them.
"""

from __future__ import annotations

import os
import signal
import sys
import threading
import time
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import cloudpickle
import numpy as np
import pytest
from clusters import LocalCluster

from optimizer.problem import Column, Outcome, Problem, Variable
from optimizer.workers.cluster import Cluster
from optimizer.workers.dispatch import Chunk, Dispatcher, Serial, single_threaded
from optimizer.workers.pool import Pool
from studies.problem import MachineProblem, machine_problem
from studies.shipped.library import find_study

psutil = pytest.importorskip("psutil")
pytest.importorskip("distributed")
pytestmark = pytest.mark.benchmark
cloudpickle.register_pickle_by_value(sys.modules[__name__])

ROOT = Path(__file__).parents[2]
CHUNK = 25  # designs_per_call unless a study says otherwise
# Of the time of a call, for whoever takes part in it; a few percent are not worth larger calls.
LARGEST_OVERHEAD = 0.05


class Pause:
    """As wide as a machine study, and only waits."""

    variables = tuple(Variable(f"x{i}_mm", 0.0, 1.0) for i in range(13))
    objectives = ("a", "b", "c")
    constraints = tuple(f"limit_{i}" for i in range(10))
    columns = (*(Column(f"metric_{i}_W", "W") for i in range(60)), Column("of", kind="int64"))

    def __init__(self, pause_s: float) -> None:
        self.pause_s = pause_s

    def evaluate(self, x: np.ndarray) -> Outcome:
        time.sleep(self.pause_s * len(x))
        columns = {column.name: x[:, 0] for column in self.columns}
        columns["of"] = np.full(len(x), os.getpid())
        return Outcome(x[:, :3], x[:, 3:] - 0.5, columns=columns)


def chunks(problem: Problem, count: int, size: int = CHUNK) -> list[Chunk]:
    low = np.array([item.lower for item in problem.variables])
    high = np.array([item.upper for item in problem.variables])
    x = low + (high - low) * np.random.default_rng(1).random((count * size, len(low)))
    return [Chunk(i * size, x[i * size : (i + 1) * size]) for i in range(count)]


def seconds(dispatcher: Dispatcher, problem: Problem, work: list[Chunk]) -> float:
    """Of a run, after one that starts workers and loads the problem."""
    for _ in dispatcher.run(problem, work[: 2 * 2]):
        pass
    begin = time.perf_counter()
    assert sum(len(one.outcome) for one in dispatcher.run(problem, work)) == sum(
        len(chunk.x) for chunk in work
    )
    return time.perf_counter() - begin


@pytest.fixture(scope="module")
def clusters(tmp_path_factory: pytest.TempPathFactory) -> Iterator[dict[int, LocalCluster]]:
    """Of one and of two workers."""
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    folder = tmp_path_factory.mktemp
    with (
        LocalCluster(folder("one"), environment, workers=1) as one,
        LocalCluster(folder("two"), environment, workers=2) as two,
    ):
        yield {1: one, 2: two}


def analytic() -> MachineProblem:
    study = find_study("compressor")
    return machine_problem(study, study.families[0])


@pytest.mark.parametrize(
    ("name", "problem", "work"),
    [("analytic", analytic(), 24), ("waiting 50 ms", Pause(0.05), 8)],
    ids=["analytic", "waiting"],
)
def test_two_workers_against_one(
    clusters: dict[int, LocalCluster], name: str, problem: Problem, work: int
) -> None:
    todo = chunks(problem, work)
    with single_threaded():
        alone = seconds(Serial(), problem, todo)
    text = f"\n{name}: this process {alone:.2f} s ({os.getloadavg()[0]:.1f} at work)"
    speedups = {}
    for kind in ("pool", "cluster"):
        taken = {}
        for count in (1, 2):
            with Pool(count) if kind == "pool" else Cluster(clusters[count].address) as made:
                taken[count] = seconds(made, problem, todo)
        speedups[kind] = taken[1] / taken[2]
        text += f"; {kind} 1: {taken[1]:.2f} s, 2: {taken[2]:.2f} s, {speedups[kind]:.2f} times"
    print(text)
    if isinstance(problem, Pause):  # waiting takes no processor, so a busy machine matters little
        assert min(speedups.values()) > 1.6


def processor_ms(processes: list[Any]) -> float:
    """Processor time of processes so far."""
    return 1e3 * sum(sum(item.cpu_times()[:2]) for item in processes)


@pytest.mark.parametrize("kind", ["pool", "cluster"])
def test_overhead_at_ten_milliseconds(clusters: dict[int, LocalCluster], kind: str) -> None:
    pause, problem = 0.01, Pause(0.01)
    todo = chunks(problem, 80)
    with Pool(2) if kind == "pool" else Cluster(clusters[2].address) as made:
        of = {int(one.outcome.columns["of"][0]) for one in made.run(problem, todo[:16])}
        children = [psutil.Process(number) for number in of]
        groups = {"this process": [psutil.Process()], "evaluating": children}
        if kind == "cluster":
            groups["scheduler"] = [psutil.Process(clusters[2].scheduler.pid)]
            groups["workers"] = [child.parent() for child in children]
        used, taken = [], 0.0
        for work in (True, False):  # then idle for as long: workers have a heartbeat
            before = {name: processor_ms(group) for name, group in groups.items()}
            begin = time.perf_counter()
            if work:
                assert len(list(made.run(problem, todo))) == len(todo)
                taken = time.perf_counter() - begin
            else:
                time.sleep(taken)
            used.append(
                {name: processor_ms(group) - before[name] for name, group in groups.items()}
            )
        each = {name: (used[0][name] - used[1][name]) / len(todo) for name in groups}
    ideal = len(todo) * CHUNK * pause / 2
    print(
        f"\n{kind}: {CHUNK} x 10 ms a call, {taken:.2f} s for {ideal:.2f} s:"
        f" {100 * (taken / ideal - 1.0):.1f} % ({os.getloadavg()[0]:.1f} at work); processor time"
        f" of each call: {', '.join(f'{name} {value:.1f} ms' for name, value in each.items())}"
    )
    # Time by the clock grows with whatever else is at work; that of processors hardly does. This
    # process and the scheduler work beside the workers.
    most = LARGEST_OVERHEAD * CHUNK * pause * 1e3
    assert each.get("workers", 0.0) + each["evaluating"] < most
    assert each["this process"] < most
    assert each.get("scheduler", 0.0) < most


@pytest.mark.parametrize("kind", ["pool", "cluster"])
def test_time_lost_to_a_killed_worker(clusters: dict[int, LocalCluster], kind: str) -> None:
    problem = Pause(0.01)
    todo = chunks(problem, 40)
    with Pool(2) if kind == "pool" else Cluster(clusters[2].address) as made:
        whole = seconds(made, problem, todo)
        begin = time.perf_counter()
        rows, killed = 0, 0
        for one in made.run(problem, todo):
            rows += len(one.outcome)
            if not killed:
                killed = int(one.outcome.columns["of"][0])
                if kind == "cluster":  # the worker, not the process in which it evaluates
                    killed = int(Path(f"/proc/{killed}/stat").read_text().rsplit(")")[1].split()[1])
                threading.Timer(0.1, os.kill, [killed, signal.SIGKILL]).start()
        taken = time.perf_counter() - begin
    print(
        f"\n{kind}: {whole:.2f} s undisturbed, {taken:.2f} s with a worker killed:"
        f" {taken - whole:.2f} s lost ({os.getloadavg()[0]:.1f} at work)"
    )
    assert rows == len(todo) * CHUNK
    # On the worker that is left alone all of it would take twice as long.
    assert taken < 2.5 * whole
