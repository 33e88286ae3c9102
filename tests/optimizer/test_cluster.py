"""Many machines give the archive of one; what dies, hangs or is lost costs no more than itself."""

from __future__ import annotations

import os
import signal
import sys
import threading
import time
from collections.abc import Iterator
from pathlib import Path

import cloudpickle
import numpy as np
import pytest
from clusters import LocalCluster

from optimizer.errors import ClusterError, ProblemError
from optimizer.problem import Column, Outcome, Variable
from optimizer.running.runner import run
from optimizer.settings import Settings
from optimizer.workers import cluster as room
from optimizer.workers.cluster import Cluster
from optimizer.workers.dispatch import Chunk, Serial
from optimizer.workers.errands import Errands

pytest.importorskip("distributed")
cloudpickle.register_pickle_by_value(sys.modules[__name__])

SETTINGS = Settings(budget=120, seed=4, population=60, chunk=10)
# A busy machine may take long to start a worker; what is shown is that nobody waits for an hour.
HOUR_S = 3600.0


class Ridge:
    """Two objectives that pull apart; ``trouble`` is called with each batch first.

    The last bits of the third column depend on the length of the batch, as those of array
    operations may.
    """

    variables = (Variable("x", -1.0, 3.0), Variable("y", -1.0, 1.0))
    objectives = ("near", "far")
    constraints = ()
    columns = (Column("process", kind="int64"), Column("worker", kind="int64"), Column("batch"))

    def __init__(self, trouble=None) -> None:
        self.trouble = trouble

    def evaluate(self, x: np.ndarray) -> Outcome:
        if self.trouble is not None:
            self.trouble(x)
        rest = x[:, 1] ** 2
        columns = {
            "process": np.full(len(x), os.getpid()),
            "worker": np.full(len(x), os.getppid()),
            "batch": x[:, 0] * (1.0 + len(x) * 2.0**-52),
        }
        objectives = np.column_stack([x[:, 0] ** 2 + rest, (x[:, 0] - 2.0) ** 2 + rest])
        return Outcome(objectives, np.zeros((len(x), 0)), columns=columns)


def chunks(count: int = 8, size: int = 5) -> list[Chunk]:
    x = np.column_stack([np.arange(float(count * size)), np.zeros(count * size)])
    return [Chunk(i * size, x[i * size : (i + 1) * size]) for i in range(count)]


def by_row(done) -> dict[int, tuple[float, str, str]]:
    """Objective, status and reason of each row."""
    return {
        one.start + i: (
            float(one.outcome.objectives[i, 0]),
            str(one.outcome.status[i]),
            str(one.outcome.reason[i]),
        )
        for one in done
        for i in range(len(one.outcome))
    }


def assert_only(rows, bad: dict[int, tuple[str, str]], count: int = 40) -> None:
    assert sorted(rows) == list(range(count))
    for number, (value, status, reason) in rows.items():
        assert (status, reason) == bad.get(number, ("ok", ""))
        assert np.isnan(value) if number in bad else value == float(number) ** 2


def slow(x: np.ndarray) -> None:
    time.sleep(0.01 * len(x))


@pytest.fixture(scope="module")
def machines(tmp_path_factory, python_path) -> Iterator[LocalCluster]:
    with LocalCluster(tmp_path_factory.mktemp("machines"), python_path) as made:
        yield made


@pytest.fixture(scope="module")
def python_path() -> dict[str, str]:
    return {**os.environ, "PYTHONPATH": str(Path(__file__).parents[2])}


@pytest.fixture
def cluster(machines) -> Iterator[Cluster]:
    with Cluster(machines.address) as made:
        yield made


@pytest.fixture
def same_rows(rows_of, tmp_path):
    """Whether an archive is that of one machine, but for who evaluated."""

    def same(folder: Path, problem: Ridge) -> bool:
        run(problem, tmp_path / "one", SETTINGS, Serial())
        here, there = (
            rows_of(place).drop_columns(["process", "worker"])
            for place in (tmp_path / "one", folder)
        )
        return bool(here.equals(there))

    return same


def test_a_worker_killed_in_the_middle_costs_no_row(cluster, same_rows, rows_of, tmp_path) -> None:
    killed: list[int] = []

    class Killing(Serial):
        """Kills a worker of the cluster in the middle of a chunk."""

        def run(self, problem, chunks):
            for done in cluster.run(problem, chunks):
                if not killed:
                    killed.append(int(done.outcome.columns["worker"][0]))
                    threading.Timer(0.1, os.kill, [killed[0], signal.SIGKILL]).start()
                yield done

    run(Ridge(slow), tmp_path / "many", SETTINGS, Killing())
    assert len(killed) == 1
    assert same_rows(tmp_path / "many", Ridge())
    table = rows_of(tmp_path / "many")
    assert set(table["worker"].to_pylist()) - set(killed)
    assert os.getpid() not in table["process"].to_pylist() + table["worker"].to_pylist()


def test_rows_that_die_or_raise_are_blamed_alone(cluster) -> None:
    def trouble(x: np.ndarray) -> None:
        if (x[:, 0] == 23.0).any():
            os._exit(3)
        if (x[:, 0] == 17.0).any():
            raise ArithmeticError("no such design")

    rows = by_row(cluster.run(Ridge(trouble), chunks()))
    bad = {17: ("failed", "ArithmeticError: no such design"), 23: ("failed", "worker died")}
    assert_only(rows, bad)


def test_a_row_that_hangs_is_given_up_alone(machines) -> None:
    def hang(x: np.ndarray) -> None:
        if x[0, 0] == 7.0:
            time.sleep(HOUR_S)

    with Cluster(machines.address, time_limit_s=1.0) as cluster:
        rows = by_row(cluster.run(Ridge(hang), chunks()))
    assert_only(rows, {7: ("timed out", "no answer within 1 s")})


def test_few_chunks_are_outstanding_and_the_rest_is_not_asked_for(cluster) -> None:
    taken, most = [], 0

    def lazily():
        for chunk in chunks(24, 1):
            taken.append(chunk.start)
            yield chunk

    for count, _ in enumerate(cluster.run(Ridge(slow), lazily())):
        most = max(most, len(taken) - count)
    assert len(taken) == 24
    # Two for each of the two workers; while one is being restarted there may be only one.
    assert 2 <= most <= cluster.window <= 2 * 2


def test_a_run_that_is_left_early_leaves_nothing_behind(cluster) -> None:
    work = cluster.run(Ridge(slow), chunks())
    next(work)
    work.close()
    deadline = time.monotonic() + 10.0
    while cluster._client.futures and time.monotonic() < deadline:
        time.sleep(0.02)
    assert not cluster._client.futures
    assert_only(by_row(cluster.run(Ridge(), chunks())), {})


def test_numerical_libraries_keep_to_one_thread(cluster) -> None:
    def look(x: np.ndarray) -> None:
        import scipy.linalg  # noqa: F401 -- brings a library of its own
        from threadpoolctl import threadpool_info

        threads = {info["num_threads"] for info in threadpool_info()}
        if threads != {1}:
            raise RuntimeError(str(threads))

    assert_only(by_row(cluster.run(Ridge(look), chunks(2))), {}, 10)


def test_an_answer_of_the_wrong_shape_is_an_error(cluster) -> None:
    class Wrong(Ridge):
        def evaluate(self, x: np.ndarray) -> Outcome:
            return super().evaluate(x[:-1])

    with pytest.raises(ProblemError, match=r"objectives of shape \(4, 2\); \(5, 2\)"):
        list(cluster.run(Wrong(), chunks()))


def test_other_versions_are_refused(machines, monkeypatch) -> None:
    before = room.installed_versions
    monkeypatch.setattr(
        room,
        "installed_versions",
        lambda names: tuple(
            (name, "0.1" if name == "scipy" else version) for name, version in before(names)
        ),
    )
    with (
        Cluster(machines.address) as cluster,
        pytest.raises(
            ClusterError, match=r"worker tcp://.* does not fit: scipy is .* and 0.1 here"
        ),
    ):
        list(cluster.run(Ridge(), chunks()))


@pytest.mark.parametrize(
    "address",
    ["tcp://127.0.0.1:1", "tls://127.0.0.1:1", "no-such-scheme://127.0.0.1:1", "a b", "/no/file"],
)
def test_a_wrong_address_is_one_sentence(address, monkeypatch) -> None:
    monkeypatch.setattr(room, "CONNECT_S", 0.5)
    with pytest.raises(ClusterError, match="no scheduler of a cluster answers at") as caught:
        Cluster(address)
    assert "\n" not in str(caught.value)


def test_without_the_extra_one_sentence_says_what_to_install(monkeypatch) -> None:
    monkeypatch.setitem(sys.modules, "distributed", None)
    with pytest.raises(ClusterError, match=r"pip install 'hovergap\[cluster\]'"):
        Cluster("tcp://127.0.0.1:1")


def test_a_limit_of_time_out_of_range_is_refused() -> None:
    with pytest.raises(ProblemError, match=r"time_limit_s is 0\.0"):
        Cluster("tcp://127.0.0.1:1", time_limit_s=0.0)


def test_only_what_is_alone_when_workers_die_is_to_blame() -> None:
    """The scheduler blames all that a dead worker had; here every worker dies of row 7."""
    errands = Errands(Ridge(), chunks(4))
    running, done, alone = [], [], 0
    while True:
        while len(running) < 3 and (errand := errands.next(len(running))):
            running.append(errand)
        if not running:
            break
        deadly = [errand for errand in running if 7.0 in errand.unit.chunk.x[:, 0]]
        # All that run die with it, or the first is finished.
        for errand in running if deadly else running[:1]:
            running = [item for item in running if item is not errand]
            errands.back(errand)
            alone += errand.suspect
            if deadly:
                finished = errands.killed(errand)
            else:
                outcome = Ridge().evaluate(errand.unit.chunk.x)
                finished = errand.unit.settle(room.Finished(errand.unit.chunk.start, outcome, 0, 0))
            done += [finished] if finished is not None else []
    assert_only(by_row(done), {7: ("failed", "worker died")}, 20)
    # Chunk 0 and 2 were there twice, and once more alone; chunk 1 alone twice, then its 5 rows
    # once, the guilty one twice.
    assert alone == 2 + 2 + 5 + 1


def test_a_lost_scheduler_is_an_error_and_the_run_goes_on_elsewhere(
    tmp_path, python_path, same_rows, rows_of
) -> None:
    folder = tmp_path / "many"
    (tmp_path / "machines").mkdir()
    with (
        LocalCluster(tmp_path / "machines", python_path, workers=1, nanny=False) as machines,
        Cluster(machines.address) as cluster,
    ):
        asked = []

        def stop() -> bool:
            """Asked before each chunk is started, of which two may be outstanding."""
            asked.append(time.monotonic())
            if len(asked) == 5:
                machines.scheduler.kill()
            return False

        with pytest.raises(ClusterError, match=r"the scheduler of the cluster tcp://.* is lost"):
            run(Ridge(slow), folder, SETTINGS, cluster, stop=stop)
    stored = rows_of(folder).num_rows
    assert 2 * SETTINGS.chunk <= stored < SETTINGS.budget
    summary = run(Ridge(), folder, SETTINGS, Serial())
    assert summary.new == SETTINGS.budget - stored
    assert same_rows(folder, Ridge())


@pytest.mark.slow
def test_a_row_that_kills_each_machine_is_blamed_alone(cluster) -> None:
    def kill(x: np.ndarray) -> None:
        if (x[:, 0] == 12.0).any():
            os.kill(os.getppid(), signal.SIGKILL)
            time.sleep(HOUR_S)

    rows = by_row(cluster.run(Ridge(kill), chunks()))
    assert_only(rows, {12: ("failed", "worker died")})


@pytest.mark.slow
def test_workers_come_and_go(tmp_path, python_path) -> None:
    with (
        LocalCluster(tmp_path, python_path, workers=1, nanny=False) as machines,
        Cluster(machines.address, patience_s=1.5) as cluster,
    ):
        seen: set[int] = set()
        windows = []
        for done in cluster.run(Ridge(slow), chunks(200, 5)):
            if not seen:
                machines.add_workers(1, nanny=False)
            seen |= set(done.outcome.columns["worker"].tolist())
            windows.append(cluster.window)
        assert len(seen) == 2
        assert max(windows) == 4
        for worker in seen:
            os.kill(worker, signal.SIGKILL)
        with pytest.raises(ClusterError, match=r"has had no worker for 1\.5 s"):
            list(cluster.run(Ridge(), chunks()))
