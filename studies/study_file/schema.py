"""Sections of a study file: every key with its unit, range, default and meaning.

One model a section, so that the mistakes of all sections are reported together. The tables of
the user's guide and the commented file of `hovergap new` take their words from here.
"""

from __future__ import annotations

from typing import Any, Literal

from pydantic import Field

from evaluators.machine.task.task import Conditions, Construction, Duty, RippleWeights
from optimizer.running.stopping import DEFAULT_GAIN
from studies.study_file.schema_base import KILO, MEGA, MILLI, Section
from studies.study_file.schema_machine import CoolingSection, FaultSection, GasSection, RotorSection


class StudySection(Section):
    """What the study is."""

    name: str = Field(description="name of the study and of its results folder")
    description: str = Field("", max_length=2000, description="what the study is about")


class DutySection(Section):
    """What the drive must deliver."""

    power_kW: float = Field(ge=0.001, le=1e5, description="shaft power")
    speed_rpm: float = Field(ge=10.0, le=900_000.0, description="rotational speed")
    overspeed_ratio: float = Field(
        Duty.overspeed_ratio,
        ge=1.0,
        le=2.0,
        description="overspeed the rotor must survive, over the speed",
    )
    dc_link_V: float = Field(
        Duty.dc_link_voltage, ge=5.0, le=10_000.0, description="DC-link voltage"
    )
    voltage_reserve: float = Field(
        Duty.voltage_reserve,
        ge=0.0,
        le=0.9,
        description="share of the phase voltage kept back for control",
    )
    suspension_share: float = Field(
        Duty.suspension_share,
        ge=0.001,
        le=0.9,
        description="share of the peak slot current that carries the rotor",
    )
    orientation: Literal["horizontal", "vertical"] = Field(
        Duty.orientation, description="of the shaft; horizontal: the suspension carries the weight"
    )
    balance_grade_mm_s: float = Field(
        Duty.balance_grade / MILLI,
        ge=0.01,
        le=1000.0,
        description="residual unbalance grade G of ISO 21940-11",
    )
    rated_suspension_share: float = Field(
        Duty.rated_suspension_share,
        ge=0.001,
        le=3.0,
        description="share of the peak slot current that the suspension inverter can make for "
        "lift-off and shocks",
    )
    process_force_N: float = Field(
        Duty.process_force,
        ge=0.0,
        le=1e7,
        description="steady radial force of the driven process on the rotor",
    )
    lowest_speed_ratio: float = Field(
        Duty.lowest_speed_ratio,
        ge=0.0,
        le=1.0,
        description="lowest continuous speed over the speed",
    )
    highest_speed_ratio: float = Field(
        Duty.highest_speed_ratio,
        ge=1.0,
        le=2.0,
        description="highest continuous speed over the speed",
    )


def _temperature(default: float, of: str) -> Any:
    return Field(default, ge=-80.0, le=400.0, description=f"temperature of the {of}")


class ConditionsSection(Section):
    """Stated temperatures and the pressure in the gap; see `cooling` for solved ones."""

    winding_temperature_C: float = _temperature(Conditions.winding_temperature, "winding")
    magnet_temperature_C: float = _temperature(Conditions.magnet_temperature, "magnets")
    sleeve_temperature_C: float = _temperature(Conditions.sleeve_temperature, "sleeve")
    ambient_temperature_C: float = _temperature(Conditions.ambient_temperature, "surroundings")
    gas_temperature_C: float = _temperature(Conditions.gas_temperature, "air in the gap")
    gas_pressure_kPa: float = Field(
        Conditions.gas_pressure / KILO,
        ge=0.001,
        le=5000.0,
        description="absolute pressure of the air in the gap",
    )


class ConstructionSection(Section):
    """How the machine is made: choices that are not searched."""

    magnetisation: Literal["radial", "parallel"] = Field(
        Construction.magnetisation, description="direction of magnetisation"
    )
    copper_fill: float = Field(
        Construction.copper_fill, ge=0.05, le=0.9, description="bare copper area over slot area"
    )
    magnet_segments: int = Field(
        Construction.magnet_segments,
        ge=1,
        le=200,
        description="insulated segments of one pole around the circumference",
    )
    magnet_axial_segment_mm: float = Field(
        Construction.magnet_axial_segment / MILLI,
        ge=0.1,
        le=10_000.0,
        description="axial length of one magnet segment",
    )
    strand_diameter_mm: float = Field(
        Construction.strand_diameter / MILLI,
        ge=0.02,
        le=10.0,
        description="largest bare diameter of one round strand; a standard size is taken",
    )
    wire_grade: int = Field(
        Construction.wire_grade, ge=1, le=2, description="thickness of enamel by IEC 60317-0-1"
    )
    winding_packing: float = Field(
        Construction.winding_packing,
        ge=0.2,
        le=1.155,
        description="wires times the square of their overall diameter over the insulated slot area",
    )
    parallel_groups: int | None = Field(
        None,
        ge=1,
        le=2,
        description="groups of a phase in parallel (2) or in series (1); chosen if left out",
    )
    end_turn_extension_mm: float = Field(
        Construction.end_turn_extension / MILLI,
        ge=0.0,
        le=1000.0,
        description="straight overhang of a coil at each end",
    )
    slot_insulation_mm: float = Field(
        Construction.slot_insulation / MILLI,
        ge=0.0,
        le=10.0,
        description="thickness of the slot liner",
    )
    minimum_slot_opening_mm: float = Field(
        Construction.minimum_slot_opening / MILLI,
        ge=0.0,
        le=100.0,
        description="narrowest slot opening that can be wound",
    )
    sleeve_interference_um: float | None = Field(
        None,
        ge=0.0,
        le=2000.0,
        description="radial shrink-fit interference, cold and at rest; if left out, the one that "
        "leaves contact_pressure_MPa",
    )
    contact_pressure_MPa: float = Field(
        Construction.contact_pressure / MEGA,
        ge=0.0,
        le=1000.0,
        description="pressure to be left between magnets and core at overspeed and temperature",
    )
    end_clearance_mm: float = Field(
        Construction.end_clearance / MILLI,
        ge=0.01,
        le=1000.0,
        description="axial clearance between rotor faces and housing",
    )
    rotor_overhang_mm: float = Field(
        Construction.rotor_overhang / MILLI,
        ge=0.0,
        le=1000.0,
        description="active rotor beyond the stack, both ends together",
    )


class MaterialsSection(Section):
    """Materials by name; `hovergap materials` lists them."""

    stator_steel: str = Field(description="electrical steel of the stator")
    rotor_steel: str = Field(description="steel of the rotor core")
    magnet: str = Field(description="magnet grade")
    conductor: str = Field(description="conductor of the winding")
    sleeve: str = Field(description="sleeve over the magnets")
    shaft: str = Field(description="shaft steel")
    gas: str = Field("Air", description="gas in the rotor chamber")


def _weight(default: float, of: str) -> Any:
    return Field(default, ge=0.0, le=1000.0, description=f"weight of {of}")


def _reference(default: float, of: str) -> Any:
    return Field(default, ge=1e-6, le=1000.0, description=f"{of} that counts as its full weight")


class RippleSection(Section):
    """How the ripple index weighs its three parts."""

    torque_ripple_weight: float = _weight(RippleWeights.torque_ripple_weight, "torque ripple")
    force_error_weight: float = _weight(RippleWeights.force_error_weight, "force error magnitude")
    force_angle_weight: float = _weight(RippleWeights.force_angle_weight, "force error angle")
    torque_ripple_limit: float = _reference(RippleWeights.torque_ripple_limit, "torque ripple")
    force_error_limit: float = _reference(RippleWeights.force_error_limit, "force error magnitude")
    force_angle_limit_deg: float = _reference(
        RippleWeights.force_angle_limit_deg, "force error angle"
    )


class LimitEntry(Section):
    """Bounds of one metric; the key above it is the metric's name."""

    at_most: float | None = Field(None, description="largest permitted value")
    at_least: float | None = Field(None, description="smallest permitted value")


class ObjectiveEntry(Section):
    """One objective: a metric, or a weighted sum of metrics."""

    metric: str | None = Field(None, description="name of the metric")
    weighted_sum: dict[str, float] | None = Field(None, description="metric names with weights")
    name: str | None = Field(None, description="name of a weighted sum")
    sense: Literal["minimise", "maximise"] = Field("minimise", description="which way is better")


class FamilyEntry(Section):
    """One family in full."""

    slots: int = Field(ge=3, le=360, description="number of slots")
    pole_pairs: int = Field(ge=1, le=60, description="pole pairs of the torque field")
    suspension_pole_pairs: int = Field(
        ge=1, le=61, description="pole pairs of the suspension field, pole_pairs + 1 or - 1"
    )
    coil_pitch: int | None = Field(
        None, ge=1, le=180, description="coil span in slots; chosen by the program if left out"
    )


class SearchSection(Section):
    """How much is spent."""

    evaluations_per_family: int = Field(
        4000, ge=1, le=10_000_000, description="designs evaluated in each search of a family"
    )
    searches_per_family: int = Field(
        1,
        ge=1,
        le=100,
        description="independent searches of each family, each from a seed of its own",
    )
    population: int | None = Field(
        None, ge=4, le=10_000, description="designs of one generation; chosen if left out"
    )
    designs_per_call: int = Field(
        18,  # half a generation of three objectives
        ge=1,
        le=10_000,
        description="designs the evaluator gets at a time; one generation is shared in such pieces "
        "among the workers of its search",
    )
    seed: int = Field(1, ge=0, le=2**31 - 1, description="seed of the search")
    total_evaluations: int | None = Field(
        None,
        ge=1,
        le=1_000_000_000,
        description="designs evaluated in all searches together; families without prospects make "
        "room for the others, and evaluations_per_family is the most one search gets",
    )
    stagnation_generations: int | None = Field(
        None,
        ge=1,
        le=1_000_000,
        description="generations of little gain in hypervolume that end a search",
    )
    stagnation_gain: float = Field(
        DEFAULT_GAIN,
        ge=0.0,
        le=10.0,
        description="relative gain in hypervolume over those generations that counts as little",
    )
    feasible_within: int | None = Field(
        None,
        ge=1,
        le=10_000_000,
        description="evaluations without a feasible design that end a search",
    )
    wall_time_min: float | None = Field(
        None,
        ge=0.001,
        le=1e7,
        description="longest duration of one sweep or resume, shared among the searches",
    )
    time_limit_s: float | None = Field(
        None,
        ge=0.01,
        le=1e7,
        description="longest duration of one evaluation; designs are then evaluated one by one",
    )


class EvaluatorSection(Section):
    """Which machine model evaluates the designs."""

    name: str = Field("analytic", description="name of the evaluator")
    settings: dict[str, Any] = Field(
        default_factory=dict, description="settings of that evaluator, see its documentation"
    )


SIMPLE_SECTIONS: dict[str, type[Section]] = {
    "study": StudySection,
    "duty": DutySection,
    "conditions": ConditionsSection,
    "construction": ConstructionSection,
    "materials": MaterialsSection,
    "cooling": CoolingSection,
    "rotor": RotorSection,
    "fault": FaultSection,
    "ripple_index": RippleSection,
    "search": SearchSection,
    "evaluator": EvaluatorSection,
}
"""Sections whose keys are fixed."""

FREE_SECTIONS = ("prices", "variables", "families", "limits", "objectives")
"""Sections whose keys are names of variables, metrics, families or price items."""

OPTIONAL_SECTIONS: dict[str, type[Section]] = {"gas": GasSection}
"""Sections of fixed keys that replace something where they stand."""

REQUIRED_SECTIONS = (
    "study",
    "duty",
    "materials",
    "prices",
    "variables",
    "families",
    "objectives",
)
