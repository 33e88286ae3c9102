"""Worker processes that may die without ending a study."""

from __future__ import annotations

import os
import shutil
import tempfile
import time
from collections import deque
from collections.abc import Iterable, Iterator
from concurrent.futures import FIRST_COMPLETED, Future, wait
from concurrent.futures.process import BrokenProcessPool
from pathlib import Path
from types import TracebackType
from typing import Any, Self

from optimizer.errors import ProblemError
from optimizer.problem import Outcome, Problem, failed_outcome, join_outcomes
from optimizer.workers.dispatch import THREAD_VARIABLES, Chunk, Finished
from optimizer.workers.worker import evaluate_in_worker, start_worker

WORKER_DIED = "worker died"
ROW_TRIES = 2  # a row whose worker dies that often while it runs alone is to blame


class Pool:
    """Evaluates chunks in worker processes; one pool serves many runs.

    The workers are loky processes: started afresh, not forked, so they inherit no state of
    this one. If one dies, all chunks in flight are lost with it; each is run again alone, and
    if a worker dies over a chunk again, its rows one by one. A row that takes its worker along
    even then becomes a failed row with the reason ``"worker died"``.

    Parameters
    ----------
    workers : int
        Processes, at least 1.

    Raises
    ------
    ProblemError
        If ``workers`` is below 1.
    """

    def __init__(self, workers: int) -> None:
        if workers < 1:
            msg = f"workers is {workers}; at least 1 is wanted"
            raise ProblemError(msg)
        self.workers = workers
        self._executor: Any = None
        self._folder = Path(tempfile.mkdtemp(prefix="optimizer-"))
        self._sent: tuple[Problem, Path] | None = None

    def run(self, problem: Problem, chunks: Iterable[Chunk]) -> Iterator[Finished]:
        """Evaluate every chunk; see :class:`optimizer.workers.dispatch.Dispatcher`."""
        path = self._send(problem)
        waiting = iter(chunks)
        running: dict[Future[Finished], Chunk] = {}
        suspects: deque[Chunk] = deque()
        more = True
        while more or running or suspects:
            if suspects:  # nothing else runs now
                yield self._alone(problem, path, suspects.popleft())
                continue
            while more and len(running) < 2 * self.workers:
                chunk = next(waiting, None)
                more = chunk is not None
                if chunk is not None:
                    running[self._submit(path, chunk)] = chunk
            if not running:
                continue
            done, _ = wait(running, return_when=FIRST_COMPLETED)
            for future in sorted(done, key=lambda f: running[f].start):
                chunk = running.pop(future)
                try:
                    finished = future.result()
                except BrokenProcessPool:
                    suspects.append(chunk)
                else:
                    yield finished
            if suspects:
                # The others in flight have failed too, or were finished just before.
                for future, chunk in running.items():
                    try:
                        finished = future.result()
                    except BrokenProcessPool:
                        suspects.append(chunk)
                    else:
                        yield finished
                running.clear()
                self._drop()

    def close(self) -> None:
        """End the workers and remove what was stored for them."""
        self._drop()
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

    def _send(self, problem: Problem) -> Path:
        """Store the problem where each worker reads it once."""
        if self._sent is not None and self._sent[0] is problem:
            return self._sent[1]
        self._sent = (problem, send_problem(problem, self._folder))
        return self._sent[1]

    def _submit(self, path: Path, chunk: Chunk) -> Future[Finished]:
        try:
            return self._start().submit(evaluate_in_worker, str(path), chunk)  # type: ignore[no-any-return]
        except BrokenProcessPool as error:  # broke since the last result was read
            future: Future[Finished] = Future()
            future.set_exception(error)
            return future

    def _start(self) -> Any:
        if self._executor is None:
            from joblib.externals.loky.process_executor import ProcessPoolExecutor

            self._executor = ProcessPoolExecutor(
                max_workers=self.workers,
                initializer=start_worker,
                initargs=(os.getpid(),),
                env=dict.fromkeys(THREAD_VARIABLES, "1"),
            )
        return self._executor

    def _drop(self) -> None:
        if self._executor is not None:
            self._executor.shutdown(wait=True, kill_workers=True)
            self._executor = None

    def _alone(self, problem: Problem, path: Path, chunk: Chunk) -> Finished:
        """Run a chunk with nothing beside it; if its worker dies, run each row so."""
        finished = self._attempt(path, chunk)
        if finished is not None:
            return finished
        rows = [Chunk(chunk.start + i, chunk.x[i : i + 1]) for i in range(len(chunk.x))]
        done = [self._row(problem, path, row) for row in rows]
        outcomes: list[Outcome] = [one.outcome for one in done]
        return Finished(
            chunk.start,
            join_outcomes(outcomes),
            sum(one.seconds for one in done),
            done[-1].finished_at,
        )

    def _row(self, problem: Problem, path: Path, row: Chunk) -> Finished:
        for _ in range(ROW_TRIES):
            finished = self._attempt(path, row)
            if finished is not None:
                return finished
        blank = failed_outcome(problem, 1, WORKER_DIED)
        return Finished(row.start, blank, 0.0, time.time_ns() // 1000)

    def _attempt(self, path: Path, chunk: Chunk) -> Finished | None:
        try:
            return self._submit(path, chunk).result()
        except BrokenProcessPool:
            self._drop()
            return None


def send_problem(problem: Problem, folder: Path) -> Path:
    """Store a problem in a private folder, where worker processes read it.

    Raises
    ------
    ProblemError
        If it cannot be pickled.
    """
    from cloudpickle import dumps

    try:
        data = dumps(problem)
    except Exception as error:  # pickling calls code of the problem, which raises anything
        msg = f"the problem cannot be sent to worker processes: {error}"
        raise ProblemError(msg) from error
    handle, name = tempfile.mkstemp(dir=folder, suffix=".problem")
    with os.fdopen(handle, "wb") as file:
        file.write(data)
    return Path(name)
