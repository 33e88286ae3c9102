"""Evaluating chunks of designs: here in this process, in worker processes in ``pool``, on other
machines in ``cluster``.

Whatever evaluates, a chunk is the same rows in one call, so that results do not depend on how
many workers there are, and numerical libraries keep to one thread for the same reason.
"""

from __future__ import annotations

import contextlib
import os
import time
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from typing import Protocol, Self, cast

from threadpoolctl import threadpool_limits

from optimizer.errors import ProblemError
from optimizer.problem import (
    FloatArray,
    Outcome,
    Problem,
    check_outcome,
    failed_outcome,
    join_outcomes,
)

THREAD_VARIABLES = (
    "OMP_NUM_THREADS",
    "OPENBLAS_NUM_THREADS",
    "MKL_NUM_THREADS",
    "BLIS_NUM_THREADS",
    "NUMEXPR_NUM_THREADS",
    "VECLIB_MAXIMUM_THREADS",
)
_LONGEST_REASON = 500  # characters


@dataclass(frozen=True)
class Chunk:
    """Designs ``x`` (n, v) to be evaluated by one call; ``start`` is the first one's number."""

    start: int
    x: FloatArray


@dataclass(frozen=True)
class Finished:
    """A chunk that was evaluated: its outcome, the seconds it took, and when (UTC, µs)."""

    start: int
    outcome: Outcome
    seconds: float
    finished_at: int


class Dispatcher(Protocol):
    """Evaluates chunks; the order of what it yields is its own."""

    def run(self, problem: Problem, chunks: Iterable[Chunk]) -> Iterator[Finished]:
        """Evaluate every chunk.

        ``chunks`` is asked for the next one only when it can be started soon, so a caller ends
        early by letting it run dry; what was started is still finished and yielded.

        Raises
        ------
        ProblemError
            If ``evaluate`` returns something other than the problem declares. Any other
            exception of an evaluation becomes a failed row.
        """

    def lanes(self, most: int) -> Sequence[Dispatcher]:
        """What evaluates here, shared out for up to ``most`` runs in threads of their own."""

    def give_up(self) -> None:
        """End what is in hand at once, from any thread; the run that waits for it may raise."""

    def close(self) -> None:
        """Let go of whatever is held."""

    def __enter__(self) -> Self:
        """Return itself."""

    def __exit__(self, *raised: object) -> None:
        """Close."""


class Closing:
    """What is closed at the end of a ``with`` block, and serves one run at a time."""

    def lanes(self, most: int) -> Sequence[Dispatcher]:
        """Itself alone."""
        del most
        return [cast("Dispatcher", self)]

    def give_up(self) -> None:
        """Do nothing where what is in hand ends by itself."""

    def close(self) -> None:
        """Do nothing where there is nothing to let go of."""

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *raised: object) -> None:
        self.close()


class Serial(Closing):
    """Evaluates in this process, one chunk after the other."""

    def run(self, problem: Problem, chunks: Iterable[Chunk]) -> Iterator[Finished]:
        """Evaluate every chunk; see :class:`Dispatcher`."""
        for chunk in chunks:
            yield evaluate_chunk(problem, chunk)


def evaluate_chunk(problem: Problem, chunk: Chunk) -> Finished:
    """Evaluate a chunk; an exception costs only the rows that raise it.

    Raises
    ------
    ProblemError
        If ``evaluate`` returns something other than the problem declares.
    """
    begin = time.perf_counter()
    outcome = _evaluate(problem, chunk.x)
    return Finished(chunk.start, outcome, time.perf_counter() - begin, time.time_ns() // 1000)


@contextlib.contextmanager
def single_threaded() -> Iterator[None]:
    """Keep numerical libraries to one thread: loaded ones, and those loaded meanwhile."""
    before = {name: os.environ.get(name) for name in THREAD_VARIABLES}
    os.environ.update(dict.fromkeys(THREAD_VARIABLES, "1"))
    try:
        with threadpool_limits(1):
            yield
    finally:
        for name, value in before.items():
            if value is None:
                os.environ.pop(name, None)
            else:
                os.environ[name] = value


def _evaluate(problem: Problem, x: FloatArray) -> Outcome:
    try:
        # A copy, so that an evaluation that writes into its argument does no harm.
        return check_outcome(problem, len(x), problem.evaluate(x.copy()))
    except ProblemError:
        raise
    except Exception as error:  # whatever a user's evaluation raises must not end the study
        if len(x) == 1:
            text = f"{type(error).__name__}: {error}".rstrip(": ")
            return failed_outcome(problem, 1, " ".join(text.split())[:_LONGEST_REASON])
    middle = len(x) // 2
    return join_outcomes([_evaluate(problem, x[:middle]), _evaluate(problem, x[middle:])])
