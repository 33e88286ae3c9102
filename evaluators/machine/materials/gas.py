"""Properties of the gas around the rotor against temperature and pressure."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.materials.kinds import Gas
from evaluators.machine.quantity import FloatArray, Quantity, floats

ZERO_CELSIUS_K = 273.15
ATMOSPHERE_PA = 101_325.0


class GasState(NamedTuple):
    """Properties of a gas at one state; arrays of the shape of the arguments."""

    density: FloatArray
    viscosity: FloatArray
    thermal_conductivity: FloatArray
    specific_heat: FloatArray

    @property
    def prandtl(self) -> FloatArray:
        """Prandtl number."""
        return self.viscosity * self.specific_heat / self.thermal_conductivity


def gas_state(
    gas: Gas, temperature_C: ArrayLike, pressure_Pa: ArrayLike = ATMOSPHERE_PA
) -> GasState:
    """Return density (kg/m3), viscosity (Pa s), conductivity (W/(m K)) and heat (J/(kg K)).

    Ideal gas law and Sutherland's law, mu = mu0 (T/T0)^1.5 (T0 + S)/(T + S), the same form for
    the conductivity with its own S. Sutherland, "The viscosity of gases and molecular force",
    *Phil. Mag.* 36, 1893; White, *Viscous Fluid Flow*, chapter 1 (from memory).

    Parameters
    ----------
    temperature_C
        °C, above absolute zero.
    pressure_Pa
        Absolute pressure in Pa.
    """
    kelvin = floats(temperature_C) + ZERO_CELSIUS_K
    pressure = floats(pressure_Pa)
    shape = np.broadcast_shapes(kelvin.shape, pressure.shape)
    viscosity = _sutherland(gas.viscosity, gas.viscosity_temperature, kelvin)
    conductivity = _sutherland(gas.thermal_conductivity, gas.conductivity_temperature, kelvin)
    return GasState(
        density=np.asarray(pressure / (gas.gas_constant.value * kelvin)),
        viscosity=np.broadcast_to(viscosity, shape),
        thermal_conductivity=np.broadcast_to(conductivity, shape),
        specific_heat=np.broadcast_to(gas.specific_heat.at(temperature_C), shape),
    )


def _sutherland(reference: Quantity, constant: Quantity, kelvin: FloatArray) -> FloatArray:
    start = reference.at_C + ZERO_CELSIUS_K
    s = constant.value
    return np.asarray(reference.value * (kelvin / start) ** 1.5 * (start + s) / (kelvin + s))


LOCAL_GROWTH_OF_CONDUCTIVITY = 2000.0  # K; makes conductivity grow nearly as T^1.4 near 330 K


def vapour(
    name: str,
    *,
    temperature_C: float,
    pressure_Pa: float,
    density: float,
    viscosity: float,
    thermal_conductivity: float,
    specific_heat: float,
    source: str,
    year: int,
) -> Gas:
    """Return a gas from its properties at one state, a refrigerant vapour for instance.

    Away from that state: density as p/T (with the gas constant that the stated density implies, so
    that a vapour near saturation starts from its true density), viscosity in proportion to the
    absolute temperature, conductivity a little faster, as vapours do (common practice). Within
    30 K of the stated temperature that is good to some 4 percent; state the properties near the
    temperature of the gap.

    Parameters
    ----------
    name
        For messages and tables.
    temperature_C, pressure_Pa
        State of the properties, in °C and Pa.
    density, viscosity, thermal_conductivity, specific_heat
        kg/m3, Pa s, W/(m K), J/(kg K) at constant pressure.
    source, year
        Where the properties come from.

    Raises
    ------
    ValueError
        If a property is implausible, naming it with value and range.
    """
    kelvin = temperature_C + ZERO_CELSIUS_K
    for key, value in (("temperature", kelvin), ("pressure", pressure_Pa), ("density", density)):
        if not value > 0.0:
            msg = f"{name}: {key} = {value:g} must be positive"
            raise ValueError(msg)

    def stated(value: float, unit: str) -> Quantity:
        return Quantity(value, unit, source, year, at_C=temperature_C)

    return Gas(
        name=name,
        description=f"{name}, from its properties at {temperature_C:g} degC",
        density=stated(density * ATMOSPHERE_PA / pressure_Pa, "kg/m3"),
        gas_constant=stated(pressure_Pa / (density * kelvin), "J/(kg K)"),
        specific_heat=stated(specific_heat, "J/(kg K)"),
        viscosity=stated(viscosity, "Pa s"),
        # Sutherland's constant equal to the temperature: locally in proportion to it.
        viscosity_temperature=stated(kelvin, "K"),
        thermal_conductivity=stated(thermal_conductivity, "W/(m K)"),
        conductivity_temperature=stated(LOCAL_GROWTH_OF_CONDUCTIVITY, "K"),
    )
