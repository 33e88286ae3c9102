"""All metrics of a batch of machines, topic by topic."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.drive.inverter import Turns, choose_turns
from evaluators.machine.drive.wire import Strands, choose_strands
from evaluators.machine.field import Excitation, FieldSolution
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.metrics import METRICS
from evaluators.machine.performance import (
    bending,
    circuit,
    fields,
    heat,
    levitation,
    losses,
    magnets,
    mechanics,
    size,
)
from evaluators.machine.performance.operating import Operating, settle, study_temperatures
from evaluators.machine.quantity import FloatArray
from evaluators.machine.task.task import Task

LONGEST_STACK = 20.0  # m; a longer one means that the cross-section makes no torque to speak of

# Whole strands change the copper area after the turns are chosen, and with it temperatures and
# voltage a little; so much of the voltage is kept for that.
VOLTAGE_KEPT = 2e-3
ROUGHLY = 0.3  # K, to which temperatures settle before the turns are chosen


@dataclass(frozen=True)
class Performance:
    """Metrics (n,) by name, and a reason (n,) where a design cannot do the duty at all."""

    metrics: Mapping[str, FloatArray]
    reasons: NDArray[np.str_]


def performance(
    task: Task, sections: CrossSections, exciting: Excitation, field: FieldSolution
) -> Performance:
    """All metrics of n designs from their cross-section, excitation and field.

    Parameters
    ----------
    task : Task
    sections : CrossSections
        Of n designs.
    exciting : Excitation
        Peak ampere-turns (n,).
    field : FieldSolution
        Solved with the magnets at the study's temperature; fluxes, torque and forces follow the
        remanence to the temperature the magnets take (`performance.remanence`).
    """
    whole = _strands(task, sections, np.ones(len(sections)))  # as if turns could be broken
    start = study_temperatures(task, len(sections))
    first = settle(task, sections, exciting, field, whole, start, ROUGHLY)
    turns = _turns(task, sections, exciting, first, whole)
    strands = _strands(task, sections, turns.per_coil)
    state = settle(task, sections, exciting, field, strands, first.temperatures)
    metrics: dict[str, FloatArray] = {}
    metrics |= fields.metrics(task, sections, state)
    metrics |= circuit.metrics(task, sections, exciting, state, turns, strands)
    metrics |= losses.metrics(task, sections, state)
    metrics |= size.metrics(task, sections, state, strands)
    metrics |= mechanics.metrics(task, sections, state)
    metrics |= bending.metrics(task, sections, state)
    metrics |= levitation.metrics(task, sections, exciting, state, turns, metrics)
    metrics |= heat.metrics(task, sections, state)
    metrics |= magnets.metrics(task, sections, exciting, state, strands)
    reasons = _reasons(task, state, metrics[mechanics.FREE_RING])
    kept = np.where(reasons == "", 1.0, np.nan)
    return Performance({metric.name: metrics[metric.name] * kept for metric in METRICS}, reasons)


def _strands(task: Task, sections: CrossSections, turns: FloatArray) -> Strands:
    """Wires of n designs for turns (n,); both coil sides of a slot are alike."""
    construction = task.construction
    depth = sections.slot_radius - sections.wedge_radius
    wall = 2.0 * depth + sections.slot_area / depth
    room = np.maximum(sections.slot_area - construction.slot_insulation * wall, 1e-9)
    return choose_strands(
        turns,
        0.5 * room,
        0.5 * sections.slot_area * construction.copper_fill,
        construction.strand_diameter,
        construction.wire_grade,
        construction.winding_packing,
    )


def _turns(
    task: Task,
    sections: CrossSections,
    exciting: Excitation,
    state: Operating,
    strands: Strands,
) -> Turns:
    voltage = circuit.one_turn(task, sections, exciting, state, strands).voltage
    limit = task.duty.phase_voltage_limit * (1.0 - VOLTAGE_KEPT)
    return choose_turns(
        voltage.torque + voltage.suspension, limit, task.construction.parallel_groups
    )


def _reasons(task: Task, state: Operating, free_ring: FloatArray) -> NDArray[np.str_]:
    """Why a design cannot do the duty at all, (n,), empty where it can."""
    reasons = mechanics.refusals(task, free_ring).astype(object)
    for row in np.flatnonzero(~state.settled):
        reasons[row] = (
            f"the temperatures did not settle: after {state.rounds} rounds they still change by "
            f"{state.change[row]:.2g} K"
        )
    able = (state.net_torque > 0.0) & (state.length <= LONGEST_STACK)
    reasons[~able] = (
        "the cross-section makes too little torque: the stack would be longer than 20 m"
    )
    return reasons.astype(np.str_)
