"""What the suspension must hold, what it can make, and how fast.

The supplies are linear in the current; near saturation they fall short. The table is a budget
for choosing designs, no proof that a controller levitates the rotor.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.quantity import FloatArray, floats
from evaluators.machine.task.task import Duty

ZONE_LIMITS = {"A": 0.3, "B": 0.4, "C": 0.5}
"""Largest displacement of each zone over the smallest clearance; ISO 14839-2:2004 (from memory)."""

SENSITIVITY_LIMITS_DB = {"A": 9.5, "B": 12.0, "C": 14.0}
"""Largest peak of the sensitivity function of each zone; ISO 14839-3:2006 (from memory)."""


def displacement_zones(clearance: ArrayLike) -> dict[str, FloatArray]:
    """Return the largest peak displacement in m of the zones A, B and C of ISO 14839-2.

    Zone A is for new machines, C is for continued operation with care, beyond it lies D.

    Parameters
    ----------
    clearance
        Smallest radial clearance, that of the touchdown bearings, in m.
    """
    return {zone: np.asarray(share * floats(clearance)) for zone, share in ZONE_LIMITS.items()}


def force_slew_rate(
    force_per_ampere: ArrayLike, voltage: ArrayLike, inductance: ArrayLike
) -> FloatArray:
    """Return the fastest change of the force in N/s, k_i U / L.

    Schweitzer, Maslen, *Magnetic Bearings*, 2009, on power bandwidth (from memory).

    Parameters
    ----------
    force_per_ampere
        N/A of peak suspension current.
    voltage
        Peak phase voltage left for changing the suspension current, V; not below zero.
    inductance
        To the suspension current, H.
    """
    return np.asarray(
        floats(force_per_ampere) * np.maximum(floats(voltage), 0.0) / floats(inductance)
    )


def power_bandwidth(slew_rate: ArrayLike, force: ArrayLike) -> FloatArray:
    """Return the highest frequency in Hz of a sinusoidal force of amplitude `force` (N).

    Slew rate over 2 pi times the amplitude; the small-signal bandwidth is higher.
    """
    return np.asarray(floats(slew_rate) / (2.0 * np.pi * floats(force)))


def unstable_pole(stiffness: ArrayLike, mass: ArrayLike) -> FloatArray:
    """Return sqrt(k/m)/2 pi in Hz: how fast the rotor falls off its centre without control.

    Stiffness of the magnetic pull in N/m, rotor mass in kg. A controller needs several times it.
    """
    return np.asarray(np.sqrt(floats(stiffness) / floats(mass)) / (2.0 * np.pi))


class BudgetRow(NamedTuple):
    """One line of the levitation budget, in N."""

    demand: str
    demand_N: float
    supply: str
    supply_N: float
    ratio: float
    source: str


RUNNING, RATED = "force at the suspension share", "force at rated suspension current"


def levitation_budget(metrics: Mapping[str, float], duty: Duty) -> tuple[BudgetRow, ...]:
    """Return the table of demands and supplies of one design.

    Parameters
    ----------
    metrics
        By the names of `evaluators.machine.metrics`, of one evaluated design.
    duty
        For the orientation of the shaft and the process force.

    Returns
    -------
    tuple of BudgetRow
        The ratio is infinite where nothing is demanded.
    """
    weight = metrics["rotor_weight_N"] if duty.orientation == "horizontal" else 0.0
    running, rated = metrics["force_N"], metrics["rated_force_N"]
    rows = (
        (f"rotor weight, {duty.orientation} shaft", weight, RUNNING, running, "definition"),
        (
            "residual unbalance at the highest speed",
            metrics["unbalance_force_N"],
            RUNNING,
            running,
            "ISO 21940-11:2016",
        ),
        (
            "magnetic pull at the permitted displacement",
            metrics["magnetic_pull_N"],
            RUNNING,
            running,
            "ISO 14839-2:2004 for the displacement",
        ),
        ("process force", duty.process_force, RUNNING, running, "study"),
        ("all of these at once", metrics["suspension_demand_N"], RUNNING, running, "definition"),
        ("all of these at once", metrics["suspension_demand_N"], RATED, rated, "definition"),
        (
            "lift-off from the touchdown bearings",
            rated / metrics["lift_off_ratio"],
            RATED,
            rated,
            "definition",
        ),
    )
    return tuple(
        BudgetRow(
            demand, wanted, supply, made, made / wanted if wanted > 0.0 else float("inf"), source
        )
        for demand, wanted, supply, made, source in rows
    )
