"""Dimensions, masses and cost."""

from __future__ import annotations

import numpy as np

from evaluators.machine.cost import SCENARIOS, active_material_cost
from evaluators.machine.drive.wire import Strands
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.geometry.mass import active_masses
from evaluators.machine.performance.operating import Operating
from evaluators.machine.quantity import FloatArray
from evaluators.machine.task.task import STANDARD_GRAVITY, Task


def metrics(
    task: Task, sections: CrossSections, state: Operating, strands: Strands
) -> dict[str, FloatArray]:
    """Metrics of size, mass and cost."""
    length = state.length
    copper = 2.0 * task.winding.family.slots * strands.copper_area
    masses, active = active_masses(task, sections, length, copper)
    rotor = active + added_rotor_mass(task, sections)
    cost = {scenario: active_material_cost(masses, task.prices, scenario) for scenario in SCENARIOS}
    return {
        "stack_length_mm": 1e3 * length,
        "outer_diameter_mm": 2e3 * sections.outer_radius,
        "length_ratio": length / (2.0 * sections.bore_radius),
        "mass_kg": np.sum(list(masses.values()), axis=0),
        "magnet_mass_kg": masses["magnet"],
        "rotor_mass_kg": rotor,
        "rotor_weight_N": STANDARD_GRAVITY * rotor,
        "cost": cost["base"],
        "cost_low": cost["low"],
        "cost_high": cost["high"],
    }


def added_rotor_mass(task: Task, sections: CrossSections) -> FloatArray:
    """Mass of shaft ends and mounted parts, (n,) kg."""
    ends = task.rotor.ends(sections.shaft_radius, sections.rotor_radius)
    density = float(task.materials.shaft.density.value)
    steel = np.pi * ends.radius**2 * (ends.drive_length + ends.free_length) * density
    return np.asarray(steel + task.rotor.overhung_mass + task.rotor.free_end_mass)
