"""The heat network of the machine: which parts touch which, and how well.

Nodes: winding in the slots, end turns, teeth, yoke, frame, gas of the gap, sleeve, magnets, rotor
core with shaft, gas of the end spaces. Radial conduction by half thicknesses on both sides of a
node (a network of mean temperatures; leaving out the negative leg of Mellor, Roberts, Turner,
*IEE Proc. B* 138(5), 1991, makes it slightly too warm). Heat that runs along the shaft, radiation
and the washed surface of the shaft ends are left out, which is on the safe side.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.materials import library as materials
from evaluators.machine.materials.gas import GasState, gas_state
from evaluators.machine.materials.kinds import Gas
from evaluators.machine.quantity import FloatArray
from evaluators.machine.task.task import Task
from evaluators.machine.thermal import conduction
from evaluators.machine.thermal.convection import disc_coefficient, end_space_coefficient
from evaluators.machine.thermal.coolant import FRAME_CONDUCTIVITY, frame_conductance
from evaluators.machine.thermal.gap import gap_coefficient
from evaluators.machine.thermal.network import Network, series

NODES = (
    "winding",
    "end_turns",
    "teeth",
    "yoke",
    "frame",
    "gap",
    "sleeve",
    "magnets",
    "core",
    "end_space",
)
EXPOSED_SHARE = 0.5  # of an end turn's surface that gas washes; the rest faces other end turns
SWIRL = 0.43
"""Speed of the gas in the end spaces over that of the rotor's surface.

Between a turning and a still face the core of turbulent gas turns at 0.43 of the speed: Owen,
Rogers, *Flow and Heat Transfer in Rotating-Disc Systems*, vol. 1, 1989 (from memory). End turns
stand still and slow it further; fans on the rotor would speed it up."""
CONDUCTION_TEMPERATURE = 100.0  # degC at which conductivities of solids are taken


@dataclass(frozen=True)
class Conduction:
    """Conduction of n designs: resistances times stack length in K m/W, and slot figures.

    Attributes
    ----------
    slots : array (n,)
        From the mean of the winding to the slot walls, all slots together.
    sides : array (n,)
        Share of the slot's wall that is tooth; the rest is yoke.
    tooth, yoke_inside, yoke_outside, sleeve, magnet, core : array (n,)
        Half a tooth's length; the yoke's mean radius to its inner and outer face, frame included;
        half of sleeve and magnets; the mean of the rotor's inside to its surface.
    axial, core_along, magnet_along : array (n,)
        Cross-section times conductivity along the axis of the copper of all slots, of core with
        shaft, and of the magnets, W m/K.
    end_bundle : array (n,)
        From the mean of a coil side's bundle to its surface, K m/W of one bundle.
    bundle_side : array (n,)
        Side of that bundle as a square, m.
    slot_excess, bundle_excess : array (n,)
        Peak minus mean rise in slot and bundle per heat source, K/(W/m3).
    """

    slots: FloatArray
    sides: FloatArray
    tooth: FloatArray
    yoke_inside: FloatArray
    yoke_outside: FloatArray
    sleeve: FloatArray
    magnet: FloatArray
    core: FloatArray
    axial: FloatArray
    core_along: FloatArray
    magnet_along: FloatArray
    end_bundle: FloatArray
    bundle_side: FloatArray
    slot_excess: FloatArray
    bundle_excess: FloatArray


def conduction_of(task: Task, sections: CrossSections, copper_fill: FloatArray) -> Conduction:
    """Conduction of n designs whose slots hold `copper_fill` (n,) of bare conductor.

    The slot counts as a rectangle of its depth and mean width with cold side walls and bottom and
    an adiabatic mouth: half of a rectangle twice as deep with all walls cold.
    """
    parts, cooling, slots = task.materials, task.cooling, sections.family.slots
    at = CONDUCTION_TEMPERATURE
    copper = float(parts.conductor.thermal_conductivity.at(at))
    stacking = float(parts.stator_steel.stacking_factor.value)
    iron = float(parts.stator_steel.thermal_conductivity.at(at)) * stacking
    mixture = conduction.mixture_conductivity(
        np.minimum(copper_fill, 0.9), copper, cooling.impregnation_conductivity
    )
    depth = sections.slot_radius - sections.wedge_radius
    area = sections.slot_area
    width = area / depth
    mean = conduction.heated_bar_mean_rise(1.0, width, 2.0 * depth, mixture)
    peak = conduction.heated_bar_peak_rise(1.0, width, 2.0 * depth, mixture)
    wall = 2.0 * depth + width
    liner = task.construction.slot_insulation / (cooling.liner_conductivity * wall)
    side = np.sqrt(0.5 * area)
    bundle_mean = conduction.heated_bar_mean_rise(1.0, side, side, mixture)
    bundle_peak = conduction.heated_bar_peak_rise(1.0, side, side, mixture)
    middle = 0.5 * (sections.slot_radius + sections.outer_radius)
    cylinder = conduction.cylinder_resistance
    outside = sections.outer_radius
    frame = cylinder(outside, outside + cooling.frame_thickness, FRAME_CONDUCTIVITY, 1.0)
    joint = 1.0 / (cooling.joint_conductance * 2.0 * np.pi * outside)
    sleeve = float(parts.sleeve.thermal_conductivity.at(at))
    magnet = float(parts.magnet.thermal_conductivity.at(at))
    shaft = float(parts.shaft.thermal_conductivity.at(at))
    tooth_length = sections.slot_radius - sections.bore_radius
    return Conduction(
        slots=(mean / area + liner) / slots,
        sides=2.0 * depth / wall,
        tooth=0.5 * tooth_length / (iron * sections.tooth_width * slots),
        yoke_inside=cylinder(sections.slot_radius, middle, iron, 1.0),
        yoke_outside=cylinder(middle, outside, iron, 1.0) + joint + frame,
        sleeve=0.5 * cylinder(sections.magnet_radius, sections.rotor_radius, sleeve, 1.0),
        magnet=0.5 * cylinder(sections.core_radius, sections.magnet_radius, magnet, 1.0),
        # Mean of a heated rod over its surface: q R²/8k.
        core=np.full(len(sections), 1.0 / (8.0 * np.pi * shaft)),
        axial=slots * area * copper_fill * copper,
        core_along=np.pi * sections.core_radius**2 * shaft,
        magnet_along=sections.magnet_area * magnet,
        end_bundle=bundle_mean / (0.5 * area),
        bundle_side=side,
        slot_excess=peak - mean,
        bundle_excess=bundle_peak - bundle_mean,
    )


def machine_network(
    task: Task,
    sections: CrossSections,
    solids: Conduction,
    length: FloatArray,
    gap_gas: GasState,
    end_temperature: FloatArray,
) -> Network:
    """Network of n machines of stack length (n,) m.

    Parameters
    ----------
    task, sections, solids
        Of the n designs.
    length
        Stack length, m.
    gap_gas
        State of the gas in the gap, (n,).
    end_temperature
        Temperature at which the gas of the end spaces has its properties, degC, (n,).
    """
    cooling, speed, slots = task.cooling, task.duty.speed, sections.family.slots
    gas = gas_state(task.materials.gas, end_temperature, task.conditions.gas_pressure)
    air = gas_state(materials.load(Gas, "Air"), end_temperature)
    net = Network(len(sections), NODES)
    slot = length / solids.slots
    net.connect("winding", "teeth", slot * solids.sides)
    net.connect("winding", "yoke", slot * (1.0 - solids.sides))
    net.connect("teeth", "yoke", series(solids.tooth / length, solids.yoke_inside / length))
    net.connect("yoke", "frame", length / solids.yoke_outside)
    outside = sections.outer_radius + cooling.frame_thickness
    net.connect_to(
        "frame", cooling.coolant_temperature, frame_conductance(cooling, outside, length)
    )

    clearance = sections.bore_radius - sections.rotor_radius
    ring = np.pi * (sections.bore_radius**2 - sections.rotor_radius**2)
    wall = gap_coefficient(
        sections.rotor_radius, clearance, speed, gap_gas, cooling.gap_flow / ring
    )
    bore, surface = 2.0 * np.pi * sections.bore_radius, 2.0 * np.pi * sections.rotor_radius
    net.connect("teeth", "gap", series(solids.tooth / length, 1.0 / (wall * bore * length)))
    net.connect("sleeve", "gap", series(solids.sleeve / length, 1.0 / (wall * surface * length)))
    if cooling.gap_flow > 0.0:
        inlet = cooling.gap_flow_temperature
        # The mean of inlet and outlet rises by half of what the flow takes up.
        carried = 2.0 * gap_gas.density * gap_gas.specific_heat * cooling.gap_flow
        net.connect_to(
            "gap", task.conditions.ambient_temperature if inlet is None else inlet, carried
        )
    net.connect("sleeve", "magnets", length / (solids.sleeve + solids.magnet))
    net.connect("magnets", "core", length / (solids.magnet + solids.core))

    end_turn = sections.end_turn_length(task.construction)
    # Two rods in line, each heated along its length: q l²/12k each.
    net.connect("winding", "end_turns", 12.0 * solids.axial / (length + end_turn))
    end_wall = end_space_coefficient(SWIRL * sections.rotor_radius * speed, gas, air)
    bundles = 2.0 * slots * end_turn  # metres of bundle: one of each coil at both ends
    washed = EXPOSED_SHARE * 4.0 * solids.bundle_side
    net.connect(
        "end_turns",
        "end_space",
        series(solids.end_bundle / bundles, 1.0 / (end_wall * washed * bundles)),
    )
    shields = 2.0 * np.pi * sections.outer_radius**2
    net.connect("end_space", "frame", end_wall * shields)
    faces = disc_coefficient(sections.rotor_radius, speed, gas)
    for name, along, area in (
        ("core", solids.core_along, np.pi * sections.core_radius**2),
        (
            "magnets",
            solids.magnet_along,
            np.pi * sections.rotor_radius**2 - np.pi * sections.core_radius**2,
        ),
    ):
        net.connect(name, "end_space", series(length / (12.0 * along), 1.0 / (faces * 2.0 * area)))
    return net
