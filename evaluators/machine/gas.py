"""Properties of the gas around the rotor against temperature and pressure."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.material_kinds import Gas
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
