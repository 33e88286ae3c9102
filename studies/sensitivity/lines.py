"""One variable at a time: lines through a design."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from optimizer.problem import Outcome, Variable
from optimizer.workers.dispatch import Dispatcher
from studies.inspection.chosen import evaluate_all
from studies.problem import MachineProblem
from studies.study_file.crosschecks import VARIABLE

FloatArray = NDArray[np.float64]

AROUND_FIXED = 0.1  # a variable the study fixes is moved by this share of its value


@dataclass(frozen=True)
class Line:
    """The design moved along one variable.

    Attributes
    ----------
    variable : str
    fixed : bool
        Whether the study fixes this variable; the line then runs `AROUND_FIXED` to both sides.
    values : array (k,)
        Increasing; the design's own value is one of them.
    at : int
        Where it is.
    outcome : Outcome
        k rows.
    """

    variable: str
    fixed: bool
    values: FloatArray
    at: int
    outcome: Outcome

    def elasticity(self, metric: FloatArray) -> float:
        """Relative change of a metric (k,) over relative change of the variable, at the design.

        d ln|y| / d ln x by the second-order difference on the uneven grid of the neighbours, or
        the one-sided one at an end; NaN if a neighbour failed or y is zero.
        """
        here = slice(max(0, self.at - 1), self.at + 2)
        x, y = self.values[here], metric[here]
        centre = metric[self.at]
        if len(x) < 2 or not np.isfinite(y).all() or centre == 0.0:
            return float("nan")
        return float(np.gradient(y, x)[self.at - here.start] * self.values[self.at] / centre)


def line_values(variable: Variable, value: float, points: int) -> tuple[FloatArray, int]:
    """Points of one line, and the place of the design's own value among them.

    The point of an even grid that lies nearest to the design is moved onto it, so a line costs
    `points` evaluations.
    """
    low, high = variable.lower, variable.upper
    if low == high:
        registered = VARIABLE[variable.name]
        low = max(registered.lowest, value * (1.0 - AROUND_FIXED))
        high = min(registered.highest, value * (1.0 + AROUND_FIXED))
    values = np.linspace(min(low, value), max(high, value), points)
    at = int(np.argmin(np.abs(values - value)))
    values[at] = value
    return values, at


def lines_through(
    problem: MachineProblem, design: Mapping[str, float], points: int, dispatcher: Dispatcher
) -> tuple[Line, ...]:
    """One line for each variable, all evaluated as one batch.

    Parameters
    ----------
    problem : MachineProblem
    design : mapping of variable name to value
    points : int
        Of each line, at least 3.
    dispatcher : Dispatcher

    Raises
    ------
    ValueError
        If `points` is below 3.
    """
    if points < 3:
        msg = f"points = {points} must be at least 3: one on each side of the design"
        raise ValueError(msg)
    centre = np.array([design[item.name] for item in problem.variables])
    grids = [
        line_values(item, value, points)
        for item, value in zip(problem.variables, centre.tolist(), strict=True)
    ]
    x = np.tile(centre, (points * len(grids), 1))
    for column, (values, _) in enumerate(grids):
        x[column * points : (column + 1) * points, column] = values
    outcome = evaluate_all(problem, x, dispatcher)
    return tuple(
        Line(
            variable=item.name,
            fixed=item.lower == item.upper,
            values=values,
            at=at,
            outcome=outcome.rows(np.arange(column * points, (column + 1) * points)),
        )
        for column, (item, (values, at)) in enumerate(zip(problem.variables, grids, strict=True))
    )
