"""Evaluations that raise, hang on to signals or kill their worker become rows, not crashes."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import textwrap
import threading
import time

import cloudpickle
import numpy as np
import pytest

from optimizer.errors import ProblemError
from optimizer.problem import Column, Outcome, Variable
from optimizer.workers.dispatch import Chunk, Serial, evaluate_chunk, single_threaded
from optimizer.workers.pool import Pool

cloudpickle.register_pickle_by_value(sys.modules[__name__])


class Squares:
    """x squared; ``trouble`` is called with each batch first."""

    variables = (Variable("x", 0.0, 1000.0),)
    objectives = ("square",)
    constraints = ()
    columns = (Column("worker", kind="int64"), Column("batch", kind="int64"))

    def __init__(self, trouble=None) -> None:
        self.trouble = trouble

    def evaluate(self, x: np.ndarray) -> Outcome:
        if self.trouble is not None:
            self.trouble(x[:, 0])
        workers = np.full(len(x), os.getpid())
        columns = {"worker": workers, "batch": np.full(len(x), len(x))}
        return Outcome(x**2, np.zeros((len(x), 0)), columns=columns)


def chunks(count: int = 8, size: int = 5) -> list[Chunk]:
    x = np.arange(float(count * size))[:, None]
    return [Chunk(i * size, x[i * size : (i + 1) * size]) for i in range(count)]


def gathered(done) -> tuple[list[float], list[str]]:
    """Objectives and reasons in order of the rows."""
    done = sorted(done, key=lambda one: one.start)
    squares = np.concatenate([one.outcome.objectives[:, 0] for one in done])
    return squares.tolist(), [text for one in done for text in one.outcome.reason.tolist()]


@pytest.fixture(scope="module")
def pool():
    with Pool(2) as made:
        yield made


@pytest.fixture(scope="module")
def watched():
    with Pool(2, 30.0) as made:
        yield made


@pytest.fixture(params=["serial", "pool", "watched"])
def dispatcher(request):
    return Serial() if request.param == "serial" else request.getfixturevalue(request.param)


def refuse_17(x: np.ndarray) -> None:
    if (x == 17.0).any():
        msg = "no  such\ndesign"
        raise ArithmeticError(msg)


def test_an_exception_costs_only_the_row_that_raises_it(dispatcher) -> None:
    squares, reasons = gathered(dispatcher.run(Squares(refuse_17), chunks()))
    assert reasons[17] == "ArithmeticError: no such design"
    assert np.isnan(squares[17])
    others = [i for i in range(40) if i != 17]
    assert [squares[i] for i in others] == [float(i * i) for i in others]
    assert not any(reasons[i] for i in others)


def test_an_answer_of_the_wrong_shape_is_an_error(dispatcher) -> None:
    class Wrong(Squares):
        def evaluate(self, x: np.ndarray) -> Outcome:
            return super().evaluate(x[:-1])

    with pytest.raises(ProblemError, match=r"objectives of shape \((4|0), 1\); \((5|1), 1\)"):
        list(dispatcher.run(Wrong(), chunks()))


def test_an_evaluation_that_writes_into_its_argument_does_no_harm(dispatcher) -> None:
    def scribble(x: np.ndarray) -> None:
        x[:] = -1.0

    made = chunks(1)
    list(dispatcher.run(Squares(scribble), made))
    assert made[0].x[:, 0].tolist() == [0.0, 1.0, 2.0, 3.0, 4.0]


def test_chunks_are_taken_only_when_they_can_start_soon(pool) -> None:
    taken = []

    def lazily():
        for chunk in chunks():
            taken.append(chunk.start)
            yield chunk

    run = pool.run(Squares(), lazily())
    next(run)
    assert len(taken) <= 2 * 2  # two for each worker: the next is there when one is done
    assert len(list(run)) == 7


def test_one_pool_serves_several_problems_and_both_workers_work(pool) -> None:
    def slow(x: np.ndarray) -> None:
        time.sleep(0.02)

    done = list(pool.run(Squares(slow), chunks()))
    workers = {int(one.outcome.columns["worker"][0]) for one in done}
    assert len(workers) == 2
    assert os.getpid() not in workers
    assert gathered(pool.run(Squares(refuse_17), chunks()))[1][17]
    assert not any(gathered(pool.run(Squares(), chunks()))[1])


def die_of_23(x: np.ndarray) -> None:
    if (x == 23.0).any():
        os._exit(3)


def test_a_row_that_kills_its_worker_is_blamed_alone(pool) -> None:
    squares, reasons = gathered(pool.run(Squares(die_of_23), chunks()))
    assert [i for i, reason in enumerate(reasons) if reason] == [23]
    assert reasons[23] == "worker died"
    assert [squares[i] for i in range(40) if i != 23] == [
        float(i * i) for i in range(40) if i != 23
    ]


def test_a_worker_killed_from_outside_costs_no_row(pool) -> None:
    def slow(x: np.ndarray) -> None:
        time.sleep(0.05)

    killed = []

    def kill(pid: int) -> None:
        os.kill(pid, signal.SIGKILL)
        killed.append(pid)

    run = pool.run(Squares(slow), chunks(20))
    done = [next(run)]
    # In the middle of the next batch.
    threading.Timer(0.07, kill, [int(done[0].outcome.columns["worker"][0])]).start()
    done += list(run)
    assert len(killed) == 1
    squares, reasons = gathered(done)
    assert squares == [float(i * i) for i in range(100)]
    assert not any(reasons)
    # Each chunk as a whole, lest the last bits depend on when someone was killed.
    assert all((one.outcome.columns["batch"] == 5).all() for one in done)


def test_a_pool_that_was_idle_when_its_worker_died_goes_on(pool) -> None:
    done = list(pool.run(Squares(), chunks(2)))
    os.kill(int(done[0].outcome.columns["worker"][0]), signal.SIGKILL)
    assert not any(gathered(pool.run(Squares(), chunks()))[1])


def test_workers_are_deaf_to_ctrl_c(pool) -> None:
    def interrupt(x: np.ndarray) -> None:
        os.kill(os.getpid(), signal.SIGINT)

    assert not any(gathered(pool.run(Squares(interrupt), chunks(2)))[1])


def test_numerical_libraries_keep_to_one_thread(dispatcher) -> None:
    def look(x: np.ndarray) -> None:
        import scipy.linalg  # noqa: F401 -- brings a library of its own, loaded only now
        from threadpoolctl import threadpool_info

        threads = {(info["internal_api"], info["num_threads"]) for info in threadpool_info()}
        # Of the test run's own process, libraries loaded before are limited by the runner too.
        if not threads or {count for _, count in threads} != {1}:
            raise RuntimeError(str(threads))

    with single_threaded():
        assert not any(gathered(dispatcher.run(Squares(look), chunks(2)))[1])


def test_thread_variables_are_put_back() -> None:
    before = dict(os.environ)
    with single_threaded():
        assert os.environ["OPENBLAS_NUM_THREADS"] == "1"
    assert dict(os.environ) == before


def test_a_problem_that_cannot_be_sent_or_rebuilt_is_an_error(pool) -> None:
    class Stubborn(Squares):
        def __init__(self) -> None:
            self.lock = threading.Lock()

    with pytest.raises(ProblemError, match="cannot be sent to worker processes"):
        list(pool.run(Stubborn(), chunks()))

    class Fragile(Squares):
        def __reduce__(self):
            return int, ("not a number",)

    with pytest.raises(ProblemError, match="cannot be rebuilt in a worker process"):
        list(pool.run(Fragile(), chunks()))
    with pytest.raises(ProblemError, match="workers is 0"):
        Pool(0)


def test_time_is_that_of_the_evaluation() -> None:
    begin = time.time_ns() // 1000
    done = evaluate_chunk(Squares(lambda x: time.sleep(0.05)), chunks(1)[0])
    assert 0.05 <= done.seconds < 1.0  # a loaded machine may be late, not early
    assert begin + 50_000 <= done.finished_at <= time.time_ns() // 1000


def test_workers_end_when_their_parent_is_killed(tmp_path, python_path) -> None:
    script = tmp_path / "parent.py"
    script.write_text(
        textwrap.dedent(
            """
            import os, time
            import numpy as np
            from optimizer.workers.dispatch import Chunk
            from optimizer.workers.pool import Pool
            from optimizer.problem import Column, Outcome, Variable

            class Pid:
                variables = (Variable("x", 0.0, 1.0),)
                objectives = ("x",)
                constraints = ()
                columns = (Column("worker"),)
                def evaluate(self, x):
                    time.sleep(0.05)
                    return Outcome(x, np.zeros((len(x), 0)),
                                   columns={"worker": np.full(len(x), float(os.getpid()))})

            if __name__ == "__main__":
                pool = Pool(2)
                chunks = [Chunk(i, np.ones((1, 1))) for i in range(6)]
                done = list(pool.run(Pid(), chunks))
                print(*{int(one.outcome.columns["worker"][0]) for one in done}, flush=True)
                time.sleep(60)
            """
        )
    )
    with subprocess.Popen(
        [sys.executable, str(script)], stdout=subprocess.PIPE, env=python_path
    ) as parent:
        assert parent.stdout is not None
        workers = [int(word) for word in parent.stdout.readline().split()]
        parent.kill()
    deadline = time.monotonic() + 10.0
    while any(_alive(pid) for pid in workers) and time.monotonic() < deadline:
        time.sleep(0.1)
    assert workers
    assert not any(_alive(pid) for pid in workers)


def _alive(pid: int) -> bool:
    try:
        with open(f"/proc/{pid}/stat") as file:
            return file.read().rsplit(")", 1)[1].split()[0] != "Z"
    except FileNotFoundError:
        return False
