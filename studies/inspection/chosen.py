"""One stored design with everything needed to evaluate and draw it again."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from evaluators.interface import Capability, Waveform
from evaluators.machine.geometry.cross_sections import CrossSections, cross_sections
from evaluators.machine.geometry.variables import VARIABLE_NAMES
from evaluators.machine.task.task import Task
from optimizer.problem import Outcome, join_outcomes
from optimizer.workers.dispatch import Chunk, Dispatcher
from studies.consent import require_consent
from studies.errors import ResultsError
from studies.inspection.design import Inspection, inspect_design
from studies.problem import MachineProblem, machine_problem
from studies.running.evaluating import made_dispatcher
from studies.stored.layout import Results

FloatArray = NDArray[np.float64]

QUICK_EVALUATOR = "analytic"  # takes milliseconds a design, so large batches cost little
QUICK_CHUNK = 256
SLOW_CHUNK = 8


@dataclass(frozen=True)
class Chosen:
    """A design that was evaluated, whether it meets the limits or not.

    Attributes
    ----------
    results : Results
    found : Inspection
        What is stored of it.
    problem : MachineProblem
        Its family, with the evaluator asked for.
    """

    results: Results
    found: Inspection
    problem: MachineProblem

    @property
    def design(self) -> str:
        """Its id."""
        return self.found.design

    @property
    def task(self) -> Task:
        """What its evaluator is built for."""
        return self.problem.task

    @property
    def values(self) -> dict[str, float]:
        """Its variables, in the units of their names."""
        return {name: float(self.found.row[name]) for name in VARIABLE_NAMES}

    @property
    def point(self) -> FloatArray:
        """Its variables (v,) in the order of the problem."""
        return np.array([self.values[item.name] for item in self.problem.variables])

    def metric(self, name: str) -> float:
        """A stored metric.

        Raises
        ------
        ResultsError
            If the evaluator that made the row does not return it.
        """
        value = self.found.row.get(name)
        if value is None:
            msg = f"{self.design}: {name} is not stored; its evaluator does not return it"
            raise ResultsError(msg)
        return float(value)

    @cached_property
    def sections(self) -> CrossSections:
        """Its cross-section, a batch of one."""
        batch = {name: np.array([value]) for name, value in self.values.items()}
        family, construction = self.task.winding.family, self.task.construction
        sections, _, _ = cross_sections(family, batch, construction)
        return sections

    @cached_property
    def waveforms(self) -> Mapping[str, Waveform]:
        """Waveforms by name, as the evaluator gives them; none if it gives none."""
        if Capability.WAVEFORMS not in self.problem.evaluator.capabilities:
            return {}
        return {item.name: item for item in self.problem.evaluator.waveforms(self.values)}

    @property
    def broken_limits(self) -> list[str]:
        """Limits it breaks, as a reader would say them."""
        row = self.found.row
        return [item.text() for item in self.found.limits if row[f"margin:{item.name}"] > 0.0]


def choose_design(
    results: Results, design: str, evaluator: str = "", allow_program: bool = False
) -> Chosen:
    """Look up a design; `evaluator` names another than the study's.

    Raises
    ------
    ResultsError
        If it is not stored, or could not be evaluated.
    StudiesError, evaluators.interface.EvaluatorError
        If the evaluator is not installed or lacks metrics the study asks for.
    """
    found = inspect_design(results, design)
    if not found.evaluated:
        msg = (
            f"{found.design}: could not be evaluated ({found.row['status']}: "
            f"{found.row['reason']}); choose a design with status ok"
        )
        raise ResultsError(msg)
    problem = machine_problem(results.study, found.winding.family.id, allow_program)
    return Chosen(results, found, with_evaluator(problem, evaluator))


def with_evaluator(problem: MachineProblem, evaluator: str) -> MachineProblem:
    """The problem with another evaluator (default settings), or as it is."""
    if evaluator and evaluator != problem.evaluator_name:
        problem = replace(problem, evaluator_name=evaluator, evaluator_settings={}, _built={})
    problem.check()
    return problem


def dispatcher_for(
    problem: MachineProblem,
    workers: int | None,
    time_limit_s: float | None = None,
    cluster: str = "",
) -> Dispatcher:
    """What evaluates; by default this process for the quick evaluator, else worker processes.

    Parameters as of `studies.running.evaluating.made_dispatcher`.

    Raises
    ------
    StudiesError
        As `made_dispatcher`, or if a program would be started without consent.
    """
    require_consent(problem)
    if workers is None and not cluster and problem.evaluator_name == QUICK_EVALUATOR:
        workers = 1
    return made_dispatcher(problem.evaluator_name, workers, cluster, time_limit_s)


def evaluate_all(problem: MachineProblem, x: FloatArray, dispatcher: Dispatcher) -> Outcome:
    """Evaluate designs (n, v) in chunks that do not depend on the number of workers."""
    size = QUICK_CHUNK if problem.evaluator_name == QUICK_EVALUATOR else SLOW_CHUNK

    def chunks() -> Iterator[Chunk]:
        for start in range(0, len(x), size):
            yield Chunk(start, x[start : start + size])

    parts = sorted(dispatcher.run(problem, chunks()), key=lambda item: item.start)
    return join_outcomes([item.outcome for item in parts])
