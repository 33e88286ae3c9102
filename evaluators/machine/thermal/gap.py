"""Heat transfer between rotor and bore through the gas of the gap."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.materials.gas import GasState
from evaluators.machine.quantity import FloatArray, floats

LAMINAR_NUSSELT = 2.0
"""Exact for a thin gap: each wall is half a gap away from the mean gas temperature."""

VORTEX_ONSET = 1697.0
"""Squared Taylor number at which vortices set in: 1696 to 1708 in print (Taylor 1923,
Chandrasekhar 1961)."""


def taylor_squared(
    radius: ArrayLike, gap: ArrayLike, speed: ArrayLike, density: ArrayLike, viscosity: ArrayLike
) -> FloatArray:
    """Return the squared Taylor number w² r_m delta³ rho² / mu² of the gap.

    r_m is the mean radius of the gap; the geometric factor of Becker and Kaye is left out, which
    is within 1 % of one for thin gaps. Taylor 1923.

    Parameters
    ----------
    radius, gap
        Rotor radius and radial gap in m.
    speed
        Angular speed in rad/s.
    density, viscosity
        Of the gas, in kg/m3 and Pa s.
    """
    delta = floats(gap)
    mean = floats(radius) + 0.5 * delta
    kinematic = floats(viscosity) / floats(density)
    return np.asarray(floats(speed) ** 2 * mean * delta**3 / kinematic**2)


def becker_kaye_nusselt(taylor_squared_: ArrayLike) -> FloatArray:
    """Return the Nusselt number (on the gap, wall to mean gas) of a gap without axial flow.

    Becker, Kaye, "Measurements of diabatic flow in an annulus with an inner rotating cylinder",
    *J. Heat Transfer* 84, 1962 (coefficients from memory): 2 below the onset of vortices, then
    0.128 Ta^0.367 to 1e4 and 0.409 Ta^0.241 beyond, of the squared Taylor number. Stated up to
    1e7. The largest of the three that can apply counts, which makes it continuous.

    Parameters
    ----------
    taylor_squared_
        From `taylor_squared`, zero or more.
    """
    ta = floats(taylor_squared_)
    vortices = np.minimum(0.128 * ta**0.367, 0.409 * ta**0.241)
    return np.asarray(np.maximum(LAMINAR_NUSSELT, vortices))


def axial_flow_nusselt(
    gap: ArrayLike, axial_speed: ArrayLike, surface_speed: ArrayLike, gas: GasState
) -> FloatArray:
    """Return the Nusselt number (on the gap) of a gap that gas is blown through.

    0.03 Re^0.8 on twice the gap with the effective speed sqrt(v² + (u/2)²) of axial speed v and
    rotor surface speed u, for turbulent flow; halved here to stand on the gap. Gazley, "Heat
    transfer characteristics of the rotational and axial flow between concentric cylinders",
    *Trans. ASME* 80, 1958 (from memory).

    Parameters
    ----------
    gap
        m.
    axial_speed, surface_speed
        m/s.
    gas
        State of the gas in the gap.
    """
    effective = np.hypot(floats(axial_speed), 0.5 * floats(surface_speed))
    reynolds = effective * 2.0 * floats(gap) * gas.density / gas.viscosity
    return np.asarray(0.5 * 0.03 * reynolds**0.8)


def gap_coefficient(
    radius: ArrayLike,
    gap: ArrayLike,
    speed: ArrayLike,
    gas: GasState,
    axial_speed: ArrayLike = 0.0,
) -> FloatArray:
    """Return the heat-transfer coefficient from either wall to the mean gas, W/(m2 K).

    Nu k / delta. Without axial flow `becker_kaye_nusselt`; with it the larger of that and
    `axial_flow_nusselt`. Two walls in series make k/delta in a laminar gap, pure conduction.

    Parameters
    ----------
    radius, gap
        Rotor radius and radial gap in m, shape (n,).
    speed
        Angular speed in rad/s.
    gas
        State of the gas in the gap.
    axial_speed
        Mean axial speed in m/s.
    """
    still = becker_kaye_nusselt(taylor_squared(radius, gap, speed, gas.density, gas.viscosity))
    surface = floats(radius) * np.abs(floats(speed))
    blown = np.where(
        floats(axial_speed) > 0.0, axial_flow_nusselt(gap, axial_speed, surface, gas), 0.0
    )
    return np.asarray(np.maximum(still, blown) * gas.thermal_conductivity / floats(gap))
