"""One run: ask, evaluate, store, tell, until the budget is used or someone says stop.

A run and its continuations follow one path. Designs follow from the seed and from what was told
before; what an earlier run stored is told again instead of being evaluated again. So an archive
that was interrupted any number of times ends up with the rows of one that never was, apart from
the columns of time.
"""

from __future__ import annotations

import copy
import time
from collections.abc import Callable, Iterator
from pathlib import Path

import numpy as np

from optimizer.archive.archive import Archive
from optimizer.archive.schema import Rows
from optimizer.archive.snapshot import digest, read_snapshot, write_snapshot
from optimizer.problem import BoolArray, IntArray, Outcome, Problem, check_problem
from optimizer.running.generation import Generation
from optimizer.running.meter import Meter
from optimizer.running.progress import Progress, Summary
from optimizer.running.repeats import Repeats, as_repeat
from optimizer.running.stopping import StopRules, Watch
from optimizer.running.tally import Tally
from optimizer.search import DecompositionSearch
from optimizer.settings import Settings
from optimizer.workers.dispatch import Chunk, Dispatcher, Serial, single_threaded

SNAPSHOT_INTERVAL_S = 10.0


def run(
    problem: Problem,
    folder: Path | str,
    settings: Settings,
    dispatcher: Dispatcher | None = None,
    progress: Callable[[Progress], None] | None = None,
    stop: Callable[[], bool] | None = None,
    rules: StopRules | None = None,
) -> Summary:
    """Search a problem, or continue to, and keep every evaluation in an archive.

    Parameters
    ----------
    problem : Problem
    folder : path
        Of the archive, made if it does not exist.
    settings : Settings
        All but ``budget`` must be as they were when the archive was begun. If the archive
        holds more rows than the budget already, none are added beyond those.
    dispatcher : Dispatcher, optional
        What evaluates; by default this process.
    progress : callable, optional
        Called with a :class:`Progress` several times a second, and at the end.
    stop : callable, optional
        Asked before each chunk is started; True lets the chunks in flight finish and ends.
    rules : StopRules, optional
        What ends the run before its budget is used. Rows found in the archive are never given
        up: a rule is applied only where new ones would be added.

    Returns
    -------
    Summary

    Raises
    ------
    ProblemError
        If the problem contradicts itself or returns something other than it declares.
    ArchiveError
        If the folder cannot be used: locked, of another study, full disk, no permission.

    Examples
    --------
    A problem of one's own needs four names and one function of arrays.

    >>> import tempfile
    >>> import numpy as np
    >>> from optimizer.archive.archive import open_archive
    >>> from optimizer.problem import Outcome, Variable
    >>> class Beam:
    ...     variables = (Variable("width_mm", 10.0, 50.0), Variable("height_mm", 10.0, 80.0))
    ...     objectives = ("area_mm2", "deflection_mm")
    ...     constraints = ("slenderness",)
    ...     columns = ()
    ...     def evaluate(self, x):
    ...         width, height = x.T
    ...         deflection = 2e6 / (width * height**3)
    ...         objectives = np.column_stack([width * height, deflection])
    ...         return Outcome(objectives, (height / (4.0 * width) - 1.0)[:, None])
    >>> folder = tempfile.mkdtemp()
    >>> summary = run(Beam(), folder, Settings(budget=400, seed=1))
    >>> summary.evaluations, summary.failed
    (400, 0)
    >>> open_archive(folder).front().num_rows == summary.front_size
    True
    """
    check_problem(problem)
    with Archive(Path(folder), problem, settings) as archive, single_threaded():
        session = _Session(problem, settings, archive, dispatcher or Serial(), progress, stop)
        session.watch = Watch(rules or StopRules())
        session.resume()
        try:
            session.work()
        except KeyboardInterrupt:
            session.finish()
            raise
        return session.finish()


class _Session:
    """Variables of one run."""

    def __init__(
        self,
        problem: Problem,
        settings: Settings,
        archive: Archive,
        dispatcher: Dispatcher,
        progress: Callable[[Progress], None] | None,
        stop: Callable[[], bool] | None,
    ) -> None:
        self._problem, self._settings, self._archive = problem, settings, archive
        self._dispatcher, self._stop = dispatcher, stop
        self._search = self._new_search()
        self._tally, self._digest = Tally(), ""
        self._end = max(settings.budget, archive.end)
        self._begun: Generation | None = None
        self._repeats = Repeats()
        self._stopped, self._ended = False, ""
        self.watch = Watch(StopRules())
        self._saved_at, self._saved = time.monotonic(), -1
        self._meter = Meter(progress, self._end)

    def resume(self) -> None:
        """Take the shortcut of the snapshot if it agrees with the rows stored."""
        found = read_snapshot(self._archive.folder)
        if found is None:
            return
        state, told = found
        search, tally = self._new_search(), Tally()
        try:
            search.restore(state)
            tally.restore(told["tally"])
            self.watch.restore(told["watch"])
            wanted = str(told["digest"])
        except (KeyError, TypeError, ValueError, AttributeError):
            return  # of another version
        if not self._archive.complete(search.evaluations):
            return
        chain, repeats = "", Repeats()
        for first in range(0, search.evaluations, search.size):
            _, x, outcome = self._archive.stored(first, search.size)
            chain = digest(chain, x, outcome)
            repeats.sources(first, x)
        if chain == wanted:
            self._repeats = repeats
            self._search, self._tally, self._digest = search, tally, chain
            self._saved = search.generation

    def work(self) -> None:
        """Go through the generations until the budget is used, or until told to stop."""
        search = self._search
        while search.evaluations < self._end and not self._asked_to_stop():
            if search.evaluations >= self._archive.end:
                self._ended = self.watch.reason(search.evaluations, self._tally)
                if self._ended:
                    return
            generation = Generation(
                search.generation,
                search.evaluations,
                search.ask(),
                len(self._problem.objectives),
                len(self._problem.constraints),
            )
            self._begun = generation
            present, x, outcome = self._archive.stored(generation.first, len(generation))
            generation.recall(present, x, outcome, str(self._archive.folder))
            sources = self._repeats.sources(generation.first, generation.x)
            self._evaluate(generation, sources < 0)
            self._repeat(generation, sources)
            if not generation.present.all():
                return
            outcome = generation.outcome()
            search.tell(outcome)
            self._begun = None
            self._tally.add(generation.first + np.arange(len(generation)), outcome)
            self._digest = digest(self._digest, generation.x, outcome)
            self.watch.told(search.generation, self._tally, search.front)
            self._meter.show(search.evaluations, self._tally, search.front)
            if time.monotonic() - self._saved_at > SNAPSHOT_INTERVAL_S:
                self._archive.flush()  # the snapshot must not know more than the parts
                self._save()

    def finish(self) -> Summary:
        """Write what is waiting, the front and the snapshot, and sum up."""
        tally, front = copy.deepcopy(self._tally), copy.deepcopy(self._search.front)
        evaluations = self._search.evaluations
        for numbers, outcome in self._untold():
            good = outcome.feasible
            front.add(outcome.objectives[good], numbers[good])
            tally.add(numbers, outcome, whole=False)
            evaluations += len(numbers)
        self._archive.finish(front.evaluations)
        self._save()
        self._meter.show(evaluations, tally, front, always=True)
        return Summary(
            evaluations=evaluations,
            budget=self._settings.budget,
            feasible=tally.feasible,
            failed=tally.failed,
            front_size=len(front),
            hypervolume=tally.volume(front),
            first_feasible=tally.first_feasible,
            new=self._meter.new,
            seconds=self._meter.seconds,
            stopped=self._stopped,
            damaged=self._archive.damaged,
            folder=self._archive.folder,
            ended=self._ended,
        )

    def _new_search(self) -> DecompositionSearch:
        return DecompositionSearch(
            self._problem.variables,
            len(self._problem.objectives),
            len(self._problem.constraints),
            self._settings.seed,
            self._settings.population,
        )

    def _asked_to_stop(self) -> bool:
        if not self._stopped and self._stop is not None and self._stop():
            self._stopped = True
        return self._stopped

    def _evaluate(self, generation: Generation, fresh: BoolArray) -> None:
        """Evaluate and store what is missing; the ``fresh`` rows of a chunk are always one call.

        So its results do not depend on which of them are missing, or lie below the budget.
        """
        size = self._settings.chunk
        wanted = {
            start: rows[fresh[rows]]
            for start, rows in generation.chunks(size, self._end)
            if fresh[rows].any()
        }
        if not wanted:
            return
        called = {start: _within(fresh, start, size) for start in wanted}

        def chunks() -> Iterator[Chunk]:
            for start, rows in called.items():
                self._ended = self.watch.overdue()
                if self._ended or self._asked_to_stop():
                    return
                yield Chunk(start, generation.x[rows])

        self._meter.start()
        for finished in self._dispatcher.run(self._problem, chunks()):
            rows = wanted[finished.start]
            outcome, time_s = finished.outcome, finished.seconds / len(finished.outcome)
            if len(rows) < len(outcome):
                outcome = outcome.rows(np.searchsorted(called[finished.start], rows))
            self._store(generation, rows, outcome, time_s, finished.finished_at)

    def _repeat(self, generation: Generation, sources: IntArray) -> None:
        """Answer designs that were evaluated before from the archive."""
        numbers = generation.first + np.arange(len(generation))
        missing = ~generation.present & (sources >= 0) & (numbers < self._end)
        here = sources - generation.first
        inside = here >= 0
        missing[inside] &= generation.present[here[inside]]  # or a stop came before its source
        rows = np.flatnonzero(missing)
        if len(rows):
            outcome = as_repeat(self._archive.recall(sources[rows]), sources[rows])
            self._store(generation, rows, outcome, 0.0, time.time_ns() // 1000)

    def _store(
        self,
        generation: Generation,
        rows: IntArray,
        outcome: Outcome,
        time_s: float,
        finished_at: int,
    ) -> None:
        generation.fill(rows, outcome)
        self._meter.evaluated(len(rows))
        self._archive.add(
            Rows(
                generation.first + rows,
                np.full(len(rows), generation.number),
                generation.x[rows],
                outcome,
                np.full(len(rows), time_s),
                np.full(len(rows), finished_at),
            )
        )
        told = self._search.evaluations + int(generation.present.sum())
        self._meter.show(told, self._tally, self._search.front)

    def _untold(self) -> Iterator[tuple[IntArray, Outcome]]:
        """Rows known but not told: of the generation begun, and of an archive not read to the end.

        Yields
        ------
        evaluations : (n,) array of int
        outcome : Outcome
        """
        first = self._search.evaluations
        if self._begun is not None:
            rows = np.flatnonzero(self._begun.present)
            yield first + rows, self._begun.outcome().rows(rows)
            first += len(self._begun)
        if self._archive.end > first:
            present, _, outcome = self._archive.stored(first, self._archive.end - first)
            yield first + np.flatnonzero(present), outcome

    def _save(self) -> None:
        if self._saved != self._search.generation:
            told = {
                "tally": self._tally.values(),
                "watch": self.watch.values(),
                "digest": self._digest,
            }
            write_snapshot(self._archive.folder, self._search.state(), told)
            self._saved = self._search.generation
        self._saved_at = time.monotonic()


def _within(fresh: BoolArray, start: int, size: int) -> IntArray:
    """Fresh rows among ``size`` from ``start`` on."""
    return np.asarray(start + np.flatnonzero(fresh[start : start + size]))
