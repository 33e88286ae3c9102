"""Turns, wires, currents and voltages."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from evaluators.machine.drive.inverter import PhaseVoltage, Turns, phase_voltage
from evaluators.machine.drive.wire import Strands
from evaluators.machine.field import Excitation
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.performance.operating import Operating, held
from evaluators.machine.quantity import MU_0, FloatArray
from evaluators.machine.task.task import Task

END_TURN_PERMEANCE = 0.3
"""Leakage permeance of end turns per length; 0.2 to 0.4 in the tables of Pyrhonen, Jokinen,
Hrabovcova, Design of Rotating Electrical Machines, 2014, ch. 4 (from memory)."""


class OneTurn(NamedTuple):
    """One phase with one turn per coil, all coils in series, arrays (n,), SI units."""

    emf: FloatArray
    resistance: FloatArray
    torque_inductance: FloatArray
    suspension_inductance: FloatArray
    voltage: PhaseVoltage


def one_turn(
    task: Task,
    sections: CrossSections,
    exciting: Excitation,
    state: Operating,
    strands: Strands,
) -> OneTurn:
    """Circuit of one turn per coil: with N turns every voltage is N times as high."""
    field, length = state.field, state.length
    coils = task.winding.family.slots / 3.0
    omega = 2.0 * np.pi * task.electrical_frequency
    end_length = sections.end_turn_length(task.construction)
    # Pyrhonen et al. 2014, ch. 4: 4 m/Q q N^2 mu0 l lambda, N = coils in series, one turn each.
    end_inductance = (
        2.0 / task.winding.family.pole_pairs * coils**2 * MU_0 * end_length * END_TURN_PERMEANCE
    )
    conductor = task.materials.conductor.resistivity
    in_slot = conductor.at(held(state.temperature("winding"))) * length
    at_end = conductor.at(held(state.temperature("end_turns"))) * end_length
    resistance = coils * 2.0 * (in_slot + at_end) / strands.copper_area
    torque = field.torque_inductance * length + end_inductance
    suspension = field.suspension_inductance * length + end_inductance
    emf = omega * field.flux_linkage * length
    voltage = phase_voltage(
        emf, resistance, omega * torque, omega * suspension, exciting.torque, exciting.suspension
    )
    return OneTurn(emf, resistance, torque, suspension, voltage)


def metrics(
    task: Task,
    sections: CrossSections,
    exciting: Excitation,
    state: Operating,
    turns: Turns,
    strands: Strands,
) -> dict[str, FloatArray]:
    """Metrics of winding, current and voltage.

    Terminal values of the torque current count the groups in parallel; the suspension current
    runs through both groups one after the other whatever their connection. The suspension voltage
    comes on top of the torque voltage in the worst group (Chiba et al. 2005).
    """
    one = one_turn(task, sections, exciting, state, strands)
    number, groups = turns
    scale = number / groups
    torque_current, suspension_current = exciting.torque / number, exciting.suspension / number
    voltage = scale * (one.voltage.torque + one.voltage.suspension)
    coil_current = np.sqrt(0.5 * (torque_current**2 + suspension_current**2))
    terminal = groups * torque_current + suspension_current
    return {
        "turns_per_coil": number,
        "parallel_groups": groups,
        "strands_per_turn": strands.per_turn,
        "wire_diameter_mm": 1e3 * strands.diameter,
        "copper_fill": 2.0 * strands.copper_area / sections.slot_area,
        "slot_occupation": strands.occupied,
        "conductor_density_A_mm2": 1e-6 * number * coil_current / strands.copper_area,
        "phase_current_A": coil_current,
        "torque_current_A": groups * torque_current / np.sqrt(2.0),
        "suspension_current_A": suspension_current / np.sqrt(2.0),
        "back_emf_V": scale * one.emf,
        "phase_voltage_V": voltage,
        "voltage_use": voltage / task.duty.phase_voltage_limit,
        "power_factor": one.voltage.power_factor,
        "inverter_rating_kVA": 1.5e-3 * voltage * terminal,
        "torque_inductance_mH": 1e3 * scale**2 * one.torque_inductance,
        "suspension_inductance_mH": 1e3 * number**2 * one.suspension_inductance,
        "force_per_ampere_N_A": number * state.field.force_per_ampere_turn * state.length,
    }
