"""Liquids of a cooling jacket, and how well each kind of cooling takes heat from the frame."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.materials import library as materials
from evaluators.machine.materials.gas import gas_state
from evaluators.machine.materials.kinds import Gas
from evaluators.machine.quantity import FloatArray, floats
from evaluators.machine.task.cooling import Cooling
from evaluators.machine.thermal.conduction import rib_efficiency
from evaluators.machine.thermal.convection import duct_nusselt, plate_coefficient

FRAME_CONDUCTIVITY = 160.0  # W/(m K), aluminium casting alloy (from memory, handbook range)


class Liquid(NamedTuple):
    """Properties of a liquid in SI units."""

    density: FloatArray
    viscosity: FloatArray
    thermal_conductivity: FloatArray
    specific_heat: FloatArray


# Water by IAPWS, and ethylene glycol of half the mass, computed with CoolProp 8 at 3 bar; rows are
# degC, kg/m3, Pa s, W/(m K), J/(kg K).
_WATER = np.array(
    [
        [5.0, 1000.1, 1.518e-3, 0.5679, 4204.0],
        [20.0, 998.3, 1.0015e-3, 0.5981, 4183.0],
        [40.0, 992.3, 6.528e-4, 0.6286, 4179.0],
        [60.0, 983.3, 4.661e-4, 0.6511, 4185.0],
        [80.0, 971.9, 3.541e-4, 0.6671, 4196.0],
        [95.0, 962.0, 2.971e-4, 0.6753, 4210.0],
    ]
)
_HALF_GLYCOL = np.array(
    [
        [-30.0, 1085.1, 4.177e-2, 0.3589, 3027.0],
        [-10.0, 1078.7, 1.278e-2, 0.3707, 3146.0],
        [5.0, 1072.4, 6.406e-3, 0.3799, 3231.0],
        [20.0, 1064.9, 3.693e-3, 0.3891, 3312.0],
        [40.0, 1053.4, 2.103e-3, 0.4015, 3413.0],
        [60.0, 1040.5, 1.375e-3, 0.4138, 3503.0],
        [80.0, 1026.4, 9.685e-4, 0.4257, 3582.0],
        [95.0, 1015.3, 7.528e-4, 0.4343, 3631.0],
    ]
)


def liquid(temperature_C: ArrayLike, glycol: bool) -> Liquid:
    """Return properties of water, or of water with half its mass of ethylene glycol.

    Linear between the points of a table, the viscosity in its logarithm; held beyond 95 degC and
    below 5 (water) or -30 degC (glycol). Water by
    IAPWS, the mixture by CoolProp 8.
    """
    table = _HALF_GLYCOL if glycol else _WATER
    at = floats(temperature_C)
    density, conductivity, heat = (np.interp(at, table[:, 0], table[:, k]) for k in (1, 3, 4))
    viscosity = np.exp(np.interp(at, table[:, 0], np.log(table[:, 2])))
    return Liquid(density, np.asarray(viscosity), conductivity, heat)


def frame_conductance(cooling: Cooling, outer_radius: FloatArray, length: FloatArray) -> FloatArray:
    """Return the conductance from the frame's outside to the coolant at its inlet, (n,) W/K.

    Half the temperature rise of a liquid between inlet and outlet is part of it. Air by
    `plate_coefficient` and `rib_efficiency`, liquids by `duct_nusselt`.

    Parameters
    ----------
    cooling
        How the frame is cooled.
    outer_radius, length
        Of the frame under the coolant, in m, shape (n,).
    """
    area = 2.0 * np.pi * outer_radius * length
    if cooling.method == "coefficient":
        return np.asarray(cooling.heat_transfer_coefficient * area)
    if cooling.method == "forced air":
        air = gas_state(materials.load(Gas, "Air"), cooling.coolant_temperature)
        h = plate_coefficient(cooling.air_speed, length, air)
        pitch = cooling.rib_thickness + cooling.rib_gap
        efficiency = rib_efficiency(
            h, FRAME_CONDUCTIVITY, cooling.rib_thickness, cooling.rib_height
        )
        enlarged = (cooling.rib_gap + 2.0 * cooling.rib_height * efficiency) / pitch
        # The tips of the ribs count as plain frame, so that ribs of no height change nothing.
        return np.asarray(h * area * (enlarged + cooling.rib_thickness / pitch))
    fluid = liquid(cooling.coolant_temperature, cooling.glycol)
    width, height = cooling.channel_width, cooling.channel_height
    diameter = 2.0 * width * height / (width + height)
    reynolds = fluid.density * cooling.coolant_flow / (width * height) * diameter / fluid.viscosity
    prandtl = fluid.viscosity * fluid.specific_heat / fluid.thermal_conductivity
    h = duct_nusselt(reynolds, prandtl) * fluid.thermal_conductivity / diameter
    carried = 2.0 * fluid.density * fluid.specific_heat * cooling.coolant_flow
    return np.asarray(1.0 / (1.0 / (h * area) + 1.0 / carried))
