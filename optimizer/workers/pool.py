"""Evaluating in worker processes of this machine."""

from __future__ import annotations

import math
import os
import shutil
import tempfile
from collections.abc import Iterable, Iterator, Sequence
from pathlib import Path

from optimizer.errors import ProblemError
from optimizer.problem import Problem
from optimizer.workers.crew import Crew
from optimizer.workers.dispatch import Chunk, Closing, Dispatcher, Finished


class Pool(Closing):
    """Evaluates chunks in worker processes; one pool serves many runs, one after the other.

    The workers are started afresh, not forked, so they inherit no state of this process. One that
    dies costs nobody but the chunk it had in hand: that is tried again, and if a worker dies of it
    again, row by row. A row of which workers die even then becomes a failed row with the reason
    ``"worker died"``.

    With a limit of time, designs are evaluated one by one even if the evaluator could take many at
    once: otherwise the last bits of a row would depend on whether a neighbour was late. A design
    that gives no answer in time becomes a row with the status ``"timed out"``; its worker is
    killed, with the programs it started, and replaced.

    Parameters
    ----------
    workers : int
        Processes, at least 1.
    time_limit_s : float, optional
        Seconds one evaluation may take, above 0. Starting a worker does not count.

    Raises
    ------
    ProblemError
        If an argument is out of range.
    """

    def __init__(self, workers: int, time_limit_s: float | None = None) -> None:
        if workers < 1:
            msg = f"workers is {workers}; at least 1 is wanted"
            raise ProblemError(msg)
        self.workers, self.time_limit_s = workers, checked_limit(time_limit_s)
        self._crew = Crew(workers)
        self._folder = Path(tempfile.mkdtemp(prefix="optimizer-"))
        self._sent: tuple[Problem, Path] | None = None
        self._lanes: list[Pool] = []

    def run(self, problem: Problem, chunks: Iterable[Chunk]) -> Iterator[Finished]:
        """Evaluate every chunk; see :class:`optimizer.workers.dispatch.Dispatcher`."""
        return self._crew.run(problem, self._send(problem), chunks, self.time_limit_s)

    def lanes(self, most: int) -> Sequence[Dispatcher]:
        """Pools with the workers of this one shared out among up to ``most``; closed with it.

        This pool starts no workers of its own unless it is run too.
        """
        count = min(most, self.workers)
        if count <= 1:
            return [self]
        each, over = divmod(self.workers, count)
        made = [Pool(each + (k < over), self.time_limit_s) for k in range(count)]
        self._lanes += made
        return made

    def give_up(self) -> None:
        """End the workers at once, from any thread; the run that waits for them raises."""
        self._crew.give_up()

    def close(self) -> None:
        """End the workers and remove what was stored for them."""
        for lane in self._lanes:
            lane.close()
        self._crew.close()
        self._sent = None
        shutil.rmtree(self._folder, ignore_errors=True)

    def _send(self, problem: Problem) -> Path:
        """Store the problem where each worker reads it once."""
        if self._sent is None or self._sent[0] is not problem:
            self._sent = (problem, store_problem(pickled(problem), self._folder))
        return self._sent[1]


def checked_limit(time_limit_s: float | None) -> float | None:
    """Return a limit of time that makes sense.

    Raises
    ------
    ProblemError
        If it is not above 0.
    """
    if time_limit_s is None or (math.isfinite(time_limit_s) and time_limit_s > 0.0):
        return time_limit_s
    msg = f"time_limit_s is {time_limit_s}; a number of seconds above 0 is wanted"
    raise ProblemError(msg)


def pickled(problem: Problem) -> bytes:
    """Return a problem as it travels to worker processes.

    Raises
    ------
    ProblemError
        If it cannot be pickled.
    """
    from cloudpickle import dumps

    try:
        data: bytes = dumps(problem)
    except Exception as error:  # pickling calls code of the problem, which raises anything
        msg = f"the problem cannot be sent to worker processes: {error}"
        raise ProblemError(msg) from error
    return data


def store_problem(data: bytes, folder: Path) -> Path:
    """Store a pickled problem in a private folder, where worker processes read it."""
    handle, name = tempfile.mkstemp(dir=folder, suffix=".problem")
    with os.fdopen(handle, "wb") as file:
        file.write(data)
    return Path(name)
