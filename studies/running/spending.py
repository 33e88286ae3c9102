"""How a sweep spends its evaluations and its time on the searches of the families."""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ThreadPoolExecutor, as_completed
from dataclasses import replace
from functools import partial
from queue import SimpleQueue

from optimizer.running.progress import Progress, Summary
from optimizer.running.runner import run
from optimizer.running.stopping import StopRules
from optimizer.settings import Settings
from optimizer.workers.dispatch import Dispatcher, single_threaded
from studies.problem import MachineProblem
from studies.running.ended import Ended, note_end
from studies.running.spreading import ROUNDS, prospects, read_rows
from studies.stored.layout import Results
from studies.stored.naming import family_of

Show = Callable[[str, Progress], None]
Stop = Callable[[], bool]
SettingsOf = Callable[[str, MachineProblem], Settings]


class Spending:
    """Searches families: as many searches side by side as there are workers, or in rounds.

    Parameters
    ----------
    results : Results
    problems : dict of search to MachineProblem
        By the names of the searches, in the order in which they are begun.
    settings : callable
        Settings of a search's archive, from its name and problem; its budget is the most a search
        gets.
    dispatcher : Dispatcher
    show : callable
        Told the name of a search and its progress, from any thread.
    stop : callable
        Asked whether to stop, from any thread.
    """

    def __init__(
        self,
        results: Results,
        problems: dict[str, MachineProblem],
        settings: SettingsOf,
        dispatcher: Dispatcher,
        show: Show,
        stop: Stop,
    ) -> None:
        self._results, self._problems, self._settings = results, problems, settings
        self._dispatcher, self._show, self._stop = dispatcher, show, stop
        minutes = results.study.search.wall_time_min
        self._deadline = None if minutes is None else time.monotonic() + 60.0 * minutes
        self._new = dict.fromkeys(problems, 0)
        self._seconds = dict.fromkeys(problems, 0.0)

    def searches(self) -> Iterator[tuple[str, Summary]]:
        """Search; yields each search when nothing more is spent on it.

        Raises
        ------
        OptimizerError
            If the results cannot be written.
        """
        total = self._results.study.search.total_evaluations
        for name, summary in self._in_turn() if total is None else self._in_rounds(total):
            yield name, replace(summary, new=self._new[name], seconds=self._seconds[name])

    def _in_turn(self) -> Iterator[tuple[str, Summary]]:
        most = {name: self._settings(name, item).budget for name, item in self._problems.items()}
        lanes = self._dispatcher.lanes(len(most))
        if len(lanes) > 1:
            yield from self._side_by_side(most, lanes)
            return
        for position, name in enumerate(most):
            summary = self._search(name, most[name], len(most) - position, self._dispatcher)
            self._note(name, summary, most[name])
            yield name, summary
            if summary.stopped:
                return

    def _side_by_side(
        self, most: dict[str, int], lanes: Sequence[Dispatcher]
    ) -> Iterator[tuple[str, Summary]]:
        """Search with the workers shared out; the archives do not depend on how many there are."""
        free: SimpleQueue[Dispatcher] = SimpleQueue()
        for lane in lanes:
            free.put(lane)

        def search(name: str, later: int) -> Summary | None:
            if self._stop():
                return None
            lane = free.get()
            try:
                return self._search(name, most[name], 1.0 + later / len(lanes), lane)
            finally:
                free.put(lane)

        # Entered here, so that what each run enters and leaves in its thread changes nothing.
        with single_threaded(), ThreadPoolExecutor(len(lanes)) as threads:
            futures = {
                threads.submit(search, name, len(most) - 1 - position): name
                for position, name in enumerate(most)
            }
            try:
                for future in as_completed(futures):
                    name, summary = futures[future], future.result()
                    if summary is not None:
                        self._note(name, summary, most[name])
                        yield name, summary
            except BaseException:  # a second Ctrl-C, a full disk: the other threads must end too
                for future in futures:
                    future.cancel()
                for lane in lanes:
                    lane.give_up()
                raise

    def _in_rounds(self, total: int) -> Iterator[tuple[str, Summary]]:
        most = {name: self._settings(name, item).budget for name, item in self._problems.items()}
        quota = dict.fromkeys(self._problems, 0)
        last: dict[str, Summary] = {}
        active = list(self._problems)
        for left in range(ROUNDS, 0, -1):
            share = max((total - sum(quota.values())) // left // max(len(active), 1), 0)
            over: dict[str, str] = {}
            for name in active:
                quota[name] = min(quota[name] + share, most[name])
                summary = last[name] = self._search(
                    name, max(quota[name], 1), 1.0, self._dispatcher
                )
                if summary.stopped:
                    yield name, summary
                    return
                if summary.ended:
                    quota[name] = min(quota[name], summary.evaluations)
                    over[name] = summary.ended
                elif quota[name] == most[name]:
                    over[name] = ""
            if left > 1:
                largest = {family_of(name): most[name] for name in most}
                gone = prospects(read_rows(self._results, quota), largest)
                for name in active:
                    if family_of(name) in gone:
                        over.setdefault(name, gone[family_of(name)])
            else:
                over |= {
                    name: "the evaluations for all families are used"
                    for name in active
                    if name not in over
                }
            for name, reason in over.items():
                summary = replace(last[name], ended=reason, budget=most[name])
                self._note(name, summary, most[name])
                active.remove(name)
                yield name, summary

    def _search(self, name: str, budget: int, sharers: float, dispatcher: Dispatcher) -> Summary:
        """Go on with one search, with its part of the time left if it shares that with others."""
        search, problem = self._results.study.search, self._problems[name]
        left = None
        if self._deadline is not None:
            left = max(self._deadline - time.monotonic(), 0.0) / sharers
        rules = StopRules(
            stagnation_generations=search.stagnation_generations,
            stagnation_gain=search.stagnation_gain,
            feasible_within=search.feasible_within,
            wall_time_s=left,
        )
        summary = run(
            problem,
            self._results.search_folder(name),
            replace(self._settings(name, problem), budget=budget),
            dispatcher,
            partial(self._show, name),
            self._stop,
            rules,
        )
        self._new[name] += summary.new
        self._seconds[name] += summary.seconds
        return summary

    def _note(self, name: str, summary: Summary, most: int) -> None:
        early = bool(summary.ended) and summary.evaluations < most
        final = not summary.ended.startswith("its wall time")
        note = Ended(summary.evaluations, summary.ended, final) if early else None
        note_end(self._results, name, note)
