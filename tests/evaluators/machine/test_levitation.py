"""Levitation: zones, slew rate, bandwidth and the table of demands and supplies."""

from __future__ import annotations

import numpy as np
import pytest
from outside import OutsideChecks
from scipy.integrate import solve_ivp

from evaluators.machine.levitation import (
    SENSITIVITY_LIMITS_DB,
    displacement_zones,
    force_slew_rate,
    levitation_budget,
    power_bandwidth,
    unstable_pole,
)
from evaluators.machine.task.task import Duty

check = OutsideChecks("levitation")


def test_displacement_zones() -> None:
    zones = displacement_zones(np.array([250e-6, 500e-6]))
    check(
        "displacement zones A, B and C",
        [zones[letter] for letter in "ABC"],
        [[75e-6, 150e-6], [100e-6, 200e-6], [125e-6, 250e-6]],
        relative=1e-7,
        why="rounding",
        source="ISO 14839-2: 0.3, 0.4 and 0.5 of the smallest clearance (from memory)",
    )


def test_sensitivity_zones_in_plain_numbers() -> None:
    ratio = [10.0 ** (decibel / 20.0) for decibel in SENSITIVITY_LIMITS_DB.values()]
    check(
        "limits of the sensitivity zones as plain ratios",
        ratio,
        [3.0, 4.0, 5.0],
        relative=0.005,
        why="decibels rounded to a half",
        source="ISO 14839-3: 9.5, 12 and 14 dB are stated as 3, 4 and 5 (from memory)",
    )
    np.testing.assert_allclose(ratio, [2.985383, 3.981072, 5.011872], rtol=2e-7)


def test_slew_rate_by_integration() -> None:
    run = solve_ivp(lambda _, i: [48.0 / 2e-3], (0.0, 1e-3), [0.0])
    check(
        "slew rate of the force",
        force_slew_rate(3.5, 48.0, 2e-3),
        3.5 * run.y[0, -1] / 1e-3,
        relative=1e-9,
        why="rounding of the integration",
        source="the whole voltage on an inductance, integrated (scipy solve_ivp)",
    )
    assert force_slew_rate(3.5, -5.0, 2e-3) == 0.0  # no voltage left


def test_bandwidth_is_where_the_steepest_slope_meets_the_slew_rate() -> None:
    slew, force = 2e5, 40.0
    frequency = float(power_bandwidth(slew, force))
    time = np.linspace(0.0, 1.0 / frequency, 200_001)
    steepest = np.max(np.diff(force * np.sin(2.0 * np.pi * frequency * time)) / np.diff(time))
    check(
        "steepest slope of the largest sine force at the power bandwidth",
        steepest,
        slew,
        relative=1e-6,
        why="200,000 steps a period",
        source="slope of a sampled sine",
    )


def test_unstable_pole_by_integration() -> None:
    stiffness, mass = 5e4, 1.3
    rate = 2.0 * np.pi * float(unstable_pole(stiffness, mass))
    run = solve_ivp(
        lambda _, y: [y[1], stiffness / mass * y[0]], (0.0, 0.02), [1.0, rate], rtol=1e-10
    )
    check(
        "run-off of a free rotor at its unstable pole",
        np.exp(0.02 * rate),
        run.y[0, -1],
        relative=1e-6,
        why="tolerance of the integration",
        source="equation of motion integrated (scipy solve_ivp)",
    )


METRICS = {
    "rotor_weight_N": 10.0,
    "force_N": 30.0,
    "rated_force_N": 90.0,
    "unbalance_force_N": 5.0,
    "magnetic_pull_N": 3.0,
    "suspension_demand_N": 20.0,
    "lift_off_ratio": 4.5,
}


def test_budget_table() -> None:
    duty = Duty(power=1e3, speed=1e3, process_force=2.0)
    rows = levitation_budget(METRICS, duty)
    assert [row.demand_N for row in rows] == [10.0, 5.0, 3.0, 2.0, 20.0, 20.0, 20.0]
    assert [row.supply_N for row in rows] == [30.0] * 5 + [90.0] * 2
    assert [row.ratio for row in rows] == [3.0, 6.0, 10.0, 15.0, 1.5, 4.5, 4.5]
    assert all(row.source for row in rows)


def test_vertical_shaft_demands_no_weight() -> None:
    rows = levitation_budget(METRICS, Duty(power=1e3, speed=1e3, orientation="vertical"))
    assert rows[0].demand_N == 0.0
    assert rows[0].ratio == float("inf")
    assert "vertical" in rows[0].demand


def test_orientation_that_is_none_is_refused() -> None:
    with pytest.raises(
        ValueError, match=r"duty: orientation = 'sideways' must be horizontal or vertical"
    ):
        Duty(power=1e3, speed=1e3, orientation="sideways")  # type: ignore[arg-type]
