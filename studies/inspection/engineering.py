"""What stops one design from being built: winding, strength, bending, levitation, magnets, cost."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from textwrap import fill
from typing import Any, NamedTuple

import numpy as np

from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.levitation import BudgetRow, displacement_zones, levitation_budget
from evaluators.machine.mechanics.sleeve import sleeve_stress
from evaluators.machine.performance.mechanics import (
    ASSEMBLY_TEMPERATURE,
    Strength,
    interference_verdict,
)
from evaluators.machine.task.task import Task
from evaluators.machine.thermal.insulation import CLASS_TEMPERATURE
from studies.inspection.design import Inspection
from studies.tables import GAP, WIDEST, number, percent, prose_table, text_table

MICRO, MEGA = 1e-6, 1e6
RPM = 30.0 / math.pi
NO_ROTOR_DYNAMICS = (
    "These bending speeds are a first estimate (stepped beam, no gyroscopic effect, no controller) "
    "and replace no rotor-dynamic analysis by somebody qualified for it."
)
SUPPLIED = "force at "
NO_PROOF = "The table is a budget for choosing designs, no proof that a controller levitates it."


class State(NamedTuple):
    """Rotor at one speed and temperature, stresses and pressures in MPa."""

    speed_rpm: float
    temperature_C: float
    sleeve_hoop_MPa: float
    sleeve_ratio: float
    sleeve_radial_tension_MPa: float
    magnet_pressure_MPa: float
    core_pressure_MPa: float
    core_hoop_MPa: float


# -- what the text and the JSON say ------------------------------------------------------------


def engineering_text(found: Inspection) -> list[str]:
    """Sections of the inspection of an evaluated design; those whose metrics are stored."""
    task, sections, row = found.task, found.sections, found.row
    if task is None or sections is None:
        return []
    makers: tuple[tuple[Callable[[], str], tuple[str, ...]], ...] = (
        (lambda: _winding(task, row), WINDING),
        (lambda: _heat(task, row), HEAT),
        (lambda: _strength(task, sections, row), STRENGTH),
        (lambda: _bending(task, row), BENDING),
        (lambda: _levitation(task, row), LEVITATION),
        (lambda: _magnets(task, row), MAGNETS),
        (lambda: _cost(found.currency, row), COST),
    )
    return [_folded(make()) for make, needed in makers if _stored(row, needed)]


def _folded(section: str) -> str:
    """Break long lines of prose; tables stay as they are."""
    lines = section.split("\n")
    return "\n".join(line if GAP in line else fill(line, WIDEST) for line in lines)


def engineering_json(found: Inspection) -> dict[str, Any]:
    """The same for programs; parts whose metrics are not stored are left out."""
    task, row = found.task, found.row
    content: dict[str, Any] = {}
    if task is None or not found.evaluated:
        return content
    if _stored(row, STRENGTH) and found.sections is not None:
        content["strength_states"] = [
            state._asdict() for state in strength_states(task, found.sections, row)
        ]
        content["interference"] = _verdict(task, found.sections, row)
    if _stored(row, LEVITATION):
        content["levitation_budget"] = [
            item._asdict() | {"ratio": item.ratio if math.isfinite(item.ratio) else None}
            for item in _budget(row, task)
        ]
        content["displacement_zones_um"] = _zones(row)
    content["bending"] = NO_ROTOR_DYNAMICS
    return content


def sourced_table(head: Sequence[str], rows: Sequence[Sequence[str]], left: int = 1) -> str:
    """A table whose last column is a source."""
    return prose_table(head, rows, left)


# -- topics ------------------------------------------------------------------------------------

WINDING = (
    "turns_per_coil",
    "strands_per_turn",
    "wire_diameter_mm",
    "parallel_groups",
    "phase_current_A",
    "torque_current_A",
    "suspension_current_A",
    "conductor_density_A_mm2",
    "copper_fill",
    "slot_occupation",
    "phase_voltage_V",
    "power_factor",
    "loss_strand_eddy_W",
)


def _winding(task: Task, row: Mapping[str, Any]) -> str:
    groups = "in parallel" if row["parallel_groups"] > 1.0 else "in series"
    return (
        f"Winding: {row['turns_per_coil']:.0f} turns a coil of {row['strands_per_turn']:.0f} "
        f"strands of {number(row['wire_diameter_mm'])} mm bare copper, groups {groups} for torque; "
        f"the wires take {percent(row['slot_occupation'])} of their places, copper fill "
        f"{number(row['copper_fill'], 3)}.\n"
        f"Current (r.m.s.): {number(row['phase_current_A'])} A in a conductor "
        f"({number(row['conductor_density_A_mm2'], 3)} A/mm2), at the terminals "
        f"{number(row['torque_current_A'])} A for torque and "
        f"{number(row['suspension_current_A'])} A for suspension.\n"
        f"Voltage (peak, phase): {number(row['phase_voltage_V'])} V of "
        f"{number(task.duty.phase_voltage_limit)} V that the DC link makes after its reserve, "
        f"power factor {number(row['power_factor'], 3)}; eddy currents in the strands cost "
        f"{number(row['loss_strand_eddy_W'], 3)} W."
    )


HEAT = ("winding_temperature_C", "hot_spot_temperature_C", "magnet_temperature_C")


def _heat(task: Task, row: Mapping[str, Any]) -> str:
    cooling = task.cooling
    limit = CLASS_TEMPERATURE[cooling.insulation_class]
    return (
        f"Heat: winding {number(row['winding_temperature_C'])} degC in the mean, "
        f"{number(row['hot_spot_temperature_C'])} degC at its hot spot with an allowance of "
        f"{cooling.hot_spot_allowance:g} K; class {cooling.insulation_class} ends at "
        f"{limit:g} degC (IEC 60085). Magnets {number(row['magnet_temperature_C'])} degC."
    )


STRENGTH = ("sleeve_interference_um", "interference_window_um", "sleeve_temperature_C")


def strength_states(
    task: Task, sections: CrossSections, row: Mapping[str, Any]
) -> tuple[State, ...]:
    """Rotor at rest, at the duty and at overspeed, cold and hot."""
    rotor = Strength.at(task, sections, np.array([float(row["sleeve_temperature_C"])]))
    speeds = np.array([0.0, task.duty.speed, rotor.overspeed]).reshape(3, 1, 1)
    interference = np.array([MICRO * float(row["sleeve_interference_um"])])
    found = sleeve_stress(rotor.section, interference, speeds, rotor.heating)
    deciding, core = rotor.sleeve_stress(found), rotor.core_stress(found, speeds)
    heated = rotor.heating + ASSEMBLY_TEMPERATURE
    return tuple(
        State(
            speed_rpm=RPM * float(speeds[i, 0, 0]),
            temperature_C=float(heated[j, 0]),
            sleeve_hoop_MPa=float(found.hoop_stress[i, j, 0]) / MEGA,
            sleeve_ratio=float(deciding[i, j, 0] / rotor.strength[j, 0]),
            sleeve_radial_tension_MPa=float(found.radial_tension[i, j, 0]) / MEGA,
            magnet_pressure_MPa=float(found.sleeve_pressure[i, j, 0]) / MEGA,
            core_pressure_MPa=float(found.core_pressure[i, j, 0]) / MEGA,
            core_hoop_MPa=float(core[i, j, 0]) / MEGA,
        )
        for i in range(3)
        for j in range(2)
    )


def _verdict(task: Task, sections: CrossSections, row: Mapping[str, Any]) -> str:
    rotor = Strength.at(task, sections, np.array([float(row["sleeve_temperature_C"])]))
    least = float(rotor.least_interference(task.construction.contact_pressure)[0]) / MICRO
    return interference_verdict(least, float(row["interference_window_um"]))


def _strength(task: Task, sections: CrossSections, row: Mapping[str, Any]) -> str:
    rows = [
        [
            f"{state.speed_rpm:.0f} r/min",
            f"{state.temperature_C:.0f}",
            number(state.sleeve_hoop_MPa),
            percent(state.sleeve_ratio),
            number(state.sleeve_radial_tension_MPa, 3),
            number(state.magnet_pressure_MPa, 3),
            number(state.core_pressure_MPa, 3),
            number(state.core_hoop_MPa, 3),
        ]
        for state in strength_states(task, sections, row)
    ]
    head = [
        "rotor at",
        "degC",
        "sleeve hoop",
        "of strength",
        "radial tension",
        "on magnets",
        "on core",
        "core hoop",
    ]
    pressed = task.construction.contact_pressure / MEGA
    return (
        f"Rotor strength, MPa, with {number(row['sleeve_interference_um'])} um of radial "
        f"interference under {task.materials.sleeve.name!r}; a negative pressure on the core means "
        f"that the magnets have lifted.\n{text_table(head, rows)}\n"
        f"Interference, with {pressed:g} MPa left on the core: "
        f"{_verdict(task, sections, row)}. A sleeve is proved by an overspeed test under "
        "containment, not by this table."
    )


BENDING = ("free_bending_speed_rpm", "bending_speed_rpm", "separation_margin")


def _bending(task: Task, row: Mapping[str, Any]) -> str:
    duty = task.duty
    speeds = RPM * duty.speed * np.array([duty.lowest_speed_ratio, duty.highest_speed_ratio])
    where = f"{speeds[0]:.0f}" if speeds[0] == speeds[1] else f"{speeds[0]:.0f} to {speeds[1]:.0f}"
    if row["separation_margin"] >= 0.0:
        verdict = f"clear of it by {percent(row['separation_margin'])} more than API 617 asks"
    else:
        verdict = f"too near by {percent(-row['separation_margin'])} of the speed (API 617)"
    return (
        f"Bending: first at {number(row['free_bending_speed_rpm'], 5)} r/min hanging free, "
        f"{number(row['bending_speed_rpm'], 5)} r/min on its suspension; the duty runs at {where} "
        f"r/min, and the nearest bending speed is {verdict}.\n{NO_ROTOR_DYNAMICS}"
    )


LEVITATION = (
    "rotor_weight_N",
    "force_N",
    "rated_force_N",
    "unbalance_force_N",
    "magnetic_pull_N",
    "suspension_demand_N",
    "lift_off_ratio",
    "zone_a_displacement_um",
    "force_slew_N_ms",
    "control_bandwidth_Hz",
    "unstable_pole_Hz",
)


def _zones(row: Mapping[str, Any]) -> dict[str, float]:
    """Displacement limits of all zones in um."""
    clearance = float(row["zone_a_displacement_um"]) / float(displacement_zones(1.0)["A"])
    return {zone: float(limit) for zone, limit in displacement_zones(clearance).items()}


def _budget(row: Mapping[str, Any], task: Task) -> tuple[BudgetRow, ...]:
    return levitation_budget({name: float(row[name]) for name in LEVITATION}, task.duty)


def _levitation(task: Task, row: Mapping[str, Any]) -> str:
    rows = [
        [
            item.demand,
            number(item.demand_N),
            item.supply.removeprefix(SUPPLIED),
            number(item.supply_N),
            number(item.ratio, 3) if math.isfinite(item.ratio) else "-",
            item.source,
        ]
        for item in _budget(row, task)
    ]
    head = ["demand on the suspension", "N", SUPPLIED.strip(), "N", "ratio", "source"]
    zones = ", ".join(f"{zone} up to {number(limit, 3)} um" for zone, limit in _zones(row).items())
    table = sourced_table(head, rows)
    return (
        f"Levitation budget\n{table}\n"
        f"Force changes by up to {number(row['force_slew_N_ms'], 3)} N/ms; the voltage allows a "
        f"power bandwidth of {number(row['control_bandwidth_Hz'], 3)} Hz (switching and sampling "
        f"allow less) against an unstable pole at {number(row['unstable_pole_Hz'], 3)} Hz. Peak "
        f"displacement by zones of ISO 14839-2:2004 (from memory): {zones}.\n{NO_PROOF}"
    )


MAGNETS = (
    "magnet_temperature_C",
    "magnet_flux_density_T",
    "knee_flux_density_T",
    "demagnetisation_margin_T",
    "fault_magnet_flux_density_T",
    "fault_demagnetisation_margin_T",
    "fault_current_ratio",
)


def _magnets(task: Task, row: Mapping[str, Any]) -> str:
    current = f"{number(row['fault_current_ratio'], 3)} times the torque current against them"
    fault = (
        "short circuit of three phases" if task.fault.kind == "short circuit" else "stated fault"
    )
    rows = [
        ["at the duty", row["magnet_flux_density_T"], row["demagnetisation_margin_T"]],
        [
            f"{fault}, {current}",
            row["fault_magnet_flux_density_T"],
            row["fault_demagnetisation_margin_T"],
        ],
    ]
    lines = [
        [name, number(lowest), number(row["knee_flux_density_T"]), number(margin)]
        for name, lowest, margin in rows
    ]
    return text_table(
        [
            f"magnets at {number(row['magnet_temperature_C'])} degC",
            "lowest T",
            "knee T",
            "margin T",
        ],
        lines,
    )


COST = ("cost_low", "cost", "cost_high")


def _cost(currency: str, row: Mapping[str, Any]) -> str:
    low, base, high = (number(row[name]) for name in COST)
    return (
        f"Active materials, {currency}: {base} at the study's prices; {low} in its cheap and "
        f"{high} in its dear market."
    )


def _stored(row: Mapping[str, Any], names: Sequence[str]) -> bool:
    """Whether the evaluator returned all these metrics."""
    return all(row.get(name) is not None for name in names)
