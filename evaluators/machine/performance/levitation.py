"""Levitation: demands on the suspension and what it supplies."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from evaluators.machine.drive.inverter import Turns
from evaluators.machine.field import Excitation
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.levitation import (
    displacement_zones,
    force_slew_rate,
    power_bandwidth,
    unstable_pole,
)
from evaluators.machine.mechanics.balance import residual_unbalance
from evaluators.machine.performance.operating import Operating
from evaluators.machine.quantity import FloatArray
from evaluators.machine.task.task import Task


def metrics(
    task: Task,
    sections: CrossSections,
    exciting: Excitation,
    state: Operating,
    turns: Turns,
    known: Mapping[str, FloatArray],
) -> dict[str, FloatArray]:
    """Metrics of levitation.

    The demands count at once and in one direction. At lift-off the rotor stands still, so the
    slots are free for the rated suspension current. What the inverter can change the suspension
    current with is its whole voltage less that of the duty and the residual torque voltage.
    """
    duty, field, length = task.duty, state.field, state.length
    weight, mass = known["rotor_weight_N"], known["rotor_mass_kg"]
    carried = weight if duty.orientation == "horizontal" else np.zeros_like(weight)
    force = field.force * length
    peak = exciting.torque + exciting.suspension
    rated = field.force_per_ampere_turn * duty.rated_suspension_share * peak * length
    stiffness = field.displacement_stiffness * length
    touchdown = task.rotor.touchdown_ratio * (sections.bore_radius - sections.rotor_radius)
    pull = stiffness * task.rotor.eccentricity_ratio * touchdown
    highest = duty.speed * duty.highest_speed_ratio
    unbalance = residual_unbalance(duty.balance_grade, mass, highest, highest).force
    demand = carried + unbalance + pull + duty.process_force
    whole_voltage = duty.dc_link_voltage / np.sqrt(3.0)
    left = (
        whole_voltage - known["phase_voltage_V"] - known["residual_voltage"] * known["back_emf_V"]
    )
    slew = force_slew_rate(
        known["force_per_ampere_N_A"],
        turns.groups * left,
        1e-3 * known["suspension_inductance_mH"],
    )
    pole = unstable_pole(stiffness, mass)
    bandwidth = power_bandwidth(slew, force)
    return {
        "force_per_weight": force / weight,
        "rated_force_N": rated,
        "unbalance_force_N": unbalance,
        "magnetic_pull_N": pull,
        "suspension_demand_N": demand,
        "suspension_ratio": force / demand,
        "rated_suspension_ratio": rated / demand,
        "lift_off_ratio": rated / (carried + stiffness * touchdown),
        "force_slew_N_ms": 1e-3 * slew,
        "control_bandwidth_Hz": bandwidth,
        "unstable_pole_Hz": pole,
        "bandwidth_ratio": bandwidth / pole,
        "zone_a_displacement_um": 1e6 * displacement_zones(touchdown)["A"],
    }
