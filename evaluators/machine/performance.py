"""From the field of one slice to the metrics of the whole machine, the same for all evaluators.

The stack is as long as the duty's torque needs, the coils have as many whole turns as the DC link
allows; losses, masses, stresses, levitation and cost follow.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.machine import materials
from evaluators.machine.balance import residual_unbalance
from evaluators.machine.cost import active_material_cost
from evaluators.machine.field import Excitation, FieldSolution
from evaluators.machine.friction import disc_power, gap_power
from evaluators.machine.gas import gas_state
from evaluators.machine.geometry import CrossSections
from evaluators.machine.losses.copper import slot_loss, strand_factor
from evaluators.machine.mass import active_masses
from evaluators.machine.material_kinds import Gas
from evaluators.machine.mechanics import tip_speed
from evaluators.machine.metrics import METRICS
from evaluators.machine.quantity import MU_0
from evaluators.machine.sleeve import RotorSection, required_interference, sleeve_stress
from evaluators.machine.task import STANDARD_GRAVITY, Task

FloatArray = NDArray[np.float64]

END_TURN_PERMEANCE = 0.3
"""Leakage permeance of end turns per length; 0.2 to 0.4 in the tables of Pyrhonen, Jokinen,
Hrabovcova, Design of Rotating Electrical Machines, 2014, ch. 4 (from memory)."""
ASSEMBLY_TEMPERATURE = 20.0  # degC, at which interference is stated
LONGEST_STACK = 20.0  # m; a longer one means that the cross-section makes no torque to speak of


@dataclass(frozen=True)
class Performance:
    """Metrics (n,) by name, and a reason (n,) where a design cannot do the duty at all."""

    metrics: Mapping[str, FloatArray]
    reasons: NDArray[np.str_]


def performance(
    task: Task, sections: CrossSections, exciting: Excitation, field: FieldSolution
) -> Performance:
    """All metrics of n designs from their cross-section, excitation and field."""
    length, friction = _length_and_friction(task, sections, field)
    reasons = np.where(
        (length > 0.0) & (length <= LONGEST_STACK),
        "",
        "the cross-section makes too little torque: the stack would be longer than 20 m",
    )
    length = np.where(reasons == "", length, np.nan)
    metrics: dict[str, FloatArray] = {}
    metrics |= _fields(task, sections, field, length)
    metrics |= _circuit(task, sections, exciting, field, length)
    metrics |= _losses(task, sections, exciting, field, length, friction)
    metrics |= _mechanics(task, sections)
    metrics |= _size(task, sections, length)
    metrics |= _levitation(task, sections, exciting, field, length, metrics)
    speed = task.duty.speed
    metrics["torque_Nm"] = task.duty.shaft_torque + friction / speed
    metrics["torque_density_Nm_L"] = metrics["torque_Nm"] / (
        1e3 * np.pi * sections.outer_radius**2 * length
    )
    iron_and_copper = metrics["loss_copper_W"] + metrics["loss_iron_W"]
    surface = 2.0 * np.pi * sections.outer_radius * length
    metrics["surface_loss_W_cm2"] = 1e-4 * iron_and_copper / surface
    return Performance({metric.name: metrics[metric.name] for metric in METRICS}, reasons)


def _length_and_friction(
    task: Task, sections: CrossSections, field: FieldSolution
) -> tuple[FloatArray, FloatArray]:
    """Stack length for shaft torque and air friction together, m, and the friction, W.

    Friction of the gap grows with the length, that of the end faces does not, so the balance
    torque' L = (P + faces + gap' L) / speed is linear in the length L.
    """
    speed, conditions = task.duty.speed, task.conditions
    gas = gas_state(materials.load(Gas, "Air"), conditions.gas_temperature, conditions.gas_pressure)
    clearance = sections.bore_radius - sections.rotor_radius
    per_length = gap_power(sections.rotor_radius, clearance, 1.0, speed, gas.density, gas.viscosity)
    faces = disc_power(
        sections.rotor_radius,
        task.construction.end_clearance,
        speed,
        gas.density,
        gas.viscosity,
        sections.shaft_radius,
    )
    net = field.torque - per_length / speed
    length = (task.duty.power + faces) / speed / np.where(net > 0.0, net, np.nan)
    overhang = task.construction.rotor_overhang * per_length
    return np.asarray(length), np.asarray(per_length * length + faces + overhang)


def _fields(
    task: Task, sections: CrossSections, field: FieldSolution, length: FloatArray
) -> dict[str, FloatArray]:
    weights = task.ripple
    angle_deg = np.degrees(field.force_error_angle)
    index = (
        weights.torque_ripple_weight * field.torque_ripple / weights.torque_ripple_limit
        + weights.force_error_weight * field.force_error_magnitude / weights.force_error_limit
        + weights.force_angle_weight * angle_deg / weights.force_angle_limit_deg
    )
    return {
        "torque_ripple": field.torque_ripple,
        "cogging_torque_Nm": field.cogging * length,
        "force_N": field.force * length,
        "force_error_magnitude": field.force_error_magnitude,
        "force_error_angle_deg": angle_deg,
        "residual_voltage": np.full_like(length, task.winding.residual_voltage),
        "ripple_index": index,
        "displacement_stiffness_N_mm": 1e-3 * field.displacement_stiffness * length,
        "gap_flux_density_T": field.gap_flux_density,
        "tooth_flux_density_T": field.tooth_flux_density,
        "yoke_flux_density_T": field.yoke_flux_density,
        "core_flux_density_T": field.core_flux_density,
        "magnet_flux_density_T": field.magnet_flux_density,
        "slot_opening_mm": 1e3 * sections.slot_opening,
    }


def _circuit(
    task: Task,
    sections: CrossSections,
    exciting: Excitation,
    field: FieldSolution,
    length: FloatArray,
) -> dict[str, FloatArray]:
    """Turns, currents and voltages; all coils of a phase in series.

    With n turns per coil the ampere-turns stay and every voltage is n times that of one turn.
    Torque voltage: EMF and resistance in phase with the current, reactance across it. The
    suspension voltage comes on top in the worst group (Chiba et al. 2005).
    """
    slots = task.winding.family.slots
    coils = slots / 3.0
    omega = 2.0 * np.pi * task.electrical_frequency
    end_length = sections.end_turn_length(task.construction)
    # Pyrhonen et al. 2014, ch. 4: 4 m/Q q N^2 mu0 l lambda, N = coils in series, one turn each.
    end_inductance = (
        2.0 / task.winding.family.pole_pairs * coils**2 * MU_0 * end_length * END_TURN_PERMEANCE
    )
    resistivity = float(
        task.materials.conductor.resistivity.at(task.conditions.winding_temperature)
    )
    copper = 0.5 * sections.slot_area * task.construction.copper_fill
    resistance = coils * resistivity * 2.0 * (length + end_length) / copper
    torque_inductance = field.torque_inductance * length + end_inductance
    suspension_inductance = field.suspension_inductance * length + end_inductance
    emf = omega * field.flux_linkage * length
    torque_voltage = np.hypot(
        emf + resistance * exciting.torque, omega * torque_inductance * exciting.torque
    )
    suspension_voltage = exciting.suspension * np.hypot(resistance, omega * suspension_inductance)
    per_turn = torque_voltage + suspension_voltage
    limit = task.duty.phase_voltage_limit
    turns = np.maximum(np.floor(limit / per_turn), 1.0)
    torque_current, suspension_current = exciting.torque / turns, exciting.suspension / turns
    return {
        "turns_per_coil": turns,
        "phase_current_A": np.sqrt(0.5 * (torque_current**2 + suspension_current**2)),
        "back_emf_V": turns * emf,
        "phase_voltage_V": turns * per_turn,
        "voltage_use": turns * per_turn / limit,
        "torque_inductance_mH": 1e3 * turns**2 * torque_inductance,
        "suspension_inductance_mH": 1e3 * turns**2 * suspension_inductance,
        "force_per_ampere_N_A": turns * field.force_per_ampere_turn * length,
    }


def _losses(
    task: Task,
    sections: CrossSections,
    exciting: Excitation,
    field: FieldSolution,
    length: FloatArray,
    friction: FloatArray,
) -> dict[str, FloatArray]:
    construction = task.construction
    resistivity = float(
        task.materials.conductor.resistivity.at(task.conditions.winding_temperature)
    )
    copper = 0.5 * sections.slot_area * construction.copper_fill
    strand_area = 0.25 * np.pi * construction.strand_diameter**2
    depth = sections.slot_radius - sections.wedge_radius
    factor = strand_factor(
        construction.strand_diameter,
        np.maximum(2.0 * copper / strand_area, 1.0),
        sections.slot_area / depth,
        depth,
        task.electrical_frequency,
        resistivity,
    )
    # Both groups of a phase together: the mixed term of the two currents cancels.
    effective = np.sqrt(0.5 * (exciting.torque**2 + exciting.suspension**2))
    turn_length = 2.0 * (factor * length + sections.end_turn_length(construction))
    loss_copper = task.winding.family.slots * slot_loss(effective, turn_length, copper, resistivity)
    teeth, yoke = field.loss_teeth * length, field.loss_yoke * length
    magnet, sleeve = field.loss_magnet * length, field.loss_sleeve * length
    total = loss_copper + teeth + yoke + magnet + sleeve + friction
    return {
        "loss_copper_W": loss_copper,
        "loss_teeth_W": teeth,
        "loss_yoke_W": yoke,
        "loss_iron_W": teeth + yoke,
        "loss_magnet_W": magnet,
        "loss_sleeve_W": sleeve,
        "loss_air_friction_W": friction,
        "loss_total_W": total,
        "efficiency": task.duty.power / (task.duty.power + total),
    }


def _mechanics(task: Task, sections: CrossSections) -> dict[str, FloatArray]:
    """Sleeve at overspeed and temperature, and cold at rest; core and shaft count as one solid."""
    duty, parts, construction = task.duty, task.materials, task.construction
    temperature = task.conditions.sleeve_temperature
    overspeed = duty.speed * duty.overspeed_ratio
    heating = temperature - ASSEMBLY_TEMPERATURE
    rotor = RotorSection.from_materials(
        parts.shaft,
        parts.magnet,
        parts.sleeve,
        core_inner_radius=np.zeros_like(sections.core_radius),
        core_outer_radius=sections.core_radius,
        magnet_outer_radius=sections.magnet_radius,
        sleeve_outer_radius=sections.rotor_radius,
        temperature_C=temperature,
    )
    if construction.sleeve_interference is None:
        needed = required_interference(rotor, overspeed, heating, construction.contact_pressure)
        interference = np.maximum(needed, 0.0)
    else:
        interference = np.full_like(sections.core_radius, construction.sleeve_interference)
    hot = sleeve_stress(rotor, interference, overspeed, heating)
    cold = sleeve_stress(rotor, interference, 0.0, 0.0)
    if parts.sleeve.isotropic:
        stress = np.maximum(hot.equivalent_stress, cold.equivalent_stress)
        strength = parts.sleeve.yield_strength
    else:
        stress = np.maximum(hot.hoop_stress, cold.hoop_stress)
        strength = parts.sleeve.tensile_strength
    return {
        "tip_speed_m_s": tip_speed(sections.rotor_radius, duty.speed),
        "sleeve_interference_um": 1e6 * interference,
        "sleeve_stress_MPa": 1e-6 * stress,
        "sleeve_stress_ratio": stress / float(strength.at(temperature)),
        "contact_pressure_MPa": 1e-6 * hot.core_pressure,
    }


def _size(task: Task, sections: CrossSections, length: FloatArray) -> dict[str, FloatArray]:
    masses, rotor = active_masses(task, sections, length)
    return {
        "stack_length_mm": 1e3 * length,
        "outer_diameter_mm": 2e3 * sections.outer_radius,
        "length_ratio": length / (2.0 * sections.bore_radius),
        "mass_kg": np.sum(list(masses.values()), axis=0),
        "magnet_mass_kg": masses["magnet"],
        "rotor_weight_N": STANDARD_GRAVITY * rotor,
        "cost": active_material_cost(masses, task.prices),
    }


def _levitation(
    task: Task,
    sections: CrossSections,
    exciting: Excitation,
    field: FieldSolution,
    length: FloatArray,
    known: Mapping[str, FloatArray],
) -> dict[str, FloatArray]:
    """Force against weight, lift-off from the touchdown bearings, and unbalance.

    At lift-off the rotor stands still, so the whole slot current may be suspension current.
    """
    duty = task.duty
    weight = known["rotor_weight_N"]
    force = field.force * length
    touchdown = 0.5 * (sections.bore_radius - sections.rotor_radius)
    pull = field.displacement_stiffness * length * touchdown
    whole = field.force_per_ampere_turn * (exciting.torque + exciting.suspension) * length
    carried = weight if duty.orientation == "horizontal" else 0.0
    unbalance = residual_unbalance(
        duty.balance_grade, weight / STANDARD_GRAVITY, duty.speed, duty.speed
    )
    return {
        "force_per_weight": force / weight,
        "lift_off_ratio": whole / (carried + pull),
        "unbalance_force_N": unbalance.force,
    }
