"""Evaluating the machines of a draw as they would be built and run."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from optimizer.problem import Outcome, join_outcomes
from optimizer.workers.dispatch import Dispatcher
from studies.inspection.chosen import Chosen, evaluate_all
from studies.problem import MachineProblem, margin
from studies.tolerance.build import built_task, scattered_variables
from studies.tolerance.scatter import Draw

FloatArray = NDArray[np.float64]

CURRENT = "current_density_A_mm2"
LENGTH = "stack_length_mm"
TURNS = "turns_per_coil"
ROUNDS = 3  # evaluations of each machine; the length then agrees to about 1e-4
SMALL_STEP = 1e-6  # of the logarithm of the current, below which no slope can be told
GROUPS = "parallel_groups"
TURN_POWERS = {
    "back_emf_V": (0, 1),
    "phase_voltage_V": (0, 1),
    "voltage_use": (0, 1),
    "phase_current_A": (-1, 0),
    "torque_current_A": (0, -1),
    "suspension_current_A": (-1, 0),
    "force_per_ampere_N_A": (1, 0),
    "torque_inductance_mH": (0, 2),
    "suspension_inductance_mH": (2, 0),
}
"""Metrics that follow from the winding's turns: exponents of turns per coil, and of turns per coil
over parallel groups. Copper area and all else are taken as they are."""


@dataclass(frozen=True)
class Machines:
    """Scattered machines of one design.

    Attributes
    ----------
    chosen : Chosen
    draw : Draw
    outcome : Outcome
        n rows, with the design's own length and turns.
    length_error : float
        Largest relative difference left between the length an evaluation asks for and the
        design's.
    """

    chosen: Chosen
    draw: Draw
    outcome: Outcome
    length_error: float


def built_machines(chosen: Chosen, draw: Draw, dispatcher: Dispatcher) -> Machines:
    """Evaluate all machines, lot by lot.

    An evaluation sizes stack and turns for its duty; a built machine has the design's. So the
    current density is changed until the duty's torque needs the design's length, and what depends
    on the turns is scaled to the design's.
    """
    length = chosen.metric(LENGTH)
    interference = chosen.found.row.get("sleeve_interference_um")
    variables = scattered_variables(chosen.sections, draw)
    count = len(draw.lot)
    names = [item.name for item in chosen.problem.variables]
    x = np.empty((count, len(names)))
    for column, name in enumerate(names):
        x[:, column] = chosen.values[CURRENT] if name == CURRENT else variables[name]
    order: list[NDArray[np.int64]] = []
    parts: list[Outcome] = []
    worst = 0.0
    for lot in np.unique(draw.lot):
        rows = np.flatnonzero(draw.lot == lot)
        task = built_task(chosen.task, interference, draw, int(rows[0]))
        problem = replace(chosen.problem, task=task, _built={})
        outcome, error = _held(problem, x[rows], names.index(CURRENT), length, dispatcher)
        order.append(rows)
        parts.append(outcome)
        worst = max(worst, error)
    back = np.argsort(np.concatenate(order))
    joined = join_outcomes(parts).rows(back)
    return Machines(chosen, draw, hold_turns(chosen, joined), worst)


def _held(
    problem: MachineProblem, x: FloatArray, current: int, length: float, dispatcher: Dispatcher
) -> tuple[Outcome, float]:
    """Evaluate at the current that makes the duty's torque with the given length.

    The length falls about as the inverse of the current, a little faster because the drag of iron
    and rotor hardly depends on it: the first step takes it as the inverse, the others are secants
    between logarithms.
    """
    x = x.copy()
    power = np.ones(len(x))  # of the current with which the length falls
    step = excess = np.zeros(len(x))
    for number in range(ROUNDS):
        outcome = evaluate_all(problem, x, dispatcher)
        before, excess = excess, np.log(np.asarray(outcome.columns[LENGTH]) / length)
        if number == ROUNDS - 1:
            break
        moved = np.isfinite(excess) & (np.abs(step) > SMALL_STEP)
        power[moved] = np.clip((before - excess)[moved] / step[moved], 0.5, 2.0)
        step = np.where(np.isfinite(excess), excess / power, 0.0)
        x[:, current] *= np.exp(step)
    left = np.abs(np.expm1(excess[outcome.ok]))
    return outcome, float(left.max()) if left.size else 0.0


def hold_turns(chosen: Chosen, outcome: Outcome) -> Outcome:
    """The outcome with the design's turns: metrics, margins and objectives."""
    columns = {name: np.asarray(values) for name, values in outcome.columns.items()}
    turns = chosen.metric(TURNS) / columns[TURNS]
    groups = np.ones(len(outcome))
    if GROUPS in columns and chosen.found.row.get(GROUPS) is not None:
        groups = chosen.metric(GROUPS) / columns[GROUPS]
        columns[GROUPS] = columns[GROUPS] * groups
    for name, (by_turns, by_series) in TURN_POWERS.items():
        if name in columns:
            columns[name] = columns[name] * turns**by_turns * (turns / groups) ** by_series
    columns[TURNS] = columns[TURNS] * turns
    problem = chosen.problem
    constraints = np.column_stack(
        [margin(limit, columns[limit.metric]) for limit in problem.limits]
        or [np.zeros((len(outcome), 0))]
    )
    objectives = np.column_stack(
        [
            goal.sign * np.sum([weight * columns[name] for name, weight in goal.terms], axis=0)
            for goal in problem.goals
        ]
    )
    return Outcome(objectives, constraints, outcome.status, outcome.reason, columns)
