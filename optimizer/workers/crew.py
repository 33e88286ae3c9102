"""Worker processes that may die or be late without ending a study."""

from __future__ import annotations

import time
from collections import deque
from collections.abc import Iterable, Iterator
from multiprocessing.connection import wait
from pathlib import Path

from optimizer.errors import ProblemError, WorkerError
from optimizer.problem import Described
from optimizer.workers.child import Child
from optimizer.workers.dispatch import Chunk, Finished
from optimizer.workers.units import TIMED_OUT, Unit, blank
from optimizer.workers.worker import BEGUN

_STILLBORN = 3  # workers in a row that end before they begin anything
_LOOK_S = 1.0  # between looks at workers that say nothing


class Crew:
    """Evaluates chunks of problems that lie in files; see :class:`optimizer.workers.pool.Pool`.

    Parameters
    ----------
    workers : int
        Processes, at least 1; started when first needed.
    """

    def __init__(self, workers: int) -> None:
        self.workers = workers
        self.children: list[Child] = []
        self._stillborn = 0
        self._given_up = False

    def run(
        self,
        described: Described,
        path: Path,
        chunks: Iterable[Chunk],
        time_limit_s: float | None = None,
    ) -> Iterator[Finished]:
        """Evaluate every chunk of the problem in a file.

        Parameters
        ----------
        described : Described
            What its outcomes consist of.
        path : Path
        chunks : iterable of Chunk
            Taken when a worker is free.
        time_limit_s : float, optional
            Longest time of one design; designs are then evaluated one by one.

        Raises
        ------
        ProblemError
            If an outcome is not what the problem declares.
        WorkerError
            If workers cannot be started, or were given up.
        """
        units = _Units(chunks, time_limit_s is not None)
        self.man()
        try:
            for child in self.children:
                _give(child, path, units)
            while busy := [child for child in self.children if child.unit is not None]:
                _listen(busy, time_limit_s)
                for child in busy:
                    done = self._settled(described, child, units, time_limit_s)
                    # Before the caller takes its time; a dead worker's place is taken by now.
                    for idle in [item for item in self.children if item.unit is None]:
                        _give(idle, path, units)
                    if done is not None:
                        yield done
        finally:
            # A caller that ends early leaves workers with rows nobody waits for.
            for child in [child for child in self.children if child.unit is not None]:
                child.kill()
                self.children.remove(child)

    def man(self) -> None:
        """Have all workers alive."""
        self._stand()
        for child in [item for item in self.children if item.process.poll() is not None]:
            child.kill()
            self.children.remove(child)
        while len(self.children) < self.workers:
            self.children.append(Child())

    def give_up(self) -> None:
        """End the workers at once, from any thread; the run that waits for them raises."""
        self._given_up = True
        for child in list(self.children):
            child.strike()

    def close(self) -> None:
        """End the workers, those at work at once."""
        for child in self.children:
            if child.unit is None:
                child.end()
            else:
                child.kill()
        self.children.clear()

    def _settled(
        self,
        described: Described,
        child: Child,
        units: _Units,
        time_limit_s: float | None,
    ) -> Finished | None:
        """Take what a worker says; returns a chunk that is complete by that."""
        unit = child.unit
        if unit is None:
            return None
        try:
            answer = child.answer()
            if answer == BEGUN:
                child.begin()
                self._stillborn = 0
                answer = child.answer()
        except EOFError:
            return self._died(described, child, unit, units)
        if isinstance(answer, ProblemError):
            child.unit = None
            raise answer
        if isinstance(answer, Finished):
            child.unit = None
            return unit.settle(answer)
        late = time_limit_s is not None and _left(child, time_limit_s) <= 0.0
        if not late or time_limit_s is None:
            return None
        self._replace(child)
        reason = f"no answer within {time_limit_s:g} s"
        return unit.settle(blank(described, reason, TIMED_OUT, time_limit_s))

    def _died(
        self, described: Described, child: Child, unit: Unit, units: _Units
    ) -> Finished | None:
        self._stand()
        begun = child.since is not None
        if not child.began_once:
            self._stillborn += 1
            if self._stillborn >= _STILLBORN:
                msg = (
                    "worker processes end before they begin an evaluation, the last with exit "
                    f"code {child.process.wait()}; see what they wrote to standard error"
                )
                raise WorkerError(msg)
        self._replace(child)
        after = unit.died(described) if begun else [unit]
        if isinstance(after, list):
            units.again(after)
            return None
        return after

    def _stand(self) -> None:
        if self._given_up:
            msg = "the designs in hand were given up"
            raise WorkerError(msg)

    def _replace(self, child: Child) -> None:
        child.kill()
        self.children[self.children.index(child)] = Child()


class _Units:
    """What is to be given to workers, taken from the chunks when one is free."""

    def __init__(self, chunks: Iterable[Chunk], by_rows: bool) -> None:
        self._chunks, self._by_rows = iter(chunks), by_rows
        self._queue: deque[Unit] = deque()
        self._more = True

    def next(self) -> Unit | None:
        """The next one; None if there is none, for now or for good."""
        if self._more and not self._queue:
            chunk = next(self._chunks, None)
            if chunk is None:
                self._more = False
            else:
                whole = Unit(chunk, 0, len(chunk.x))
                self._queue.extend(whole.rows() if self._by_rows else [whole])
        return self._queue.popleft() if self._queue else None

    def again(self, units: list[Unit]) -> None:
        """Give these next."""
        self._queue.extendleft(reversed(units))


def _give(child: Child, path: Path, units: _Units) -> None:
    unit = units.next()
    if unit is not None:
        child.give(path, unit)


def _left(child: Child, time_limit_s: float) -> float:
    """Seconds a worker has left; those that still load have all."""
    since = time.monotonic() if child.since is None else child.since
    return since + time_limit_s - time.monotonic()


def _listen(busy: list[Child], time_limit_s: float | None) -> None:
    """Wait until a worker answers, dies or is late."""
    left = [_LOOK_S]
    if time_limit_s is not None:
        left += [_left(child, time_limit_s) for child in busy if child.since is not None]
    wait([child.pipe for child in busy], max(min(left), 0.0))
