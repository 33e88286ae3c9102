"""When a run ends before its budget is used, and the words for it."""

from __future__ import annotations

import math
import time
from dataclasses import dataclass
from typing import Any

from optimizer.errors import ProblemError
from optimizer.fronts import Front
from optimizer.running.tally import Tally

DEFAULT_GAIN = 0.01
_LOOKS = 10  # at the hypervolume within the generations of the rule; each costs time


@dataclass(frozen=True)
class StopRules:
    """Rules that end a run early; none by default.

    They do not decide which designs are evaluated, only how many, so like the budget they may
    change when an archive is continued. All but the wall time depend on the rows alone: however
    often a run is interrupted, it ends at the same evaluation.

    Parameters
    ----------
    stagnation_generations : int, optional
        End when the hypervolume (of :class:`optimizer.running.progress.Progress`) has not grown by
        more than ``stagnation_gain`` over so many generations. Before there are enough feasible
        rows to measure it, nothing stagnates.
    stagnation_gain : float
        Relative growth, at least 0.
    feasible_within : int, optional
        End when so many evaluations gave no feasible row.
    wall_time_s : float, optional
        End when the run has lasted so long; chunks in flight are finished.

    Raises
    ------
    ProblemError
        If a number is out of range.
    """

    stagnation_generations: int | None = None
    stagnation_gain: float = DEFAULT_GAIN
    feasible_within: int | None = None
    wall_time_s: float | None = None

    def __post_init__(self) -> None:
        for name in ("stagnation_generations", "feasible_within"):
            value = getattr(self, name)
            whole = isinstance(value, int) and not isinstance(value, bool)
            if value is not None and not (whole and value >= 1):
                msg = f"{name} is {value!r}; a whole number of at least 1 is wanted"
                raise ProblemError(msg)
        if not (math.isfinite(self.stagnation_gain) and self.stagnation_gain >= 0.0):
            msg = f"stagnation_gain is {self.stagnation_gain!r}; a number of at least 0 is wanted"
            raise ProblemError(msg)
        if self.wall_time_s is not None and not (
            math.isfinite(self.wall_time_s) and self.wall_time_s >= 0.0
        ):
            msg = f"wall_time_s is {self.wall_time_s!r}; a number of at least 0 is wanted"
            raise ProblemError(msg)


class Watch:
    """Holds a run against its rules.

    Parameters
    ----------
    rules : StopRules
    """

    def __init__(self, rules: StopRules) -> None:
        self._rules = rules
        self._begin = time.monotonic()
        self._seen: list[tuple[int, float]] = []  # generations told, hypervolume

    def told(self, generations: int, tally: Tally, front: Front) -> None:
        """Look at the hypervolume after a generation if it is time to."""
        span = self._rules.stagnation_generations
        if span is None or generations % self._step(span):
            return
        self._seen.append((generations, tally.volume(front)))
        self._seen = [item for item in self._seen if item[0] >= generations - span]

    def reason(self, evaluations: int, tally: Tally) -> str:
        """Why the run is to end by its rows, or an empty text."""
        rules = self._rules
        limit, span = rules.feasible_within, rules.stagnation_generations
        if limit is not None and evaluations >= limit and tally.first_feasible is None:
            return f"no feasible design within {limit:,} evaluations"
        if span is None or len(self._seen) < 2:
            return ""
        (first, before), (last, now) = self._seen[0], self._seen[-1]
        # A rule's span that is no multiple of the step begins at the first look within it.
        if last - first < span // self._step(span) * self._step(span) or before <= 0.0:
            return ""
        gain = now / before - 1.0
        if gain > rules.stagnation_gain:
            return ""
        return f"hypervolume grew by {100.0 * gain:.2g} % in the last {last - first} generations"

    def overdue(self) -> str:
        """Why the run is to end by the clock, or an empty text."""
        limit = self._rules.wall_time_s
        if limit is None or time.monotonic() - self._begin < limit:
            return ""
        return f"its wall time of {limit:.3g} s is used"

    def values(self) -> dict[str, Any]:
        """Return everything but the clock as JSON values."""
        return {"span": self._rules.stagnation_generations, "seen": self._seen}

    def restore(self, values: dict[str, Any]) -> None:
        """Take back what :meth:`values` returned.

        Raises
        ------
        ValueError
            If that was of another rule, so that looks are missing.
        """
        span = self._rules.stagnation_generations
        if span is not None and values["span"] != span:
            msg = "the snapshot was watched by another rule"
            raise ValueError(msg)
        self._seen = [(int(g), float(v)) for g, v in values["seen"]] if span is not None else []

    @staticmethod
    def _step(span: int) -> int:
        return max(1, span // _LOOKS)
