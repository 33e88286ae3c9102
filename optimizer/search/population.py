"""Members of the population, how they are compared, and how children replace them."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from optimizer.fronts import Front
from optimizer.problem import AnyArray, FloatArray, IntArray

REPLACEMENT = 20  # weights round a child's own at which it may replace the member
REPLACED = 4  # members one child may replace, so that it does not fill the population
MEAN_SHARE = 1e-3  # of the mean in the scalar value: prefers strong to weak dominance
FIRST_TOLERANCE = 0.2  # quantile of the first violations that is tolerated at first
TOLERANCE_STEP = 1.2  # the tolerance is divided by this every generation


class Scale:
    """What objectives and violations are measured in; changes from generation to generation.

    The tolerance for violations shrinks geometrically. Forms that reach zero at a share of the
    budget would need to know the budget, and a study could not be extended.
    """

    def __init__(self, objectives: int, constraints: int) -> None:
        self.largest: FloatArray = np.zeros(constraints)
        self.tolerance = 0.0
        self.ideal: FloatArray = np.zeros(objectives)
        self.span: FloatArray = np.ones(objectives)

    def see(self, constraints: FloatArray) -> None:
        """Take the largest violation of each constraint into account."""
        self.largest = np.maximum(self.largest, constraints.max(axis=0, initial=0.0))

    def start(self, constraints: FloatArray, generation: int) -> None:
        """Set the first tolerance from the violations of the first population."""
        quantile = np.quantile(self.violation(constraints), FIRST_TOLERANCE)
        self.tolerance = float(quantile) / TOLERANCE_STEP**generation

    def relax(self) -> None:
        """Shrink the tolerance by one generation."""
        self.tolerance /= TOLERANCE_STEP

    def violation(self, constraints: FloatArray) -> FloatArray:
        """Mean over the constraints of the violation, each relative to the largest seen."""
        if constraints.shape[1] == 0:
            return np.zeros(len(constraints))
        relative = np.maximum(constraints, 0.0) / np.where(self.largest > 0.0, self.largest, 1.0)
        return np.asarray(relative.mean(axis=1))

    def set_objectives(self, front: Front, members: FloatArray, children: FloatArray) -> None:
        """Measure objectives by the ideal and nadir of the front, or of the population."""
        everyone = np.concatenate([members, children])
        known = front.points if len(front) else everyone
        self.ideal = known.min(axis=0)
        span = known.max(axis=0) - self.ideal
        # A front of one point, or one flat in an objective, tells no scale.
        wide = everyone.max(axis=0) - everyone.min(axis=0)
        span = np.where(span > 1e-9 * wide, span, wide)
        self.span = np.where(span > 0.0, span, 1.0)

    def normalised(self, objectives: FloatArray) -> FloatArray:
        """Objectives from 0 at the ideal to 1 at the nadir."""
        return np.asarray((objectives - self.ideal) / self.span)

    def values(self) -> dict[str, Any]:
        """Return the numbers that outlive a generation."""
        return {"tolerance": self.tolerance}

    def restore(self, values: Mapping[str, Any], largest: FloatArray) -> None:
        """Take back what :meth:`values` returned."""
        self.tolerance = float(values["tolerance"])
        self.largest = largest.copy()


class Population:
    """One member for each weight, none before the first design that could be evaluated."""

    def __init__(
        self, weights: FloatArray, order: IntArray, variables: int, constraints: int
    ) -> None:
        self._inverse = 1.0 / weights
        self._near = np.ascontiguousarray(order[:, :REPLACEMENT])
        self.reach = self._near.shape[1]
        self._single = weights.shape[1] == 1
        self.unit: FloatArray = np.zeros((0, variables))
        self.objectives: FloatArray = np.zeros((0, weights.shape[1]))
        self.constraints: FloatArray = np.zeros((0, constraints))

    @property
    def filled(self) -> bool:
        """Whether there are members."""
        return len(self.unit) > 0

    def arrays(self) -> dict[str, AnyArray]:
        """Return the members as arrays."""
        return {
            "unit": self.unit,
            "objectives": self.objectives,
            "constraints": self.constraints,
        }

    def restore(self, arrays: Mapping[str, AnyArray]) -> None:
        """Take back what :meth:`arrays` returned."""
        self.unit = arrays["unit"].copy()
        self.objectives = arrays["objectives"].copy()
        self.constraints = arrays["constraints"].copy()

    def scalar(self, normalised: FloatArray) -> FloatArray:
        """Value (n, N) of each point for each weight: the achievement function of Wierzbicki.

        max over the objectives of f/w, plus a little of their mean (Wierzbicki, in Multiple
        Criteria Decision Making Theory and Application, Springer 1980, 468-486).
        """
        value = normalised[:, None, 0] * self._inverse[:, 0]
        mean = value.copy()
        for objective in range(1, normalised.shape[1]):
            term = normalised[:, None, objective] * self._inverse[:, objective]
            np.maximum(value, term, out=value)
            mean += term
        return np.asarray(value + (MEAN_SHARE / normalised.shape[1]) * mean)

    def update(
        self,
        unit: FloatArray,
        objectives: FloatArray,
        constraints: FloatArray,
        scale: Scale,
        born: IntArray,
        turn: IntArray,
        shuffle: IntArray,
    ) -> None:
        """Let children (c, ...) replace members, one after the other.

        Parameters
        ----------
        unit, objectives, constraints : (c, ...) arrays
            Children that could be evaluated.
        scale : Scale
        born : (c,) array of int
            Weight whose member was the parent; at home there if all weights are the same.
        turn : (c,) array of int
            Order in which they compete.
        shuffle : (c, reach) array of int
            Order in which each tries the ``reach`` members near its home.
        """
        violation = _tolerated(scale.violation(constraints), scale.tolerance)
        value = self.scalar(scale.normalised(objectives))
        if not self.filled:
            chosen = _spread(violation, value)
            self.unit, self.objectives = unit[chosen], objectives[chosen]
            self.constraints = constraints[chosen]
            return
        member_violation = _tolerated(scale.violation(self.constraints), scale.tolerance)
        member_value = self._own(scale.normalised(self.objectives))
        near_of = self._near[born if self._single else np.argmin(value, axis=1)]
        near_of = np.take_along_axis(near_of, shuffle, axis=1)
        owner = np.full(len(self._near), -1)
        for child in turn.tolist():
            near = near_of[child]
            own = value[child]
            here, there = violation[child], member_violation[near]
            better = (here < there) | ((here == there) & (own[near] < member_value[near]))
            won = near[better][:REPLACED]
            if won.size:
                member_violation[won] = here
                member_value[won] = own[won]
                owner[won] = child
        taken = np.flatnonzero(owner >= 0)
        self.unit[taken] = unit[owner[taken]]
        self.objectives[taken] = objectives[owner[taken]]
        self.constraints[taken] = constraints[owner[taken]]

    def _own(self, normalised: FloatArray) -> FloatArray:
        """Value (N,) of each member for its own weight."""
        terms = normalised * self._inverse
        return np.asarray(terms.max(axis=1) + MEAN_SHARE * terms.mean(axis=1))


def _tolerated(violation: FloatArray, tolerance: float) -> FloatArray:
    return np.where(violation <= tolerance, 0.0, violation)


def _spread(violation: FloatArray, value: FloatArray) -> IntArray:
    """Give each weight the best design not yet given away, then again from the start."""
    count = value.shape[1]
    chosen = np.zeros(count, dtype=np.int64)
    free = np.ones(len(value), dtype=np.bool_)
    for weight in range(count):
        if not free.any():
            free[:] = True
        left = np.flatnonzero(free)
        best = left[np.lexsort((value[left, weight], violation[left]))[0]]
        chosen[weight] = best
        free[best] = False
    return chosen
