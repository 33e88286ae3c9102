"""Worker processes that are killed when one evaluation takes too long."""

from __future__ import annotations

import contextlib
import math
import os
import shutil
import signal
import tempfile
import time
from collections import deque
from collections.abc import Iterable, Iterator
from dataclasses import dataclass, field
from multiprocessing.connection import wait
from pathlib import Path
from types import TracebackType
from typing import Any, Self

from optimizer.errors import ProblemError
from optimizer.problem import FAILED, Problem, failed_outcome, join_outcomes
from optimizer.workers.dispatch import THREAD_VARIABLES, Chunk, Finished
from optimizer.workers.pool import ROW_TRIES, WORKER_DIED, send_problem
from optimizer.workers.worker import READY, serve_rows

TIMED_OUT = "timed out"
_GRACE_S = 5.0  # for a worker to end by itself when nothing is left to do


class WatchedPool:
    """Evaluates designs one by one in worker processes, each within a limit of time.

    An evaluation that gives no answer in time becomes a row with the status ``"timed out"``; its
    worker is killed, with the programs it started, and replaced. A worker that dies by itself
    costs the row it had in hand, which is tried once more and then becomes a failed row with the
    reason ``"worker died"``. No other row is touched by either.

    Designs are evaluated one by one even if the evaluator could take many at once: otherwise the
    last bits of a row would depend on whether a neighbour was late.

    Parameters
    ----------
    workers : int
        Processes, at least 1.
    time_limit_s : float
        Seconds one evaluation may take, above 0. Starting a worker does not count.

    Raises
    ------
    ProblemError
        If an argument is out of range.
    """

    def __init__(self, workers: int, time_limit_s: float) -> None:
        if workers < 1:
            msg = f"workers is {workers}; at least 1 is wanted"
            raise ProblemError(msg)
        if not (math.isfinite(time_limit_s) and time_limit_s > 0.0):
            msg = f"time_limit_s is {time_limit_s}; a number of seconds above 0 is wanted"
            raise ProblemError(msg)
        self.workers, self.time_limit_s = workers, time_limit_s
        self._folder = Path(tempfile.mkdtemp(prefix="optimizer-"))
        self._sent: tuple[Problem, Path] | None = None
        self._crew: list[_Worker] = []

    def run(self, problem: Problem, chunks: Iterable[Chunk]) -> Iterator[Finished]:
        """Evaluate every chunk; see :class:`optimizer.workers.dispatch.Dispatcher`."""
        self._take(problem)
        waiting = iter(chunks)
        queue: deque[_Row] = deque()
        more = True
        try:
            while True:
                for worker in self._crew:
                    while more and worker.row is None and not queue:
                        chunk = next(waiting, None)
                        more = chunk is not None
                        if chunk is not None:
                            begun = _Begun(chunk)
                            queue.extend(_Row(begun, i) for i in range(len(chunk.x)))
                    if worker.row is None and queue:
                        worker.give(queue.popleft())
                busy = [worker for worker in self._crew if worker.row is not None]
                if not busy:
                    return
                self._listen(busy)
                for worker in busy:
                    row = self._outcome(problem, worker, queue)
                    if row is not None and row.begun.complete:
                        yield row.begun.finished()
        finally:
            # A caller that ends early leaves workers with rows nobody waits for.
            for worker in [worker for worker in self._crew if worker.row is not None]:
                worker.kill()
                self._crew.remove(worker)

    def close(self) -> None:
        """End the workers and remove what was stored for them."""
        for worker in self._crew:
            worker.end()
        self._crew.clear()
        self._sent = None
        shutil.rmtree(self._folder, ignore_errors=True)

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        traceback: TracebackType | None,
    ) -> None:
        self.close()

    def _take(self, problem: Problem) -> None:
        """Have a full crew that knows the problem."""
        if self._sent is None or self._sent[0] is not problem:
            for worker in self._crew:
                worker.end()
            self._crew.clear()
            self._sent = (problem, send_problem(problem, self._folder))
        for worker in [worker for worker in self._crew if not worker.process.is_alive()]:
            worker.kill()
            self._crew.remove(worker)
        while len(self._crew) < self.workers:
            self._crew.append(_Worker(self._sent[1]))

    def _listen(self, busy: list[_Worker]) -> None:
        """Wait until a worker answers, dies or is late."""
        late = [worker.since + self.time_limit_s for worker in busy if worker.ready]
        left = max(min(late) - time.monotonic(), 0.0) if late else None
        wait([worker.pipe for worker in busy], left)

    def _outcome(self, problem: Problem, worker: _Worker, queue: deque[_Row]) -> _Row | None:
        """Return the worker's row if it is settled."""
        row = worker.row
        if row is None:
            return None
        try:
            answer = worker.pipe.recv() if worker.pipe.poll() else None
        except (EOFError, OSError):
            self._replace(worker)
            row.tries += 1
            if row.tries < ROW_TRIES:
                queue.appendleft(row)
                return None
            row.settle(_blank(problem, WORKER_DIED, FAILED, 0.0))
            return row
        if isinstance(answer, ProblemError):
            raise answer
        if isinstance(answer, Finished):
            worker.row = None
            row.settle(answer)
            return row
        if answer == READY:
            worker.begin()
        elif worker.ready and time.monotonic() - worker.since >= self.time_limit_s:
            self._replace(worker)
            reason = f"no answer within {self.time_limit_s:g} s"
            row.settle(_blank(problem, reason, TIMED_OUT, self.time_limit_s))
            return row
        return None

    def _replace(self, worker: _Worker) -> None:
        worker.kill()
        if self._sent is not None:
            self._crew[self._crew.index(worker)] = _Worker(self._sent[1])


@dataclass(eq=False)
class _Begun:
    """A chunk while its rows come in."""

    chunk: Chunk
    rows: dict[int, Finished] = field(default_factory=dict)

    @property
    def complete(self) -> bool:
        return len(self.rows) == len(self.chunk.x)

    def finished(self) -> Finished:
        rows = [self.rows[i] for i in range(len(self.chunk.x))]
        return Finished(
            self.chunk.start,
            join_outcomes([row.outcome for row in rows]),
            sum(row.seconds for row in rows),
            max(row.finished_at for row in rows),
        )


@dataclass(eq=False)
class _Row:
    """One design of a chunk."""

    begun: _Begun
    place: int
    tries: int = 0

    @property
    def chunk(self) -> Chunk:
        """The design as a chunk of its own."""
        whole = self.begun.chunk
        return Chunk(whole.start + self.place, whole.x[self.place : self.place + 1])

    def settle(self, finished: Finished) -> None:
        self.begun.rows[self.place] = finished


class _Worker:
    """One process that evaluates one row after the other."""

    def __init__(self, problem: Path) -> None:
        from joblib.externals.loky.backend import get_context

        # Started afresh, not forked, and without running the main program again.
        context = get_context("loky")
        self.pipe, theirs = context.Pipe()
        self.process: Any = context.Process(
            target=serve_rows,
            args=(theirs, os.getpid(), str(problem)),
            env=dict.fromkeys(THREAD_VARIABLES, "1"),
            daemon=True,
        )
        self.process.start()
        theirs.close()  # or its end would stay open here when the worker dies
        self.ready = False
        self.row: _Row | None = None
        self.since = 0.0

    def give(self, row: _Row) -> None:
        """Hand over a row; one that starts at once is timed from now on."""
        self.row, self.since = row, time.monotonic()
        with contextlib.suppress(OSError):  # it has died, which is seen when its answer is read
            self.pipe.send(row.chunk)

    def begin(self) -> None:
        """Time the row in hand from now on: the problem has been loaded."""
        self.ready, self.since = True, time.monotonic()

    def kill(self) -> None:
        """End it and what it started, whatever they are doing."""
        if hasattr(os, "killpg"):
            with contextlib.suppress(ProcessLookupError):  # has no group yet
                os.killpg(self.process.pid, signal.SIGKILL)
            with contextlib.suppress(ProcessLookupError):
                os.kill(self.process.pid, signal.SIGKILL)
        else:
            self.process.terminate()
        self.process.join()
        self.pipe.close()

    def end(self) -> None:
        """Let it end by itself."""
        self.pipe.close()
        self.process.join(_GRACE_S)
        if self.process.is_alive():
            self.kill()


def _blank(problem: Problem, reason: str, status: str, seconds: float) -> Finished:
    outcome = failed_outcome(problem, 1, reason, status)
    return Finished(0, outcome, seconds, time.time_ns() // 1000)
