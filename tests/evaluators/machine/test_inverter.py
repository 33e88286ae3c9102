"""Turns, groups and phase voltage."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest
from machines import FAMILIES, Numbers
from outside import OutsideChecks

from evaluators.machine.drive.inverter import choose_turns, phase_voltage
from evaluators.machine.winding.families import design_winding

check = OutsideChecks("drive")


def test_most_turns_that_fit() -> None:
    turns = choose_turns([10.0, 33.0, 101.0, 400.0], 300.0, 1)
    np.testing.assert_array_equal(turns.per_coil, [30.0, 9.0, 2.0, 1.0])
    np.testing.assert_array_equal(turns.groups, 1.0)


def test_parallel_groups_are_taken_where_they_use_the_voltage_better() -> None:
    """101 V a turn: 2 in series make 202 V, 5 in parallel 252.5 V of 300 V."""
    voltage = np.array([101.0, 100.0, 400.0, 700.0])
    turns = choose_turns(voltage, 300.0, None)
    np.testing.assert_array_equal(turns.per_coil, [5.0, 3.0, 1.0, 1.0])
    # Equal use keeps the series connection; above the limit the lower voltage wins.
    np.testing.assert_array_equal(turns.groups, [2.0, 1.0, 2.0, 2.0])
    use = turns.per_coil * voltage / turns.groups / 300.0
    assert np.all(use[:3] <= 1.0)


def test_never_worse_than_series() -> None:
    voltage = np.random.default_rng(5).uniform(3.0, 250.0, 500)
    free, series = choose_turns(voltage, 300.0, None), choose_turns(voltage, 300.0, 1)
    use = free.per_coil * voltage / free.groups
    assert np.all(use <= 300.0)
    assert np.all(use >= series.per_coil * voltage - 1e-9)
    # One more turn would be too many.
    assert np.all((free.per_coil + 1.0) * voltage / free.groups > 300.0)


@pytest.mark.parametrize("numbers", FAMILIES, ids=str)
def test_coils_of_a_group_are_never_alike_in_both_fields(numbers: Numbers) -> None:
    """Why only whole groups may be in parallel: no two coils of a group link both fields alike."""
    winding = design_winding(*numbers)
    family, axes = winding.family, winding.coil_axes
    for phase in range(3):
        for group in range(2):
            coils = np.flatnonzero((winding.phase == phase) & (winding.group == group))
            for one, other in combinations(coils, 2):
                sense = winding.sense[one] * winding.sense[other]
                alike = [
                    abs(np.exp(1j * order * (axes[one] - axes[other])) - sense) < 1e-9
                    for order in (family.pole_pairs, family.suspension_pole_pairs)
                ]
                assert not all(alike)


def test_phasor_diagram() -> None:
    """3-4-5: EMF 30 V and 10 V of resistance in phase, 30 V of reactance across them."""
    voltage = phase_voltage(30.0, 1.0, 3.0, 4.0, 10.0, 2.0)
    assert voltage.torque == pytest.approx(50.0)
    assert voltage.power_factor == pytest.approx(0.8)
    assert voltage.suspension == pytest.approx(2.0 * np.hypot(1.0, 4.0))


def test_power_factor_by_time_averages() -> None:
    """Mean of u i over a period over the product of the root mean squares."""
    angle = 2.0 * np.pi * np.arange(360) / 360.0
    e, r, x, i = 120.0, 0.4, 2.3, 31.0
    current = i * np.cos(angle)
    terminal = (e + r * i) * np.cos(angle) - x * i * np.sin(angle)
    expected = np.mean(terminal * current) / np.sqrt(np.mean(terminal**2) * np.mean(current**2))
    found = phase_voltage(e, r, x, x, i, 0.0)
    check(
        "power factor and voltage of a phase",
        [found.power_factor, found.torque],
        [expected, np.sqrt(2.0 * np.mean(terminal**2))],
        relative=1e-12,
        why="rounding",
        source="averages of u i, u² and i² over a period, by their definition",
    )
