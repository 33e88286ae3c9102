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
    LITRE,
    PER_MINUTE,
    CoolingSection,
    FaultSection,
    GasSection,
    RotorSection,
)
from studies.suggestions import stem, suffix

RPM = 2.0 * pi / 60.0  # rad/s

FACTORS = {
    "kW": KILO,
    "rpm": RPM,
    "mm_s": MILLI,
    "kPa": KILO,
    "MPa": MEGA,
    "mm": MILLI,
    "um": MICRO,
    "L_min": LITRE * PER_MINUTE,
    "L_s": LITRE,
    "kg_cm2": 1e-4,
    "N_mm": KILO,
}
"""Suffix to SI; suffixes that are SI already, and degrees, are left out."""

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
    values = _si(section)
    return Duty(dc_link_voltage=values.pop("dc_link"), **values)


def conditions(section: ConditionsSection) -> Conditions:
    """Temperatures in degrees Celsius, pressure in pascals."""
    return Conditions(**_si(section))


def construction(section: ConstructionSection) -> Construction:
    """Lengths in metres, pressure in pascals."""
    return Construction(**_si(section))


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
    """Values in SI by the machine's names: the keys without their units.

    A key that the machine does not know under this name is an error of the caller's constructor.
    """
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
