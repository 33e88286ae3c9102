"""Counts of a run and the one figure that says how far its front has come."""

from __future__ import annotations

from typing import Any

import numpy as np

from optimizer.fronts import Front, hypervolume, hypervolume_estimate
from optimizer.problem import FloatArray, IntArray, Outcome

EXACT_OBJECTIVES = 5  # a front of 3000 points in six takes most of a minute
BOX_ROWS = 20  # feasible rows that span the box of the hypervolume


class Tally:
    """Counts over all generations told; see :class:`optimizer.running.progress.Progress`."""

    def __init__(self) -> None:
        self.feasible = 0
        self.failed = 0
        self.first_feasible: int | None = None
        self._early: list[list[float]] = []
        self._box: tuple[FloatArray, FloatArray] | None = None

    def add(self, evaluations: IntArray, outcome: Outcome, whole: bool = True) -> None:
        """Count rows with their numbers; those of a whole generation may close the box."""
        feasible = outcome.feasible
        self.feasible += int(feasible.sum())
        self.failed += int((~outcome.ok).sum())
        if self.first_feasible is None and feasible.any():
            self.first_feasible = int(evaluations[feasible].min())
        if whole and self._box is None and feasible.any():
            self._early += outcome.objectives[feasible].tolist()
            if len(self._early) >= BOX_ROWS:
                self._close_box()

    def volume(self, front: Front) -> float:
        """Hypervolume of the front in the box; 0 before there is one."""
        if self._box is None:
            return 0.0
        low, high = self._box
        span = np.where(high > low, high - low, 1.0)
        measure = hypervolume if len(low) <= EXACT_OBJECTIVES else hypervolume_estimate
        return measure((front.points - low) / span, np.ones(len(low)))

    def values(self) -> dict[str, Any]:
        """Return everything as JSON values."""
        return {
            "feasible": self.feasible,
            "failed": self.failed,
            "first_feasible": self.first_feasible,
            "early": self._early,
        }

    def restore(self, values: dict[str, Any]) -> None:
        """Take back what :meth:`values` returned."""
        self.feasible, self.failed = int(values["feasible"]), int(values["failed"])
        first = values["first_feasible"]
        self.first_feasible = None if first is None else int(first)
        self._early = [[float(v) for v in row] for row in values["early"]]
        if len(self._early) >= BOX_ROWS:
            self._close_box()

    def _close_box(self) -> None:
        early = np.array(self._early)
        self._box = (early.min(axis=0), early.max(axis=0))
