"""Sensitivity of one stored design: what is varied, what is looked at, what comes out."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from optimizer.problem import Outcome
from optimizer.workers.dispatch import Dispatcher
from studies.inspection.chosen import QUICK_EVALUATOR, Chosen, evaluate_all
from studies.sensitivity.indices import BoolArray, Indices, delta_indices, sobol_indices
from studies.sensitivity.lines import Line, lines_through
from studies.stored.families import matrix, stored_family
from studies.study_file.definition import Study

FloatArray = NDArray[np.float64]
Method = Literal["sobol", "delta", "none"]

QUICK_POINTS, SLOW_POINTS = 11, 5
BASE_SAMPLES = 64


@dataclass(frozen=True)
class Sensitivity:
    """Lines through a design, and indices over the box or None."""

    chosen: Chosen
    objectives: tuple[str, ...]
    watched: tuple[str, ...]
    lines: tuple[Line, ...]
    indices: Indices | None

    @property
    def failed(self) -> int:
        """Rows of the lines that could not be evaluated."""
        return sum(int(np.count_nonzero(~line.outcome.ok)) for line in self.lines)


def objective_names(study: Study) -> tuple[str, ...]:
    """Names of the objectives."""
    return tuple(goal.name for goal in study.objectives)


def watched_names(study: Study) -> tuple[str, ...]:
    """Objectives, then the metrics that are limited, each once."""
    limited = [limit.metric for limit in study.limits]
    return tuple(dict.fromkeys([*objective_names(study), *limited]))


def watched_values(study: Study, outcome: Outcome) -> dict[str, FloatArray]:
    """Objectives in their own sense and limited metrics, (n,) each, NaN where failed."""
    values = {
        goal.name: goal.sign * outcome.objectives[:, column]
        for column, goal in enumerate(study.objectives)
    }
    for name in watched_names(study):
        if name not in values:
            values[name] = np.asarray(outcome.columns[name])
    return {name: np.where(outcome.ok, column, np.nan) for name, column in values.items()}


def default_points(chosen: Chosen) -> int:
    """Points of a line: many for the quick evaluator, few for any other."""
    return QUICK_POINTS if chosen.problem.evaluator_name == QUICK_EVALUATOR else SLOW_POINTS


def default_method(chosen: Chosen) -> Method:
    """New samples with the quick evaluator; what is stored with any other."""
    return "sobol" if chosen.problem.evaluator_name == QUICK_EVALUATOR else "delta"


def sensitivity(
    chosen: Chosen,
    dispatcher: Dispatcher,
    points: int,
    method: Method,
    base_samples: int,
    seed: int,
) -> Sensitivity:
    """Lines and indices of a design.

    Raises
    ------
    studies.sensitivity.indices.TooFewError
        If too many rows failed for indices.
    """
    study = chosen.results.study
    lines = lines_through(chosen.problem, chosen.values, points, dispatcher)
    indices = None
    if method == "sobol":
        indices = _sobol(chosen, dispatcher, base_samples, seed)
    elif method == "delta":
        indices = _delta(chosen, seed)
    return Sensitivity(chosen, objective_names(study), watched_names(study), lines, indices)


def _free(chosen: Chosen) -> dict[str, tuple[float, float]]:
    return {
        item.name: (item.lower, item.upper)
        for item in chosen.problem.variables
        if item.lower < item.upper
    }


def _sobol(chosen: Chosen, dispatcher: Dispatcher, base_samples: int, seed: int) -> Indices:
    study, problem = chosen.results.study, chosen.problem
    free = _free(chosen)
    columns = [k for k, item in enumerate(problem.variables) if item.name in free]

    def evaluated(samples: FloatArray) -> tuple[Mapping[str, FloatArray], BoolArray]:
        x = np.tile(chosen.point, (len(samples), 1))
        x[:, columns] = samples
        outcome = evaluate_all(problem, x, dispatcher)
        return watched_values(study, outcome), outcome.ok

    return sobol_indices(evaluated, free, watched_names(study), base_samples, seed)


def _delta(chosen: Chosen, seed: int) -> Indices:
    study = chosen.results.study
    free = _free(chosen)
    stored = stored_family(chosen.results, chosen.task.winding.family.id)
    names = [f"objective:{name}" for name in stored.objectives]
    table = stored.table([*free, *names, "status"])
    objectives = matrix(table, names)
    values = {
        goal.name: goal.sign * objectives[:, column] for column, goal in enumerate(study.objectives)
    }
    usable = np.asarray(table["status"].to_pylist()) == "ok"
    basis = (
        f"designs stored of {stored.family}, evaluated by {study.evaluator.name}; the search has "
        "gathered them where the objectives are good, so they weigh that region more"
    )
    return delta_indices(matrix(table, list(free)), values, usable, free, seed, basis)
