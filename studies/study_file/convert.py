"""Study-file sections, in the units of their keys, into the machine's SI objects."""

from __future__ import annotations

from math import pi
from typing import Any

from evaluators.machine.demagnetisation import Fault
from evaluators.machine.materials.gas import vapour
from evaluators.machine.materials.library import (
    Conductor,
    ElectricalSteel,
    Gas,
    Magnet,
    ShaftSteel,
    SleeveMaterial,
    load,
)
from evaluators.machine.task.cooling import Cooling
from evaluators.machine.task.rotor_layout import RotorLayout
from evaluators.machine.task.task import Conditions, Construction, Duty, MaterialSet, RippleWeights
from studies.study_file.schema import (
    ConditionsSection,
    ConstructionSection,
    DutySection,
    MaterialsSection,
    RippleSection,
)
from studies.study_file.schema_base import KILO, MEGA, MICRO, MILLI, Section
from studies.study_file.schema_machine import (
    FACTORS,
    CoolingSection,
    FaultSection,
    GasSection,
    RotorSection,
)
from studies.suggestions import stem, suffix

RPM = 2.0 * pi / 60.0  # rad/s

MATERIAL_KINDS = {
    "stator_steel": "electrical_steel",
    "rotor_steel": "electrical_steel",
    "magnet": "magnet",
    "conductor": "conductor",
    "sleeve": "sleeve",
    "shaft": "shaft_steel",
    "gas": "gas",
}
"""Kind of material behind each key of the section ``materials``."""


def duty(section: DutySection) -> Duty:
    """Duty in watts, radians per second and volts."""
    return Duty(
        power=section.power_kW * KILO,
        speed=section.speed_rpm * RPM,
        overspeed_ratio=section.overspeed_ratio,
        dc_link_voltage=section.dc_link_V,
        voltage_reserve=section.voltage_reserve,
        suspension_share=section.suspension_share,
        orientation=section.orientation,
        balance_grade=section.balance_grade_mm_s * MILLI,
        rated_suspension_share=section.rated_suspension_share,
        process_force=section.process_force_N,
        lowest_speed_ratio=section.lowest_speed_ratio,
        highest_speed_ratio=section.highest_speed_ratio,
    )


def conditions(section: ConditionsSection) -> Conditions:
    """Temperatures in degrees Celsius, pressure in pascals."""
    return Conditions(
        winding_temperature=section.winding_temperature_C,
        magnet_temperature=section.magnet_temperature_C,
        sleeve_temperature=section.sleeve_temperature_C,
        ambient_temperature=section.ambient_temperature_C,
        gas_temperature=section.gas_temperature_C,
        gas_pressure=section.gas_pressure_kPa * KILO,
    )


def construction(section: ConstructionSection) -> Construction:
    """Lengths in metres, pressure in pascals."""
    interference = section.sleeve_interference_um
    return Construction(
        magnetisation=section.magnetisation,
        copper_fill=section.copper_fill,
        magnet_segments=section.magnet_segments,
        magnet_axial_segment=section.magnet_axial_segment_mm * MILLI,
        strand_diameter=section.strand_diameter_mm * MILLI,
        wire_grade=section.wire_grade,
        winding_packing=section.winding_packing,
        parallel_groups=section.parallel_groups,
        end_turn_extension=section.end_turn_extension_mm * MILLI,
        slot_insulation=section.slot_insulation_mm * MILLI,
        minimum_slot_opening=section.minimum_slot_opening_mm * MILLI,
        sleeve_interference=None if interference is None else interference * MICRO,
        contact_pressure=section.contact_pressure_MPa * MEGA,
        end_clearance=section.end_clearance_mm * MILLI,
        rotor_overhang=section.rotor_overhang_mm * MILLI,
    )


def ripple(section: RippleSection) -> RippleWeights:
    """Weights and reference values of the ripple index; the names are the same."""
    return RippleWeights(**section.model_dump())


def cooling(section: CoolingSection) -> Cooling:
    """Cooling in SI units."""
    return Cooling(**_si(section))


def rotor(section: RotorSection) -> RotorLayout:
    """Rotor layout in SI units."""
    return RotorLayout(**_si(section))


def fault(section: FaultSection) -> Fault:
    """Fault, the names are the same."""
    return Fault(**_si(section))


def _si(section: Section) -> dict[str, Any]:
    """Values in SI by the machine's names: the keys without their units."""
    return {
        stem(key): value * FACTORS[suffix(key)] if value and suffix(key) in FACTORS else value
        for key, value in section.model_dump().items()
    }


def stated_gas(section: GasSection) -> Gas:
    """The gas that the study describes by its properties."""
    return vapour(
        section.name,
        temperature_C=section.temperature_C,
        pressure_Pa=section.pressure_kPa * KILO,
        density=section.density_kg_m3,
        viscosity=section.viscosity_uPa_s * MICRO,
        thermal_conductivity=section.thermal_conductivity_W_mK,
        specific_heat=section.specific_heat_J_kgK,
        source=section.source,
        year=section.year,
    )


def material_set(section: MaterialsSection) -> MaterialSet:
    """Load the named materials; the names have been checked."""
    return MaterialSet(
        stator_steel=load(ElectricalSteel, section.stator_steel),
        rotor_steel=load(ElectricalSteel, section.rotor_steel),
        magnet=load(Magnet, section.magnet),
        conductor=load(Conductor, section.conductor),
        sleeve=load(SleeveMaterial, section.sleeve),
        shaft=load(ShaftSteel, section.shaft),
        gas=load(Gas, section.gas),
    )
