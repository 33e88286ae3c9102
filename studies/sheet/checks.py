"""Worked values: a few results found again from other results by textbook formulas.

They are quick to follow with a pocket calculator and catch a slip of a factor or a unit; they are
coarser than the model, and each says how near it should come.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from math import pi, sqrt
from typing import Any

from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.task.task import STANDARD_GRAVITY, Task
from studies.tables import number


@dataclass(frozen=True)
class Check:
    """One worked value.

    Attributes
    ----------
    name, formula, worked : str
        What, by which formula, and the formula with numbers.
    by_hand, reported : float
    unit : str
    tolerance : float
        Share of the reported value by which both may differ.
    why : str
        Why they may.
    """

    name: str
    formula: str
    worked: str
    by_hand: float
    reported: float
    unit: str
    tolerance: float
    why: str

    @property
    def difference(self) -> float:
        """By hand over reported, less one."""
        return self.by_hand / self.reported - 1.0 if self.reported else 0.0

    @property
    def agrees(self) -> bool:
        """Whether both are as near as they should be."""
        return abs(self.difference) <= self.tolerance


def worked_checks(task: Task, sections: CrossSections, row: Mapping[str, Any]) -> list[Check]:
    """Checks of one design; those whose metrics the evaluator does not return are left out.

    Parameters
    ----------
    task : Task
    sections : CrossSections
        Of this one design.
    row : mapping
        Stored metrics and variables by name.
    """
    makers = (
        _tip_speed,
        _frequency,
        _torque,
        _emf,
        _copper_loss,
        _density,
        _voltage,
        _efficiency,
        _magnets,
        _weight,
        _force_per_weight,
        _unbalance,
    )
    found = []
    for make in makers:
        try:
            found.append(make(task, sections, row))
        except KeyError:
            continue  # the evaluator has no such metric
    return found


class _Numbers:
    """Metrics by name, refusing those that are missing."""

    def __init__(self, row: Mapping[str, Any]) -> None:
        self.row = row

    def __getattr__(self, name: str) -> float:
        value = self.row[name]
        if value is None:
            raise KeyError(name)
        return float(value)


def _n(value: float) -> str:
    return number(value, 4)


def _tip_speed(task: Task, sections: CrossSections, row: Mapping[str, Any]) -> Check:
    radius = float(sections.rotor_radius[0])
    speed = task.duty.speed
    return Check(
        "surface speed of the rotor",
        "v = ω r",
        f"{_n(speed)} rad/s × {_n(radius)} m",
        speed * radius,
        _Numbers(row).tip_speed_m_s,
        "m/s",
        1e-6,
        "the same formula",
    )


def _frequency(task: Task, sections: CrossSections, row: Mapping[str, Any]) -> Check:
    pairs, speed = task.winding.family.pole_pairs, task.duty.speed
    return Check(
        "electrical frequency",
        "f = p n / 60",
        f"{pairs} × {_n(speed * 30.0 / pi)} r/min / 60",
        pairs * speed / (2.0 * pi),
        task.electrical_frequency,
        "Hz",
        1e-6,
        "the same formula",
    )


def _torque(task: Task, sections: CrossSections, row: Mapping[str, Any]) -> Check:
    """Power of the EMF: both are peak per phase, the current in phase with the EMF."""
    metric = _Numbers(row)
    emf, current, speed = metric.back_emf_V, metric.torque_current_A, task.duty.speed
    return Check(
        "torque from EMF and current",
        "T = 3 (E/√2) I / ω",
        f"3 × {_n(emf)} V/√2 × {_n(current)} A / {_n(speed)} rad/s",
        3.0 * emf / sqrt(2.0) * current / speed,
        metric.torque_Nm,
        "N m",
        0.02,
        "power balance of the fundamental; saturation by the current itself",
    )


def _emf(task: Task, sections: CrossSections, row: Mapping[str, Any]) -> Check:
    metric, family = _Numbers(row), task.winding.family
    radius, length = float(sections.bore_radius[0]), 1e-3 * metric.stack_length_mm
    flux = 2.0 * metric.gap_flux_density_T * radius * length / family.pole_pairs
    turns = metric.turns_per_coil / float(row.get("parallel_groups") or 1.0)
    coils, factor = family.slots / 3.0, task.winding.torque_winding_factor
    omega = 2.0 * pi * task.electrical_frequency
    return Check(
        "EMF from the gap flux density",
        "E = ωe (Q/3) N kw 2 B r L / p",
        f"{_n(omega)} rad/s × {coils:g} × {turns:g} × {factor:.3f} × {_n(flux)} Wb",
        omega * coils * turns * factor * flux,
        metric.back_emf_V,
        "V",
        0.05,
        "slots thin out the flux over their openings",
    )


def _copper_loss(task: Task, sections: CrossSections, row: Mapping[str, Any]) -> Check:
    metric = _Numbers(row)
    slots = task.winding.family.slots
    area = metric.strands_per_turn * 0.25 * pi * (1e-3 * metric.wire_diameter_mm) ** 2
    end = float(sections.end_turn_length(task.construction)[0])
    turn = 2.0 * (1e-3 * metric.stack_length_mm + end)
    resistivity = float(task.materials.conductor.resistivity.at(metric.winding_temperature_C))
    current = metric.phase_current_A
    direct = slots * metric.turns_per_coil * turn * resistivity / area * current**2
    return Check(
        "copper loss",
        "P = Q N l ρ / a I² + strand eddy currents",
        f"{slots} × {metric.turns_per_coil:g} × {_n(turn)} m × {_n(1e9 * resistivity)} nΩ m / "
        f"{_n(1e6 * area)} mm² × ({_n(current)} A)² + {_n(metric.loss_strand_eddy_W)} W",
        direct + metric.loss_strand_eddy_W,
        metric.loss_copper_W,
        "W",
        0.08,
        "slot and end turns differ in temperature",
    )


def _density(task: Task, sections: CrossSections, row: Mapping[str, Any]) -> Check:
    metric = _Numbers(row)
    area = metric.strands_per_turn * 0.25 * pi * metric.wire_diameter_mm**2
    return Check(
        "current density",
        "J = I / a",
        f"{_n(metric.phase_current_A)} A / {_n(area)} mm²",
        metric.phase_current_A / area,
        metric.conductor_density_A_mm2,
        "A/mm²",
        1e-6,
        "the same formula",
    )


def _voltage(task: Task, sections: CrossSections, row: Mapping[str, Any]) -> Check:
    metric, duty = _Numbers(row), task.duty
    limit = duty.dc_link_voltage / sqrt(3.0) * (1.0 - duty.voltage_reserve)
    return Check(
        "use of the inverter voltage",
        "u = U / (Udc/√3 (1 − reserve))",
        f"{_n(metric.phase_voltage_V)} V / {_n(limit)} V",
        metric.phase_voltage_V / limit,
        metric.voltage_use,
        "",
        1e-6,
        "the same formula",
    )


def _efficiency(task: Task, sections: CrossSections, row: Mapping[str, Any]) -> Check:
    metric, power = _Numbers(row), task.duty.power
    parts = [
        metric.loss_copper_W,
        metric.loss_iron_W,
        metric.loss_magnet_W,
        metric.loss_sleeve_W,
        metric.loss_air_friction_W,
    ]
    return Check(
        "efficiency from the separate losses",
        "η = P / (P + Σ losses)",
        f"{_n(power)} W / ({_n(power)} + {' + '.join(_n(item) for item in parts)}) W",
        power / (power + sum(parts)),
        metric.efficiency,
        "",
        1e-3,
        "rounding",
    )


def _magnets(task: Task, sections: CrossSections, row: Mapping[str, Any]) -> Check:
    metric = _Numbers(row)
    length = 1e-3 * metric.stack_length_mm + task.construction.rotor_overhang
    area, density = float(sections.magnet_area[0]), float(task.materials.magnet.density.value)
    return Check(
        "mass of the magnets",
        "m = ρ A L",
        f"{_n(density)} kg/m³ × {_n(1e6 * area)} mm² × {_n(1e3 * length)} mm",
        density * area * length,
        metric.magnet_mass_kg,
        "kg",
        1e-3,
        "rounding",
    )


def _weight(task: Task, sections: CrossSections, row: Mapping[str, Any]) -> Check:
    metric = _Numbers(row)
    return Check(
        "rotor weight",
        "W = g m",
        f"{STANDARD_GRAVITY:.5g} m/s² × {_n(metric.rotor_mass_kg)} kg",
        STANDARD_GRAVITY * metric.rotor_mass_kg,
        metric.rotor_weight_N,
        "N",
        1e-6,
        "the same formula",
    )


def _force_per_weight(task: Task, sections: CrossSections, row: Mapping[str, Any]) -> Check:
    metric = _Numbers(row)
    return Check(
        "force over weight",
        "F / W",
        f"{_n(metric.force_N)} N / {_n(metric.rotor_weight_N)} N",
        metric.force_N / metric.rotor_weight_N,
        metric.force_per_weight,
        "",
        1e-6,
        "the same formula",
    )


def _unbalance(task: Task, sections: CrossSections, row: Mapping[str, Any]) -> Check:
    metric, duty = _Numbers(row), task.duty
    mass = metric.rotor_weight_N / STANDARD_GRAVITY
    return Check(
        "force of the permissible unbalance (ISO 21940-11)",
        "F = m G ω",
        f"{_n(mass)} kg × {1e3 * duty.balance_grade:g} mm/s × {_n(duty.speed)} rad/s",
        mass * duty.balance_grade * duty.speed,
        metric.unbalance_force_N,
        "N",
        1e-3,
        "rounding",
    )
