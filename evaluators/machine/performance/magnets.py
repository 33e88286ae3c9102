"""Demagnetisation at the duty and in a fault."""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from evaluators.machine.demagnetisation import ArmatureReaction, short_circuit_peak
from evaluators.machine.drive.wire import Strands
from evaluators.machine.field import Excitation
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.performance.circuit import one_turn
from evaluators.machine.performance.operating import Operating, held
from evaluators.machine.quantity import FloatArray
from evaluators.machine.task.task import Task
from evaluators.machine.winding.winding import Winding


def metrics(
    task: Task,
    sections: CrossSections,
    exciting: Excitation,
    state: Operating,
    strands: Strands,
) -> dict[str, FloatArray]:
    """Metrics of the magnets' working point.

    The fault current counts on top of the density at the duty, whose torque current it replaces:
    a little too harsh where that current already weakens an edge of the magnets.
    """
    hot, magnet = held(state.temperature("magnets")), task.materials.magnet
    # A magnet so hot that its coercivity is used up has its knee at the remanence.
    knee = np.minimum(magnet.knee_flux_density(hot), magnet.remanence.at(hot))
    lowest = state.field.magnet_flux_density
    fault = fault_ampere_turns(task, sections, exciting, state, strands)
    reaction = armature_reaction(task.winding).per_ampere_turn(
        sections.core_radius,
        sections.magnet_radius,
        sections.bore_radius,
        sections.slot_opening_angle,
    )
    in_fault = lowest - reaction * fault
    return {
        "knee_flux_density_T": knee,
        "demagnetisation_margin_T": lowest - knee,
        "fault_current_ratio": fault / exciting.torque,
        "fault_magnet_flux_density_T": in_fault,
        "fault_demagnetisation_margin_T": in_fault - knee,
    }


def fault_ampere_turns(
    task: Task,
    sections: CrossSections,
    exciting: Excitation,
    state: Operating,
    strands: Strands,
) -> FloatArray:
    """Peak ampere-turns of one coil against the magnets in the stated fault, (n,) A."""
    if task.fault.kind == "current":
        return np.asarray(task.fault.current_ratio * exciting.torque)
    one = one_turn(task, sections, exciting, state, strands)
    omega = 2.0 * np.pi * task.electrical_frequency
    return short_circuit_peak(
        one.emf, exciting.torque, one.resistance, omega * one.torque_inductance
    )


@lru_cache(maxsize=32)
def _cached(winding_key: WindingKey) -> ArmatureReaction:
    return ArmatureReaction.of(winding_key.winding)


class WindingKey:
    """A winding as a key: equal families of one programme have equal windings by content."""

    def __init__(self, winding: Winding) -> None:
        self.winding = winding
        self._content = (
            winding.family,
            winding.phase.tobytes(),
            winding.group.tobytes(),
            winding.sense.tobytes(),
        )

    def __hash__(self) -> int:
        return hash(self._content)

    def __eq__(self, other: object) -> bool:
        return isinstance(other, WindingKey) and self._content == other._content


def armature_reaction(winding: Winding) -> ArmatureReaction:
    """Armature reaction of a winding, prepared once for each layout."""
    return _cached(WindingKey(winding))
