"""Sections on cooling, the whole rotor and the fault; all their keys may be left out.

Each key is the name of a field of the machine's own description with its unit as suffix, so that
one rule converts them all.
"""

from __future__ import annotations

from typing import Any, Literal

from pydantic import Field

from evaluators.machine.demagnetisation import Fault
from evaluators.machine.task.cooling import Cooling
from evaluators.machine.task.rotor_layout import RotorLayout
from studies.study_file.schema_base import KILO, MILLI, Section

LITRE = 1e-3  # m3
PER_MINUTE = 1.0 / 60.0


def _number(default: float, low: float, high: float, description: str) -> Any:
    return Field(default, ge=low, le=high, description=description)


class CoolingSection(Section):
    """How the machine is cooled, and whether temperatures are solved for."""

    temperatures: Literal["solved", "fixed"] = Field(
        Cooling.temperatures, description="solved by the heat network, or those of the conditions"
    )
    method: Literal["jacket", "forced air", "coefficient"] = Field(
        Cooling.method, description="how the frame is cooled"
    )
    coolant_temperature_C: float = _number(
        Cooling.coolant_temperature, -60.0, 150.0, "coolant at the inlet"
    )
    coolant_flow_L_min: float = _number(
        Cooling.coolant_flow / (LITRE * PER_MINUTE), 0.01, 60_000.0, "liquid through the jacket"
    )
    channel_height_mm: float = _number(
        Cooling.channel_height / MILLI, 0.2, 200.0, "height of the jacket's channel"
    )
    channel_width_mm: float = _number(
        Cooling.channel_width / MILLI, 0.5, 1000.0, "width of the jacket's channel"
    )
    glycol: bool = Field(
        Cooling.glycol, description="whether half the liquid's mass is ethylene glycol"
    )
    air_speed_m_s: float = _number(Cooling.air_speed, 0.1, 60.0, "speed of air along the ribs")
    rib_height_mm: float = _number(
        Cooling.rib_height / MILLI, 0.0, 300.0, "height of the frame's ribs, 0 for a plain frame"
    )
    rib_thickness_mm: float = _number(
        Cooling.rib_thickness / MILLI, 0.1, 100.0, "thickness of a rib"
    )
    rib_gap_mm: float = _number(Cooling.rib_gap / MILLI, 0.1, 300.0, "gap between ribs")
    heat_transfer_coefficient_W_m2K: float = _number(
        Cooling.heat_transfer_coefficient, 0.5, 1e5, "of the plain frame, for method coefficient"
    )
    frame_thickness_mm: float = _number(
        Cooling.frame_thickness / MILLI, 0.1, 200.0, "wall between stack and coolant"
    )
    joint_conductance_W_m2K: float = _number(
        Cooling.joint_conductance, 10.0, 1e6, "conductance of the fit between stack and frame"
    )
    gap_flow_L_s: float = _number(
        Cooling.gap_flow / LITRE, 0.0, 10_000.0, "gas blown through the gap, 0 for none"
    )
    gap_flow_temperature_C: float | None = Field(
        None, ge=-80.0, le=300.0, description="that gas at the inlet; ambient if left out"
    )
    impregnation_conductivity_W_mK: float = _number(
        Cooling.impregnation_conductivity, 0.02, 10.0, "heat conductivity of the resin"
    )
    liner_conductivity_W_mK: float = _number(
        Cooling.liner_conductivity, 0.02, 10.0, "heat conductivity of the slot liner"
    )
    insulation_class: Literal["A", "E", "B", "F", "H"] = Field(
        Cooling.insulation_class, description="thermal class of IEC 60085"
    )
    hot_spot_allowance_K: float = _number(
        Cooling.hot_spot_allowance, 0.0, 100.0, "added to the hottest computed point of the winding"
    )
    condensation_prevented: bool = Field(
        Cooling.condensation_prevented,
        description="whether no moisture can condense, so that the coolant may be colder than "
        "the surroundings",
    )


class RotorSection(Section):
    """The rotor beyond its active part, and what holds and limits its motion."""

    drive_end_length_mm: float | None = Field(
        None, ge=0.1, le=10_000.0, description="shaft beyond the active part on the drive side"
    )
    free_end_length_mm: float | None = Field(
        None, ge=0.1, le=10_000.0, description="shaft beyond the active part on the free side"
    )
    shaft_end_ratio: float = _number(
        RotorLayout.shaft_end_ratio, 0.2, 5.0, "radius of the shaft ends over that in the core"
    )
    overhung_mass_kg: float = _number(
        RotorLayout.overhung_mass, 0.0, 1e4, "part on the drive-side tip, an impeller say"
    )
    overhung_offset_mm: float = _number(
        RotorLayout.overhung_offset / MILLI, -1000.0, 1000.0, "its centre of mass beyond the tip"
    )
    overhung_transverse_inertia_kg_cm2: float = _number(
        RotorLayout.overhung_transverse_inertia / 1e-4, 0.0, 1e8, "its inertia about a diameter"
    )
    free_end_mass_kg: float = _number(
        RotorLayout.free_end_mass, 0.0, 1e4, "part on the free tip, a thrust disc say"
    )
    suspension_stiffness_N_mm: float | None = Field(
        None,
        ge=0.001,
        le=1e9,
        description="net stiffness of the position control; as much as the magnets' negative "
        "stiffness if left out",
    )
    bearing_stiffness_N_mm: float = _number(
        RotorLayout.bearing_stiffness / KILO, 0.0, 1e9, "second radial bearing, 0 for none"
    )
    damping_ratio: float = _number(
        RotorLayout.damping_ratio, 1e-4, 2.0, "damping of the first bending mode under control"
    )
    touchdown_ratio: float = _number(
        RotorLayout.touchdown_ratio, 0.05, 0.95, "touchdown clearance over mechanical clearance"
    )
    eccentricity_ratio: float = _number(
        RotorLayout.eccentricity_ratio,
        0.0,
        1.0,
        "displacement in operation over touchdown clearance",
    )
    core_stiffening: float = _number(
        RotorLayout.core_stiffening,
        0.0,
        1.0,
        "share of bending stiffness that core and magnets add",
    )


class GasSection(Section):
    """A gas by its properties at one state, a refrigerant vapour say, in place of a named one."""

    name: str = Field(min_length=1, max_length=64, description="name of the gas")
    temperature_C: float = Field(ge=-80.0, le=300.0, description="state of the properties")
    pressure_kPa: float = Field(ge=0.1, le=5000.0, description="state of the density, absolute")
    density_kg_m3: float = Field(ge=1e-4, le=1000.0, description="at that state")
    viscosity_uPa_s: float = Field(ge=1.0, le=100.0, description="dynamic, at that state")
    thermal_conductivity_W_mK: float = Field(ge=1e-3, le=1.0, description="at that state")
    specific_heat_J_kgK: float = Field(
        ge=100.0, le=20_000.0, description="at constant pressure, at that state"
    )
    source: str = Field(min_length=1, max_length=200, description="where the properties come from")
    year: int = Field(ge=1800, le=2200, description="of the source")


class FaultSection(Section):
    """The fault the magnets must survive."""

    kind: Literal["short circuit", "current"] = Field(
        Fault.kind, description="of all phases at the duty, or a stated current"
    )
    current_ratio: float = _number(
        Fault.current_ratio, 0.0, 20.0, "stated peak current over the peak torque current"
    )
