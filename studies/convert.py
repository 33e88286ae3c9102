"""Study-file sections, in the units of their keys, into the machine's SI objects."""

from __future__ import annotations

from math import pi

from evaluators.machine.materials import (
    Conductor,
    ElectricalSteel,
    Magnet,
    ShaftSteel,
    SleeveMaterial,
    load,
)
from evaluators.machine.task import Conditions, Construction, Duty, MaterialSet, RippleWeights
from studies.schema import (
    KILO,
    MEGA,
    MICRO,
    MILLI,
    ConditionsSection,
    ConstructionSection,
    DutySection,
    MaterialsSection,
    RippleSection,
)

RPM = 2.0 * pi / 60.0  # rad/s

MATERIAL_KINDS = {
    "stator_steel": "electrical_steel",
    "rotor_steel": "electrical_steel",
    "magnet": "magnet",
    "conductor": "conductor",
    "sleeve": "sleeve",
    "shaft": "shaft_steel",
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


def material_set(section: MaterialsSection) -> MaterialSet:
    """Load the named materials; the names have been checked."""
    return MaterialSet(
        stator_steel=load(ElectricalSteel, section.stator_steel),
        rotor_steel=load(ElectricalSteel, section.rotor_steel),
        magnet=load(Magnet, section.magnet),
        conductor=load(Conductor, section.conductor),
        sleeve=load(SleeveMaterial, section.sleeve),
        shaft=load(ShaftSteel, section.shaft),
    )
