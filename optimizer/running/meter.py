"""How fast a run is, and when to tell."""

from __future__ import annotations

import time
from collections import deque
from collections.abc import Callable

from optimizer.fronts import Front
from optimizer.running.progress import Progress
from optimizer.running.tally import Tally

WINDOW_S = 30.0  # over which the rate is taken
SHORTEST_INTERVAL_S = 0.2  # between two reports
# A report waits this many times what the last one took: large fronts take long to measure.
LARGEST_SHARE = 50.0


class Meter:
    """Reports progress now and then.

    Parameters
    ----------
    progress : callable or None
    budget : int
        Rows wanted.
    """

    def __init__(self, progress: Callable[[Progress], None] | None, budget: int) -> None:
        self._progress, self._budget = progress, budget
        self._begin = time.monotonic()
        self._marks: deque[tuple[float, int]] = deque([(self._begin, 0)])
        self._next = 0.0
        self.new = 0

    @property
    def seconds(self) -> float:
        """Since the start."""
        return time.monotonic() - self._begin

    def evaluated(self, rows: int) -> None:
        """Count new evaluations; rows taken from the archive are not new."""
        now = time.monotonic()
        self.new += rows
        self._marks.append((now, self.new))
        while len(self._marks) > 2 and now - self._marks[1][0] > WINDOW_S:
            self._marks.popleft()

    def rate(self) -> float:
        """New evaluations a second in the window; NaN if there are none."""
        (begin, before), (end, after) = self._marks[0], self._marks[-1]
        return (after - before) / (end - begin) if end > begin else float("nan")

    def show(self, evaluations: int, tally: Tally, front: Front, always: bool = False) -> None:
        """Report if someone listens and the last report is long enough ago."""
        begin = time.monotonic()
        if self._progress is None or (begin < self._next and not always):
            return
        rate = self.rate()
        left = max(self._budget - evaluations, 0)
        report = Progress(
            evaluations=evaluations,
            budget=self._budget,
            feasible=tally.feasible,
            failed=tally.failed,
            front_size=len(front),
            hypervolume=tally.volume(front),
            rate=rate,
            seconds_left=left / rate if rate > 0.0 else float("nan"),
            first_feasible=tally.first_feasible,
        )
        self._progress(report)
        end = time.monotonic()
        self._next = end + max(SHORTEST_INTERVAL_S, LARGEST_SHARE * (end - begin))

    def start(self) -> None:
        """Start the clock of the rate, which leaves out the time to read the archive."""
        if self.new == 0:
            self._marks[0] = (time.monotonic(), 0)
