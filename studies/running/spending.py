"""How a sweep spends its evaluations and its time on the families."""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator
from dataclasses import replace

from optimizer.running.progress import Progress, Settings, Summary
from optimizer.running.runner import run
from optimizer.running.stopping import StopRules
from optimizer.workers.dispatch import Dispatcher
from studies.running.ended import Ended, note_end
from studies.running.problem import MachineProblem
from studies.running.spreading import ROUNDS, prospects, read_rows
from studies.stored.layout import Results

SPENDING_KEYS = (
    "evaluations_per_family",
    "total_evaluations",
    "stagnation_generations",
    "stagnation_gain",
    "feasible_within",
    "wall_time_min",
    "time_limit_s",
)
"""Keys of [search] that decide how many designs are evaluated, but not which."""

Begin = Callable[[str], None]
Show = Callable[[Progress], None]
Stop = Callable[[], bool]
SettingsOf = Callable[[MachineProblem], Settings]


class Spending:
    """Searches families, one after the other or in rounds.

    Parameters
    ----------
    results : Results
    problems : dict of family to MachineProblem
    settings : callable
        Settings of a problem's archive; its budget is the most a family gets.
    dispatcher : Dispatcher
    begin : callable
        Told which family is searched from now on.
    show : callable
        Told its progress.
    stop : callable
        Asked whether to stop.
    """

    def __init__(
        self,
        results: Results,
        problems: dict[str, MachineProblem],
        settings: SettingsOf,
        dispatcher: Dispatcher,
        begin: Begin,
        show: Show,
        stop: Stop,
    ) -> None:
        self._results, self._problems, self._settings = results, problems, settings
        self._dispatcher, self._begin, self._show, self._stop = dispatcher, begin, show, stop
        minutes = results.study.search.wall_time_min
        self._deadline = None if minutes is None else time.monotonic() + 60.0 * minutes
        self._new = dict.fromkeys(problems, 0)
        self._seconds = dict.fromkeys(problems, 0.0)

    def families(self) -> Iterator[tuple[str, Summary]]:
        """Search; yields each family when nothing more is spent on it.

        Raises
        ------
        OptimizerError
            If the results cannot be written.
        """
        total = self._results.study.search.total_evaluations
        for family, summary in self._in_turn() if total is None else self._in_rounds(total):
            yield family, replace(summary, new=self._new[family], seconds=self._seconds[family])
            if summary.stopped:
                return

    def _in_turn(self) -> Iterator[tuple[str, Summary]]:
        for position, (family, problem) in enumerate(self._problems.items()):
            most = self._settings(problem).budget
            summary = self._search(family, most, len(self._problems) - position)
            self._note(family, summary, most)
            yield family, summary

    def _in_rounds(self, total: int) -> Iterator[tuple[str, Summary]]:
        most = {name: self._settings(item).budget for name, item in self._problems.items()}
        quota = dict.fromkeys(self._problems, 0)
        last: dict[str, Summary] = {}
        active = list(self._problems)
        for left in range(ROUNDS, 0, -1):
            share = max((total - sum(quota.values())) // left // max(len(active), 1), 0)
            over: dict[str, str] = {}
            for family in active:
                quota[family] = min(quota[family] + share, most[family])
                summary = last[family] = self._search(family, max(quota[family], 1), 1)
                if summary.stopped:
                    yield family, summary
                    return
                if summary.ended:
                    quota[family] = min(quota[family], summary.evaluations)
                    over[family] = summary.ended
                elif quota[family] == most[family]:
                    over[family] = ""
            if left > 1:
                rows = {name: read_rows(self._results, name, quota[name]) for name in quota}
                for family, reason in prospects(rows, most).items():
                    if family in active:
                        over.setdefault(family, reason)
            else:
                over |= {
                    family: "the evaluations for all families are used"
                    for family in active
                    if family not in over
                }
            for family, reason in over.items():
                summary = replace(last[family], ended=reason, budget=most[family])
                self._note(family, summary, most[family])
                active.remove(family)
                yield family, summary

    def _search(self, family: str, budget: int, sharers: int) -> Summary:
        """Search one family, with its part of the time left if it shares that with others."""
        search, problem = self._results.study.search, self._problems[family]
        left = None
        if self._deadline is not None:
            left = max(self._deadline - time.monotonic(), 0.0) / sharers
        rules = StopRules(
            stagnation_generations=search.stagnation_generations,
            stagnation_gain=search.stagnation_gain,
            feasible_within=search.feasible_within,
            wall_time_s=left,
        )
        self._begin(family)
        summary = run(
            problem,
            self._results.family_folder(family),
            replace(self._settings(problem), budget=budget),
            self._dispatcher,
            self._show,
            self._stop,
            rules,
        )
        self._new[family] += summary.new
        self._seconds[family] += summary.seconds
        return summary

    def _note(self, family: str, summary: Summary, most: int) -> None:
        early = bool(summary.ended) and summary.evaluations < most
        final = not summary.ended.startswith("its wall time")
        note = Ended(summary.evaluations, summary.ended, final) if early else None
        note_end(self._results, family, note)
