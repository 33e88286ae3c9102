"""One family of a study as the search sees it: variables, objectives to minimise, margins."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from evaluators import interface
from evaluators.machine.geometry.variables import VARIABLES
from evaluators.machine.metrics import METRIC
from evaluators.machine.task.task import Task
from optimizer.problem import Column, Outcome, Variable
from studies.errors import StudiesError
from studies.study_file.crosschecks import Bounds, Limit, Objective
from studies.study_file.definition import Study

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class MachineProblem:
    """Problem of one family; satisfies `optimizer.problem.Problem`.

    Objectives are minimised: one to be maximised enters with its sign turned. A limit becomes the
    margin g, feasible at g <= 0: (value - limit) / scale for ``at_most``, (limit - value) / scale
    for ``at_least``, where scale is the size of the limit, or 1 for a limit of zero. The
    evaluator is built on first use in each process and does not travel between processes.
    `allow_program` is the user's consent to start the program that the settings name, if any.
    """

    task: Task
    bounds: tuple[tuple[str, Bounds], ...]
    goals: tuple[Objective, ...]
    limits: tuple[Limit, ...]
    evaluator_name: str
    evaluator_settings: dict[str, Any]
    allow_program: bool = False
    _built: dict[str, interface.Evaluator] = field(default_factory=dict, repr=False, compare=False)

    @property
    def evaluator(self) -> interface.Evaluator:
        """The evaluator of this process.

        Raises
        ------
        evaluators.interface.EvaluatorError
            If it is not installed or rejects its settings.
        """
        if not self._built:
            self._built["evaluator"] = interface.build(
                self.evaluator_name, self.task, self.evaluator_settings, self.allow_program
            )
        return self._built["evaluator"]

    def __getstate__(self) -> dict[str, Any]:
        return {**self.__dict__, "_built": {}}

    @property
    def variables(self) -> tuple[Variable, ...]:
        """All design variables in the registry's order, fixed ones with equal bounds."""
        return tuple(Variable(name, low, high) for name, (low, high) in self.bounds)

    @property
    def objectives(self) -> tuple[str, ...]:
        """Names of the objectives."""
        return tuple(goal.name for goal in self.goals)

    @property
    def constraints(self) -> tuple[str, ...]:
        """Names of the margins, such as ``torque_ripple_at_most``."""
        return tuple(limit.name for limit in self.limits)

    @property
    def columns(self) -> tuple[Column, ...]:
        """Every metric of the evaluator, with unit and definition."""
        return tuple(
            Column(name, METRIC[name].unit, "metric", METRIC[name].definition)
            for name in self.evaluator.metrics
        )

    def check(self) -> None:
        """Check that the evaluator returns every metric the study asks for.

        Raises
        ------
        StudiesError
            Naming the metrics it does not return.
        """
        asked = {limit.metric for limit in self.limits}
        asked |= {metric for goal in self.goals for metric, _ in goal.terms}
        missing = sorted(asked - set(self.evaluator.metrics))
        if missing:
            msg = (
                f"the evaluator {self.evaluator_name!r} does not return {', '.join(missing)}; "
                "take these out of limits and objectives, or choose another evaluator"
            )
            raise StudiesError(msg)

    def evaluate(self, x: FloatArray) -> Outcome:
        """Evaluate designs (n, v) in the units of the variables' names."""
        designs = {
            name: np.ascontiguousarray(x[:, column]) for column, (name, _) in enumerate(self.bounds)
        }
        found = self.evaluator.evaluate(designs)
        rows = len(x)
        objectives = np.zeros((rows, len(self.goals)))
        for column, goal in enumerate(self.goals):
            objectives[:, column] = goal.sign * sum(
                weight * found.metrics[metric] for metric, weight in goal.terms
            )
        constraints = np.zeros((rows, len(self.limits)))
        for column, limit in enumerate(self.limits):
            constraints[:, column] = margin(limit, found.metrics[limit.metric])
        return Outcome(
            objectives,
            constraints,
            found.status,
            found.reason,
            {name: found.metrics[name] for name in self.evaluator.metrics},
        )


def margin(limit: Limit, value: FloatArray) -> FloatArray:
    """Dimensionless margin of metric values against `limit`, feasible at <= 0."""
    over = value - limit.value if limit.kind == "at_most" else limit.value - value
    return np.asarray(over / limit.scale)


def machine_problem(study: Study, family: str, allow_program: bool = False) -> MachineProblem:
    """Problem of the family with this id."""
    bounds = study.bounds[family]
    return MachineProblem(
        task=study.task(family),
        bounds=tuple((item.name, bounds[item.name]) for item in VARIABLES),
        goals=study.objectives,
        limits=study.limits,
        evaluator_name=study.evaluator.name,
        evaluator_settings=dict(study.evaluator.settings),
        allow_program=allow_program,
    )
