"""Chunks that may have to be taken apart: what a worker gets at once, and what became of it."""

from __future__ import annotations

import time
from dataclasses import dataclass, field

from optimizer.problem import FAILED, Described, failed_outcome, join_outcomes
from optimizer.workers.dispatch import Chunk, Finished

WORKER_DIED = "worker died"
TIMED_OUT = "timed out"
TRIES = 2  # what a worker died of that often is taken apart or to blame


@dataclass(eq=False)
class Unit:
    """Some rows of a chunk, evaluated by one call.

    Parameters
    ----------
    whole : Chunk
    first, count : int
        Rows of the chunk.
    parts : dict of int to Finished
        What is known of the chunk, by first row; shared by all its units.
    tries : int
        How often a worker died of it.
    """

    whole: Chunk
    first: int
    count: int
    parts: dict[int, Finished] = field(default_factory=dict)
    tries: int = 0

    @property
    def chunk(self) -> Chunk:
        """The rows as a chunk of their own."""
        rows = slice(self.first, self.first + self.count)
        return Chunk(self.whole.start + self.first, self.whole.x[rows])

    def rows(self) -> list[Unit]:
        """One unit for each row."""
        places = range(self.first, self.first + self.count)
        return [Unit(self.whole, place, 1, self.parts) for place in places]

    def settle(self, finished: Finished) -> Finished | None:
        """Enter what became of it; returns the chunk once all of it is known."""
        self.parts[self.first] = finished
        parts = [self.parts[first] for first in sorted(self.parts)]
        if sum(len(part.outcome) for part in parts) < len(self.whole.x):
            return None
        return Finished(
            self.whole.start,
            join_outcomes([part.outcome for part in parts]),
            sum(part.seconds for part in parts),
            max(part.finished_at for part in parts),
        )

    def died(self, problem: Described) -> list[Unit] | Finished | None:
        """Count that a worker died of it.

        Returns
        -------
        list of Unit
            What to try next: the same once more, then its rows one by one.
        Finished or None
            As of :meth:`settle`, if it is one row and to blame.
        """
        self.tries += 1
        if self.tries < TRIES:
            return [self]
        if self.count > 1:
            return self.rows()
        return self.settle(blank(problem, WORKER_DIED))


def blank(problem: Described, reason: str, status: str = FAILED, seconds: float = 0.0) -> Finished:
    """A row that came to nothing."""
    outcome = failed_outcome(problem, 1, reason, status)
    return Finished(0, outcome, seconds, time.time_ns() // 1000)
