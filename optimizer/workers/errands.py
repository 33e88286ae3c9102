"""What a cluster is still to do, and whom to blame if workers die of it."""

from __future__ import annotations

from collections import deque
from collections.abc import Iterable
from dataclasses import dataclass

from optimizer.problem import Described
from optimizer.workers.dispatch import Chunk, Finished
from optimizer.workers.units import TRIES, Unit


@dataclass(eq=False)
class Errand:
    """A unit on its way.

    Attributes
    ----------
    unit : Unit
    wanted : bool
        Whether it came to a worker without the problem, and takes that along from now on.
    refusals, meetings : int
        Errors of the cluster itself; workers that died meanwhile.
    suspect : bool
        Whether it runs with nothing beside it from now on.
    """

    unit: Unit
    wanted: bool = False
    refusals: int = 0
    meetings: int = 0
    suspect: bool = False


class Errands:
    """Errands still to be run: new ones, ones again, and suspects that are to be alone."""

    def __init__(self, problem: Described, chunks: Iterable[Chunk]) -> None:
        self._problem = problem
        self._chunks = iter(chunks)
        self._again: deque[Errand] = deque()
        self._suspects: deque[Errand] = deque()
        self._alone = False  # whether a suspect runs
        self._more = True

    def next(self, running: int) -> Errand | None:
        """The next one to start while so many run; None if there is none now."""
        if self._alone:
            return None
        if self._again:
            return self._again.popleft()
        if self._suspects:
            if running:
                return None
            self._alone = True
            return self._suspects.popleft()
        if self._more:
            chunk = next(self._chunks, None)
            if chunk is not None:
                return Errand(Unit(chunk, 0, len(chunk.x)))
            self._more = False
        return None

    def back(self, errand: Errand) -> None:
        """Note that an errand runs no more."""
        if errand.suspect:
            self._alone = False

    def again(self, errand: Errand) -> None:
        """Start an errand again before others."""
        (self._suspects if errand.suspect else self._again).appendleft(errand)

    def killed(self, errand: Errand) -> Finished | None:
        """Count that workers died while they had an errand, be it to blame or not.

        The scheduler cannot tell: with a worker, all dies that it had in hand or waiting.
        """
        if not errand.suspect:
            errand.meetings += 1
            if errand.meetings < TRIES:
                self._again.append(errand)
            else:
                errand.suspect = True
                self._suspects.append(errand)
            return None
        after = errand.unit.died(self._problem)
        if not isinstance(after, list):
            return after
        self._suspects.extendleft(Errand(unit, suspect=True) for unit in reversed(after))
        return None
