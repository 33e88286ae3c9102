"""Text of a new study: the sized machine with bounds around it, every choice commented."""

from __future__ import annotations

import json
from textwrap import fill

from evaluators.machine.geometry.variables import VARIABLES
from studies.new_study.sizing import (
    ELECTRICAL_FREQUENCY,
    LENGTH_RATIO,
    TIP_SPEED,
    TORQUE_PER_VOLUME,
    Sizing,
    size,
)
from studies.study_file.convert import RPM

MILLI = 1e-3

# Bounds of the variables that do not follow from the size: (low, high), each a ratio or a density.
SHAPE_BOUNDS = {
    "magnet_arc_ratio": (0.7, 1.0),
    "core_ratio": (0.3, 0.75),
    "tooth_width_ratio": (0.3, 0.7),
    "tip_span_ratio": (0.8, 1.85),
    "slot_depth_ratio": (0.2, 0.9),
    "yoke_ratio": (0.6, 1.6),
    "current_density_A_mm2": (2.0, 9.0),
}
# Others as multiples of a length of the sized machine.
SIZE_BOUNDS = {
    # Low enough for four times the torque per volume that the sizing assumes, in a longer stack.
    "rotor_radius_mm": ("rotor_radius", 0.45, 1.3),
    "sleeve_thickness_mm": ("sleeve_thickness", 0.5, 2.0),
    "magnet_thickness_mm": ("magnet_thickness", 0.5, 1.6),
    "tip_height_mm": ("rotor_radius", 0.02, 0.08),
    "wedge_height_mm": ("rotor_radius", 0.03, 0.1),
}


def study_text(
    name: str,
    power_kW: float,
    speed_rpm: float,
    dc_link_V: float,
    overspeed_ratio: float,
    orientation: str,
) -> str:
    """A complete study file for a machine of this duty."""
    speed = speed_rpm * RPM
    sizing = size(power_kW * 1e3, speed, overspeed_ratio)
    parts = [
        _head(name, power_kW, speed_rpm, sizing),
        _duty(power_kW, speed_rpm, dc_link_V, overspeed_ratio, orientation),
        MIDDLE.format(
            steel="NO10-1300" if sizing.highest_frequency > 800.0 else "M235-35A",
            strand=0.4 if sizing.highest_frequency > 400.0 else 0.8,
        ),
        _variables(sizing),
        _families(sizing),
        END.format(
            tip_speed=max(200.0, 1.2 * sizing.tip_speed), overspeed=overspeed_ratio * speed_rpm
        ),
    ]
    return "\n".join(part.strip("\n") + "\n" for part in parts)


def _comment(text: str) -> str:
    return fill(" ".join(text.split()), 96, initial_indent="# ", subsequent_indent="# ")


def _head(name: str, power_kW: float, speed_rpm: float, sizing: Sizing) -> str:
    limited = (
        f"The radius was held back so that the rotor surface stays at {TIP_SPEED:g} m/s; the stack "
        "is longer in return."
        if sizing.limited_by_tip_speed
        else f"The rotor surface then runs at {sizing.tip_speed:.0f} m/s, below the "
        f"{TIP_SPEED:g} m/s that would have held the radius back."
    )
    basis = f"""First-order sizing behind this file. The torque is {power_kW:g} kW over
{speed_rpm:g} r/min, {sizing.torque:.3g} N m. A torque per rotor volume of
{TORQUE_PER_VOLUME / 1e3:g} kN m/m3 and a stack of {LENGTH_RATIO:g} x the rotor diameter
give a rotor radius of {sizing.rotor_radius / MILLI:.3g} mm and a stack of
{sizing.stack_length / MILLI:.3g} mm. {limited} These are rules of thumb: they only centre the
bounds below, and the search decides."""
    return f"""
{_comment(basis)}
#
# Check the file with `hovergap check FILE`, search it with `hovergap sweep FILE`.

[study]
name = {json.dumps(name)}
description = "{power_kW:g} kW at {speed_rpm:g} r/min"
"""


def _duty(
    power_kW: float, speed_rpm: float, dc_link_V: float, overspeed_ratio: float, orientation: str
) -> str:
    return f"""
[duty]
power_kW = {float(power_kW)!r}
speed_rpm = {float(speed_rpm)!r}
overspeed_ratio = {overspeed_ratio!r}      # the rotor must survive this much more speed
dc_link_V = {float(dc_link_V)!r}
voltage_reserve = 0.1      # share of the phase voltage kept back for control
suspension_share = 0.1     # share of the peak slot current that carries the rotor
orientation = "{orientation}"
balance_grade_mm_s = 2.5   # ISO 21940-11 grade G 2.5
"""


MIDDLE = """
# Temperatures the calculation starts from; those of winding and rotor are then solved.
[conditions]
winding_temperature_C = 120.0
magnet_temperature_C = 100.0
sleeve_temperature_C = 100.0
ambient_temperature_C = 40.0
gas_temperature_C = 80.0
gas_pressure_kPa = 101.325

# A water jacket round the stack; `method` may also be "forced air" or "coefficient".
[cooling]
temperatures = "solved"
method = "jacket"
coolant_temperature_C = 45.0
insulation_class = "F"

[construction]
magnetisation = "parallel"
copper_fill = 0.42
magnet_segments = 1
magnet_axial_segment_mm = 10.0
strand_diameter_mm = {strand}
minimum_slot_opening_mm = 0.8

# `hovergap materials` lists what can stand here.
[materials]
stator_steel = "{steel}"
rotor_steel = "{steel}"
magnet = "REFeB 300/160"
conductor = "Copper"
sleeve = "Carbon fibre, wound"
shaft = "42CrMo4"
# The rotor turns in air; gas = "Helium" names another one. One that is not listed, a refrigerant
# vapour say, is described in [gas]: name, temperature_C, pressure_kPa, density_kg_m3,
# viscosity_uPa_s, thermal_conductivity_W_mK, specific_heat_J_kgK, source, year.

# Per kilogram; invented round figures, put your own. In detail: magnet = {{ per_kg = 90.0,
# waste_share = 0.2, processing_per_kg = 10.0 }}.
[prices]
currency = "EUR"
electrical_steel = {{ per_kg = 6.0, waste_share = 0.5 }}
copper = 14.0
magnet = {{ per_kg = 90.0, waste_share = 0.2 }}
sleeve = 150.0
shaft_steel = 3.0
"""


def _variables(sizing: Sizing) -> str:
    lines = [
        "# Each variable is [low, high], or one number to fix it.",
        "[variables]",
    ]
    for variable in VARIABLES:
        if variable.name == "clearance_mm":
            value = f"{sizing.clearance / MILLI:.2f}"
        elif variable.name in SHAPE_BOUNDS:
            low, high = SHAPE_BOUNDS[variable.name]
            value = f"[{low}, {high}]"
        else:
            source, low, high = SIZE_BOUNDS[variable.name]
            length = getattr(sizing, source) / MILLI
            low, high = (
                min(max(factor * length, variable.lowest), variable.highest)
                for factor in (low, high)
            )
            value = f"[{float(f'{low:.3g}')}, {float(f'{high:.3g}')}]"
        lines += [_comment(variable.definition), f"{variable.name} = {value}"]
    return "\n".join(lines)


def _families(sizing: Sizing) -> str:
    listed = ", ".join(f'"{family}"' for family in sizing.families)
    choice = f"""Families up to about {ELECTRICAL_FREQUENCY:g} Hz electrical frequency, of each
number of pole pairs those with the shortest coils; `hovergap families` lists all that can be wound.
A rule may stand here instead: slots = [12, 18] with pole_pairs = [2, 4]."""
    return f"""
{_comment(choice)}
[families]
list = [{listed}]
"""


END = """
# Any metric of `hovergap metrics` can be limited, at_most or at_least.
[limits]
tip_speed_m_s = {{ at_most = {tip_speed:.0f} }}
sleeve_stress_ratio = {{ at_most = 0.8 }}
contact_pressure_MPa = {{ at_least = 0.0 }}     # the sleeve still presses at overspeed
tooth_flux_density_T = {{ at_most = 1.6 }}
yoke_flux_density_T = {{ at_most = 1.5 }}
voltage_use = {{ at_most = 1.0 }}
lift_off_ratio = {{ at_least = 1.5 }}           # lifts off the touchdown bearings with reserve
slot_occupation = {{ at_most = 1.0 }}           # the wires fit
insulation_margin_K = {{ at_least = 0.0 }}      # hot spot below the insulation class
rotor_material_margin_K = {{ at_least = 0.0 }}
fault_demagnetisation_margin_T = {{ at_least = 0.0 }}   # magnets outlive a short circuit
separation_margin = {{ at_least = 0.0 }}        # bending speeds clear of the duty; state [rotor]
free_bending_speed_rpm = {{ at_least = {overspeed:.0f} }}   # no bending mode up to overspeed
length_ratio = {{ at_most = 2.5 }}

[[objectives]]
metric = "loss_total_W"
sense = "minimise"

[[objectives]]
metric = "cost"
sense = "minimise"

[[objectives]]
metric = "ripple_index"
sense = "minimise"

[search]
evaluations_per_family = 4000
# Several searches of each family, such as 6, show how much of the families' order is chance.
searches_per_family = 1
seed = 1

[evaluator]
name = "analytic"
"""
