"""Net masses of the active materials."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.task.task import Task

FloatArray = NDArray[np.float64]


def active_masses(
    task: Task, sections: CrossSections, length: FloatArray, copper_area: FloatArray
) -> tuple[dict[str, FloatArray], FloatArray]:
    """Masses of n machines, and that of their rotors alone.

    Parameters
    ----------
    task : Task
    sections : CrossSections
        Of n designs.
    length : array (n,)
        Stack length, m.
    copper_area : array (n,)
        Bare copper of all slots together, m2.

    Returns
    -------
    masses : mapping of the names of `evaluators.machine.cost.Prices.materials` to array (n,)
        kg in the finished machine; rotor parts also cover the rotor overhang.
    rotor : array (n,)
        kg of core, shaft, magnets and sleeve.
    """
    parts, construction = task.materials, task.construction
    rotor_length = length + construction.rotor_overhang
    stacking = float(parts.stator_steel.stacking_factor.value)
    rotor_stacking = float(parts.rotor_steel.stacking_factor.value)
    mean_length = length + sections.end_turn_length(construction)
    stator = sections.stator_area * length * stacking * float(parts.stator_steel.density.value)
    core = sections.core_area * rotor_length * rotor_stacking
    core_mass = core * float(parts.rotor_steel.density.value)
    masses = {
        "copper": copper_area * mean_length * float(parts.conductor.density.value),
        "magnet": sections.magnet_area * rotor_length * float(parts.magnet.density.value),
        "sleeve": sections.sleeve_area * rotor_length * float(parts.sleeve.density.value),
        "shaft_steel": sections.shaft_area * rotor_length * float(parts.shaft.density.value),
        "electrical_steel": stator + core_mass,
    }
    rotor = core_mass + masses["magnet"] + masses["sleeve"] + masses["shaft_steel"]
    return masses, np.asarray(rotor)
