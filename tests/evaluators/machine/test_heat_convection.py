"""Heat transfer in the gap, to the coolant and in the end spaces."""

from __future__ import annotations

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI
from outside import OutsideChecks

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

check = OutsideChecks("heat")


def test_laminar_gap_is_conduction() -> None:
    radius, gap, length = 0.025, 1e-4, 0.05
    wall = gap_coefficient(radius, gap, 50.0, WARM) * 2.0 * np.pi * (radius + 0.5 * gap) * length
    conduction = 1.0 / cylinder_resistance(radius, radius + gap, WARM.thermal_conductivity, length)
    check(
        "heat across a laminar gap",
        0.5 * float(wall),
        float(conduction),
        relative=2e-6,
        why="the mean radius stands for the logarithm: (gap/radius)²/12",
        source="two walls of Nu = 2 in series are a layer of still gas as thick as the gap",
    )


def test_vortices_begin_where_taylor_found_them() -> None:
    """The Nusselt number leaves 2 near there."""
    gap, radius = 0.5e-3, 0.05
    speed = 41.2 * WARM.viscosity / WARM.density / np.sqrt(gap / radius) / (radius * gap)
    onset = taylor_squared(radius, gap, speed, WARM.density, WARM.viscosity)
    check(
        "square of the Taylor number where vortices begin",
        VORTEX_ONSET,
        float(onset),
        relative=0.006,
        why="the Reynolds number stands on the rotor, the Taylor number on the mean radius: "
        "gap/(2 radius)",
        source="Taylor 1923: Re sqrt(gap/radius) = 41.2",
    )
    assert becker_kaye_nusselt(VORTEX_ONSET) == 2.0
    assert becker_kaye_nusselt(2.0 * VORTEX_ONSET) > 2.3


def test_becker_kaye_is_continuous_and_rises() -> None:
    """The three ranges meet within 2.5 percent of each other."""
    check(
        "Nusselt number of a gap below, above and far above the onset of vortices",
        becker_kaye_nusselt(np.array([1e3, 3e3, 1e5])),
        [2.0, 0.128 * 3e3**0.367, 0.409 * 1e5**0.241],
        relative=1e-12,
        why="rounding",
        source="Becker, Kaye 1962 (coefficients from memory)",
    )
    assert pytest.approx(2.0, rel=0.025) == 0.128 * VORTEX_ONSET**0.367
    assert pytest.approx(0.409 * 1e4**0.241, rel=0.02) == 0.128 * 1e4**0.367
    nusselt = becker_kaye_nusselt(np.geomspace(1.0, 1e7, 4001))
    assert np.all(np.diff(nusselt) >= 0.0)
    assert np.max(np.diff(nusselt) / nusselt[:-1]) < 0.005  # no step between neighbours


def test_blown_gap_takes_more_heat() -> None:
    still = gap_coefficient(0.02, 0.6e-3, 5000.0, WARM)
    blown = gap_coefficient(0.02, 0.6e-3, 5000.0, WARM, axial_speed=80.0)
    assert float(blown) > float(still)
    unit = GasState(*(np.asarray(value) for value in (1.0, 1e-5, 0.03, 1000.0)))
    reynolds = 50.0 * 2e-3 / 1e-5  # sqrt(30² + 40²) = 50 m/s
    check(
        "Nusselt number of a blown gap",
        axial_flow_nusselt(1e-3, 30.0, 80.0, unit),
        0.5 * 0.03 * reynolds**0.8,
        relative=1e-12,
        why="rounding",
        source="Gazley 1958: 0.03 Re^0.8 on twice the gap (from memory)",
    )


def test_duct() -> None:
    check(
        "Nusselt number of a turbulent duct",
        gnielinski_nusselt(1e5, 0.7, 0.0185),
        184.0429,
        absolute=5e-5,
        why="printed digits",
        source="Gnielinski as the reference library ht computes it at Re 1e5, Pr 0.7, f 0.0185",
    )
    assert duct_nusselt(100.0, 5.0) == 3.66
    around = duct_nusselt(np.array([2299.0, 2301.0, 3999.0, 4001.0]), 5.0)
    assert around[1] == pytest.approx(around[0], rel=0.01)
    assert around[3] == pytest.approx(around[2], rel=0.01)


@pytest.mark.parametrize("glycol", [False, True])
@pytest.mark.parametrize("temperature", [10.0, 30.0, 47.0, 70.0, 90.0])
def test_liquids(glycol: bool, temperature: float) -> None:
    fluid = "INCOMP::MEG[0.5]" if glycol else "Water"
    ours = liquid(temperature, glycol)
    names = ("density", "viscosity", "conductivity", "specific heat")
    for what, key, value, tolerance in zip(
        names, "DVLC", ours, (0.003, 0.04, 0.005, 0.005), strict=True
    ):
        check(
            f"{what} of water and of glycol in water, 10 to 90 °C",
            float(value),
            PropsSI(key, "T", temperature + 273.15, "P", 3e5, fluid),
            relative=tolerance,
            why="linear between points 20 K apart; the viscosity bends most",
            source="CoolProp",
        )


def test_jacket_by_hand() -> None:
    """Water of 40 degC, 6 l/min in a channel of 5 x 12 mm over 1 m2 of frame."""
    cooling = Cooling()
    radius, length = np.array([0.5 / np.pi]), np.array([1.0])
    speed, diameter = 1e-4 / 60e-6, 2.0 * 5e-3 * 12e-3 / 17e-3
    reynolds, prandtl = 992.3 * speed * diameter / 6.528e-4, 6.528e-4 * 4179.0 / 0.6286
    h = gnielinski_nusselt(reynolds, prandtl) * 0.6286 / diameter
    both = 1.0 / (1.0 / h + 0.5 / (992.3 * 4179.0 * 1e-4))
    check(
        "heat taken by a water jacket",
        frame_conductance(cooling, radius, length)[0],
        float(both),
        relative=1e-9,
        why="rounding",
        source="Gnielinski's film and half the warming of the water in series, by hand",
    )


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
    reynolds = 8.0 * 0.1 * air.density / air.viscosity
    laminar = 0.664 * np.sqrt(reynolds) * np.cbrt(air.prandtl) * air.thermal_conductivity / 0.1
    check.within(
        "heat transfer of a blown plate over that of a laminar one",
        h / float(laminar),
        1.0,
        np.inf,
        why="one-sided: turbulence adds",
        source="Pohlhausen 1921: 0.664 sqrt(Re) Pr^(1/3) (from memory)",
    )


def test_coefficient_is_taken_as_given() -> None:
    cooling = Cooling(method="coefficient", heat_transfer_coefficient=100.0)
    conductance = frame_conductance(cooling, np.array([0.5]), np.array([1.0]))
    assert conductance[0] == pytest.approx(100.0 * np.pi, rel=1e-12)


def test_end_space_and_faces() -> None:
    """Values and similarity."""
    check(
        "heat transfer in the end space at rest and at 1 m/s",
        [end_space_coefficient(speed, WARM, WARM) for speed in (0.0, 1.0)],
        [15.0, 21.0],
        relative=1e-6,
        why="rounding",
        source="Schubert 1968: 15 (1 + 0.4 v^0.9) W/(m² K) (from memory)",
    )
    helium = gas_state(load(Gas, "Helium"), 80.0)
    natural = end_space_coefficient(0.0, helium, WARM) / 15.0
    assert float(natural) == pytest.approx(
        float(helium.thermal_conductivity / WARM.thermal_conductivity), rel=1e-12
    )
    slow, fast = disc_coefficient(0.05, np.array([50.0, 5000.0]), WARM)
    reynolds = 50.0 * 0.05**2 * WARM.density / WARM.viscosity
    check(
        "heat transfer of a laminar rotating disc",
        float(slow),
        float(0.36 * np.sqrt(reynolds) * WARM.thermal_conductivity / 0.05),
        relative=1e-12,
        why="rounding",
        source="Cobb, Saunders 1956: 0.36 sqrt(Re) (from memory)",
    )
    assert fast > 10.0 * slow  # laminar alone would make it ten times
