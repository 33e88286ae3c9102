"""Heat transfer in the gap, to the coolant and in the end spaces."""

from __future__ import annotations

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI

from evaluators.machine.materials.gas import GasState, gas_state
from evaluators.machine.materials.library import Gas, load
from evaluators.machine.task.cooling import Cooling
from evaluators.machine.thermal.conduction import cylinder_resistance
from evaluators.machine.thermal.convection import (
    disc_coefficient,
    duct_nusselt,
    end_space_coefficient,
    gnielinski_nusselt,
    plate_coefficient,
)
from evaluators.machine.thermal.coolant import frame_conductance, liquid
from evaluators.machine.thermal.gap import (
    VORTEX_ONSET,
    axial_flow_nusselt,
    becker_kaye_nusselt,
    gap_coefficient,
    taylor_squared,
)

AIR = load(Gas, "Air")
WARM = gas_state(AIR, 80.0)


def test_laminar_gap_is_conduction() -> None:
    """Two walls of Nu = 2 in series are a layer of gas as thick as the gap, exactly."""
    radius, gap, length = 0.025, 1e-4, 0.05
    wall = gap_coefficient(radius, gap, 50.0, WARM) * 2.0 * np.pi * (radius + 0.5 * gap) * length
    conduction = 1.0 / cylinder_resistance(radius, radius + gap, WARM.thermal_conductivity, length)
    # The mean radius stands for the logarithm: (gap/radius)²/12.
    assert 0.5 * float(wall) == pytest.approx(float(conduction), rel=2e-6)


def test_vortices_begin_where_taylor_found_them() -> None:
    """Re sqrt(gap/radius) = 41.2 (Taylor 1923): the Nusselt number leaves 2 near there."""
    gap, radius = 0.5e-3, 0.05
    speed = 41.2 * WARM.viscosity / WARM.density / np.sqrt(gap / radius) / (radius * gap)
    onset = taylor_squared(radius, gap, speed, WARM.density, WARM.viscosity)
    # The Reynolds number stands on the rotor, the Taylor number on the mean radius: gap/2 radius.
    assert float(onset) == pytest.approx(VORTEX_ONSET, rel=0.006)
    assert becker_kaye_nusselt(VORTEX_ONSET) == 2.0
    assert becker_kaye_nusselt(2.0 * VORTEX_ONSET) > 2.3


def test_becker_kaye_is_continuous_and_rises() -> None:
    """Coefficients from memory; the three ranges meet within 2 percent of each other."""
    assert pytest.approx(2.0, rel=0.025) == 0.128 * VORTEX_ONSET**0.367
    assert pytest.approx(0.409 * 1e4**0.241, rel=0.02) == 0.128 * 1e4**0.367
    nusselt = becker_kaye_nusselt(np.geomspace(1.0, 1e7, 4001))
    assert np.all(np.diff(nusselt) >= 0.0)
    assert np.max(np.diff(nusselt) / nusselt[:-1]) < 0.005  # no step between neighbours


def test_blown_gap_takes_more_heat() -> None:
    still = gap_coefficient(0.02, 0.6e-3, 5000.0, WARM)
    blown = gap_coefficient(0.02, 0.6e-3, 5000.0, WARM, axial_speed=80.0)
    assert float(blown) > float(still)
    # 0.03 Re^0.8 on twice the gap and sqrt(30² + 40²) = 50 m/s, Gazley 1958 (from memory).
    unit = GasState(*(np.asarray(value) for value in (1.0, 1e-5, 0.03, 1000.0)))
    reynolds = 50.0 * 2e-3 / 1e-5
    expected = 0.5 * 0.03 * reynolds**0.8
    assert axial_flow_nusselt(1e-3, 30.0, 80.0, unit) == pytest.approx(expected, rel=1e-12)


def test_duct() -> None:
    """Gnielinski at Re 1e5, Pr 0.7, f 0.0185 as the reference library ht computes it."""
    assert gnielinski_nusselt(1e5, 0.7, 0.0185) == pytest.approx(184.0429, abs=5e-5)
    assert duct_nusselt(100.0, 5.0) == 3.66
    around = duct_nusselt(np.array([2299.0, 2301.0, 3999.0, 4001.0]), 5.0)
    assert around[1] == pytest.approx(around[0], rel=0.01)
    assert around[3] == pytest.approx(around[2], rel=0.01)


@pytest.mark.parametrize("glycol", [False, True])
@pytest.mark.parametrize("temperature", [10.0, 30.0, 47.0, 70.0, 90.0])
def test_liquids(glycol: bool, temperature: float) -> None:
    fluid = "INCOMP::MEG[0.5]" if glycol else "Water"
    ours = liquid(temperature, glycol)
    # Linear between points 20 K apart; the viscosity bends most.
    for key, value, tolerance in zip("DVLC", ours, (0.003, 0.04, 0.005, 0.005), strict=True):
        expected = PropsSI(key, "T", temperature + 273.15, "P", 3e5, fluid)
        assert float(value) == pytest.approx(expected, rel=tolerance)


def test_jacket_by_hand() -> None:
    """Water of 40 degC, 6 l/min in a channel of 5 x 12 mm over 1 m2 of frame."""
    cooling = Cooling()
    radius, length = np.array([0.5 / np.pi]), np.array([1.0])
    speed, diameter = 1e-4 / 60e-6, 2.0 * 5e-3 * 12e-3 / 17e-3
    reynolds, prandtl = 992.3 * speed * diameter / 6.528e-4, 6.528e-4 * 4179.0 / 0.6286
    h = gnielinski_nusselt(reynolds, prandtl) * 0.6286 / diameter
    both = 1.0 / (1.0 / h + 0.5 / (992.3 * 4179.0 * 1e-4))
    assert frame_conductance(cooling, radius, length)[0] == pytest.approx(float(both), rel=1e-9)


def test_more_flow_cools_better_but_never_beyond_the_wall() -> None:
    radius, length = np.array([0.06]), np.array([0.08])
    flows = [1e-6, 1e-5, 1e-4, 1e-3]
    taken = [frame_conductance(Cooling(coolant_flow=flow), radius, length)[0] for flow in flows]
    assert np.all(np.diff(taken) > 0.0)
    # A trickle warms up to the wall: at most twice its heat capacity counts.
    assert taken[0] < 2.0 * 992.3 * 4179.0 * 1e-6


def test_forced_air() -> None:
    """Ribs multiply the surface by less than their area; without ribs they change nothing."""
    radius, length = np.array([0.07]), np.array([0.1])
    plain = Cooling(method="forced air", rib_height=0.0)
    ribbed = Cooling(method="forced air")
    area = 2.0 * np.pi * 0.07 * 0.1
    air = gas_state(AIR, 40.0)
    h = float(plate_coefficient(8.0, 0.1, air))
    assert frame_conductance(plain, radius, length)[0] == pytest.approx(h * area, rel=1e-12)
    gain = frame_conductance(ribbed, radius, length)[0] / (h * area)
    assert 3.0 < gain < 1.0 + 2.0 * 20.0 / 10.0  # two flanks of 20 mm in a pitch of 10 mm
    # Laminar plate, Pohlhausen: 0.664 sqrt(Re) Pr^(1/3), the heat-transfer form of Blasius' flow.
    reynolds = 8.0 * 0.1 * air.density / air.viscosity
    laminar = 0.664 * np.sqrt(reynolds) * np.cbrt(air.prandtl) * air.thermal_conductivity / 0.1
    assert h >= float(laminar)


def test_coefficient_is_taken_as_given() -> None:
    cooling = Cooling(method="coefficient", heat_transfer_coefficient=100.0)
    conductance = frame_conductance(cooling, np.array([0.5]), np.array([1.0]))
    assert conductance[0] == pytest.approx(100.0 * np.pi, rel=1e-12)


def test_end_space_and_faces() -> None:
    """Schubert 1968 and Cobb, Saunders 1956, both from memory: values and similarity."""
    assert end_space_coefficient(0.0, WARM, WARM) == pytest.approx(15.0)
    assert end_space_coefficient(1.0, WARM, WARM) == pytest.approx(21.0)
    helium = gas_state(load(Gas, "Helium"), 80.0)
    natural = end_space_coefficient(0.0, helium, WARM) / 15.0
    assert float(natural) == pytest.approx(
        float(helium.thermal_conductivity / WARM.thermal_conductivity), rel=1e-12
    )
    slow, fast = disc_coefficient(0.05, np.array([50.0, 5000.0]), WARM)
    reynolds = 50.0 * 0.05**2 * WARM.density / WARM.viscosity
    expected = 0.36 * np.sqrt(reynolds) * WARM.thermal_conductivity / 0.05
    assert slow == pytest.approx(float(expected), rel=1e-12)
    assert fast > 10.0 * slow  # laminar alone would make it ten times
