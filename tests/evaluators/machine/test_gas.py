"""Gas properties against a general-purpose property library."""

from __future__ import annotations

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI
from outside import OutsideChecks

from evaluators.machine.materials.gas import gas_state, vapour
from evaluators.machine.materials.library import Gas, load

check = OutsideChecks("materials", "CoolProp")


@pytest.mark.parametrize("name", ["Air", "Helium", "Nitrogen"])
@pytest.mark.parametrize("temperature", [0.0, 20.0, 80.0, 150.0])
@pytest.mark.parametrize("pressure", [2e4, 101_325.0, 5e5])
def test_properties(name: str, temperature: float, pressure: float) -> None:
    state = gas_state(load(Gas, name), temperature, pressure)
    for what, key, value, tolerance in [
        ("density", "D", state.density, 0.005),
        ("viscosity", "V", state.viscosity, 0.012),
        ("thermal conductivity", "L", state.thermal_conductivity, 0.015),
        ("specific heat", "C", state.specific_heat, 0.01),
    ]:
        check(
            f"{what} of air, helium and nitrogen, 0.2 to 5 bar, 0 to 150 °C",
            value,
            PropsSI(key, "T", temperature + 273.15, "P", pressure, name),
            relative=tolerance,
            why="the fits hold to 0.8 % at one atmosphere; 5 bar changes density by 0.3 % and "
            "air's transport properties by up to 0.7 %, which an ideal gas does not know",
        )


def test_air_at_room_temperature() -> None:
    """CoolProp at 101325 Pa, 20 and 80 °C: density, viscosity, conductivity, Prandtl number."""
    state = gas_state(load(Gas, "Air"), [20.0, 80.0])
    for what, found, expected in [
        ("density", state.density, [1.204575, 0.9995154]),
        ("viscosity", state.viscosity, [1.820568e-5, 2.100893e-5]),
        ("thermal conductivity", state.thermal_conductivity, [0.0258738, 0.0302253]),
    ]:
        why = "the fits hold to 0.8 %"
        check(f"{what} of air at one atmosphere", found, expected, relative=0.01, why=why)
    check(
        "Prandtl number of air at one atmosphere",
        state.prandtl,
        [0.707956, 0.701652],
        relative=0.015,
        why="of three fits",
    )


def test_viscosity_of_air_by_published_constants() -> None:
    kelvin = np.array([293.15, 353.15, 423.15])
    check(
        "viscosity of air by Sutherland's law",
        gas_state(load(Gas, "Air"), kelvin - 273.15).viscosity,
        1.716e-5 * (kelvin / 273.0) ** 1.5 * (273.0 + 111.0) / (kelvin + 111.0),
        relative=0.02,
        why="two fits of one law, 2 % stated there",
        source="White, Viscous Fluid Flow: 1.716e-5 Pa s and 111 K at 273 K (from memory)",
    )


def test_shape_is_that_of_both_arguments() -> None:
    state = gas_state(load(Gas, "Air"), np.array([[20.0], [80.0]]), np.array([1e4, 1e5, 1e6]))
    assert all(value.shape == (2, 3) for value in state)
    # Viscosity of an ideal gas does not depend on pressure, density is proportional to it.
    assert np.ptp(state.viscosity[0]) == 0.0
    assert state.density[0, 2] == pytest.approx(100.0 * state.density[0, 0], rel=1e-12)


@pytest.mark.parametrize("fluid", ["R134a", "R1234ze(E)", "Propane"])
@pytest.mark.parametrize("shift", [-25.0, 0.0, 25.0])
def test_refrigerant_vapour_from_its_properties(fluid: str, shift: float) -> None:
    """Stated at 60 °C and 2 bar, asked for 25 K to either side and at half the pressure."""
    at = ("T", 60.0 + 273.15, "P", 2e5, fluid)
    gas = vapour(
        fluid,
        temperature_C=60.0,
        pressure_Pa=2e5,
        density=PropsSI("D", *at),
        viscosity=PropsSI("V", *at),
        thermal_conductivity=PropsSI("L", *at),
        specific_heat=PropsSI("C", *at),
        source="CoolProp",
        year=2026,
    )
    for pressure in (2e5, 1e5):
        found = gas_state(gas, 60.0 + shift, pressure)
        there = ("T", 60.0 + shift + 273.15, "P", pressure, fluid)
        stated = shift == 0.0 and pressure == 2e5
        for what, key, value, near, why in (
            ("density", "D", found.density, 0.03, "what is not ideal is missed"),
            ("viscosity", "V", found.viscosity, 0.015, "follows T closely"),
            ("conductivity", "L", found.thermal_conductivity, 0.045, "each grows differently"),
        ):
            expected = PropsSI(key, *there)
            if stated:
                assert float(value) == pytest.approx(expected, rel=1e-9)
            else:
                check(f"{what} of refrigerant vapour beside its stated state", value, expected,
                      relative=near, why=why)  # fmt: skip


def test_impossible_vapour_is_refused() -> None:
    good = {
        "temperature_C": 60.0, "pressure_Pa": 2e5, "density": 8.0, "viscosity": 1.3e-5,
        "thermal_conductivity": 0.016, "specific_heat": 900.0,
    }  # fmt: skip
    for key, value, word in (
        ("density", 0.0, "density = 0 must be positive"),
        ("viscosity", 1.3e-2, "viscosity = 0.013 Pa s is outside the range"),
        ("pressure_Pa", -1.0, "pressure = -1 must be positive"),
    ):
        with pytest.raises(ValueError, match=word):
            vapour("test", **{**good, key: value}, source="test", year=2026)
