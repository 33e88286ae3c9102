"""Convection to the coolant of the frame and in the end spaces."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.materials.gas import GasState
from evaluators.machine.quantity import FloatArray, floats

LAMINAR_DUCT_NUSSELT = 3.66
"""Fully developed laminar flow in a round duct with a wall of one temperature (closed form)."""


def petukhov_friction(reynolds: ArrayLike) -> FloatArray:
    """Return the Darcy friction factor (0.79 ln Re - 1.64)^-2 of a smooth duct.

    Petukhov, *Adv. Heat Transfer* 6, 1970 (from memory), for Re of 3000 to 5e6.
    """
    return np.asarray((0.79 * np.log(floats(reynolds)) - 1.64) ** -2)


def gnielinski_nusselt(
    reynolds: ArrayLike, prandtl: ArrayLike, friction: ArrayLike | None = None
) -> FloatArray:
    """Return the Nusselt number of turbulent flow in a duct.

    (f/8)(Re - 1000) Pr / (1 + 12.7 sqrt(f/8) (Pr^(2/3) - 1)). Gnielinski, *Int. Chem. Eng.* 16,
    1976, for Re of 3000 to 5e6.

    Parameters
    ----------
    reynolds, prandtl
        On the hydraulic diameter; of the liquid.
    friction
        Darcy factor; None for `petukhov_friction`.
    """
    re, pr = floats(reynolds), floats(prandtl)
    eighth = (petukhov_friction(re) if friction is None else floats(friction)) / 8.0
    shape = 1.0 + 12.7 * np.sqrt(eighth) * (pr ** (2.0 / 3.0) - 1.0)
    return np.asarray(eighth * (re - 1000.0) * pr / shape)


def duct_nusselt(reynolds: ArrayLike, prandtl: ArrayLike) -> FloatArray:
    """Return the Nusselt number of a duct, laminar up to Re = 2300, turbulent from 4000.

    Between them linear in Re (Gnielinski, *Int. J. Heat Mass Transfer* 63, 2013). The entrance and
    the bend of a channel raise it; they are left out.
    """
    re, pr = floats(reynolds), floats(prandtl)
    share = np.clip((re - 2300.0) / 1700.0, 0.0, 1.0)
    turbulent = gnielinski_nusselt(np.maximum(re, 4000.0), pr)
    return np.asarray((1.0 - share) * LAMINAR_DUCT_NUSSELT + share * turbulent)


def plate_coefficient(speed: ArrayLike, length: ArrayLike, gas: GasState) -> FloatArray:
    """Return the mean coefficient of a plate in parallel flow in W/(m2 K).

    The larger of 0.664 Re^0.5 Pr^(1/3) (Pohlhausen, laminar) and 0.037 Re^0.8 Pr^(1/3)
    (turbulent from the edge): Incropera et al., external flow (from memory).

    Parameters
    ----------
    speed, length
        m/s and m along the flow.
    gas
        State of the gas.
    """
    re = floats(speed) * floats(length) * gas.density / gas.viscosity
    nusselt = np.maximum(0.664 * re**0.5, 0.037 * re**0.8) * np.cbrt(gas.prandtl)
    return np.asarray(nusselt * gas.thermal_conductivity / floats(length))


def disc_coefficient(radius: ArrayLike, speed: ArrayLike, gas: GasState) -> FloatArray:
    """Return the mean coefficient of a rotating face in W/(m2 K).

    Nu = 0.36 Re^0.5 (laminar) or 0.015 Re^0.8 (turbulent) on the radius, whichever is larger, with
    Re = rho w R²/mu. Cobb, Saunders, *Proc. Roy. Soc. A* 236, 1956 (from memory), for a free disc.
    """
    r = floats(radius)
    re = gas.density * np.abs(floats(speed)) * r * r / gas.viscosity
    return np.asarray(np.maximum(0.36 * re**0.5, 0.015 * re**0.8) * gas.thermal_conductivity / r)


def end_space_coefficient(gas_speed: ArrayLike, gas: GasState, air: GasState) -> FloatArray:
    """Return the coefficient of end turns and walls of the end space in W/(m2 K).

    15 (1 + 0.4 v^0.9) in air at ambient pressure that passes at the speed v in m/s: Schubert 1968,
    as collected by Staton, Boglietti, Cavagnino, *IEEE Trans. Energy Conv.* 20(3), 2005 (from
    memory; the collected correlations scatter by a factor of two). They were found in machines
    slower than many this is used for: above some 20 m/s it is an extrapolation, and winding
    temperatures that rest on it deserve a test. For another gas the natural part follows the
    conductivity and the forced part the Reynolds number as well (own extension by similarity).

    Parameters
    ----------
    gas_speed
        m/s, along end turns and walls.
    gas
        State of the gas of the end space.
    air
        Air of the same temperature at ambient pressure.
    """
    conductivity = gas.thermal_conductivity / air.thermal_conductivity
    reynolds = (gas.density / gas.viscosity) / (air.density / air.viscosity)
    forced = 0.4 * (floats(gas_speed) * reynolds) ** 0.9
    return np.asarray(15.0 * conductivity * (1.0 + forced))
