"""Friction of the rotor in the gas of its chamber: cylindrical gap and end discs."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.quantity import FloatArray, floats


def gap_reynolds(
    radius: ArrayLike, gap: ArrayLike, speed: ArrayLike, density: ArrayLike, viscosity: ArrayLike
) -> FloatArray:
    """Return the Reynolds number of the gap flow, by definition rho w R delta / mu.

    Parameters
    ----------
    radius
        Rotor radius R in m.
    gap
        Radial gap delta in m.
    speed
        Angular speed w in rad/s.
    density, viscosity
        Of the gas, in kg/m3 and Pa s.
    """
    return np.asarray(
        floats(density) * np.abs(floats(speed)) * floats(radius) * floats(gap) / floats(viscosity)
    )


def gap_torque_coefficient(reynolds: ArrayLike, gap_ratio: ArrayLike) -> FloatArray:
    """Return C_m of a rotating cylinder in a still bore, P = C_m pi rho w³ R⁴ L / 2.

    Bilgen, Boulos, "Functional dependence of torque coefficient of coaxial cylinders on gap
    width and Reynolds numbers", *J. Fluids Eng.* 95, 1973: 10, 2, 1.03 and 0.065 times
    (delta/R)^0.3 over Re^1, Re^0.6, Re^0.5 and Re^0.2. These belong to the definition with the
    factor one half; 0.515 and 0.0325 belong to the one without it.

    The published ranges meet at Re = 64, 500 and 10 000 with steps of 6 and 4 %. Here the
    largest of the four counts, which differs from the published choice only between 56 and 64
    and between 500 and 760 and makes the coefficient continuous for the search.

    Parameters
    ----------
    reynolds
        From `gap_reynolds`, above zero.
    gap_ratio
        delta / R.
    """
    re = floats(reynolds)
    branches = (10.0 / re, 2.0 / re**0.6, 1.03 / re**0.5, 0.065 / re**0.2)
    return np.asarray(np.maximum.reduce(np.broadcast_arrays(*branches)) * floats(gap_ratio) ** 0.3)


def laminar_gap_power(
    radius: ArrayLike, gap: ArrayLike, length: ArrayLike, speed: ArrayLike, viscosity: ArrayLike
) -> FloatArray:
    """Return the power in W of laminar flow between a turning rotor and a still bore, exact.

    4 pi mu L w² R² R2² / (R2² - R²) with R2 = R + delta. Lamb, *Hydrodynamics*; arguments in SI
    units as for `gap_power`.
    """
    inner = floats(radius) ** 2
    outer = (floats(radius) + floats(gap)) ** 2
    factor = 4.0 * math.pi * floats(viscosity) * floats(length) * floats(speed) ** 2
    return np.asarray(factor * inner * outer / (outer - inner))


def gap_power(
    radius: ArrayLike,
    gap: ArrayLike,
    length: ArrayLike,
    speed: ArrayLike,
    density: ArrayLike,
    viscosity: ArrayLike,
    roughness_factor: ArrayLike = 1.0,
) -> FloatArray:
    """Return the friction power in W of the cylindrical gap.

    `gap_torque_coefficient`, but never less than the laminar flow, which is a lower bound and
    the exact answer at low speed.

    Parameters
    ----------
    radius, gap, length
        Rotor radius, radial gap and length in m.
    speed
        Angular speed in rad/s.
    density, viscosity
        Of the gas, in kg/m3 and Pa s.
    roughness_factor
        Ratio to smooth walls; slot openings and steps raise friction above one.
    """
    r, w = floats(radius), np.abs(floats(speed))
    re = gap_reynolds(r, gap, w, density, viscosity)
    still = re <= 0.0
    coefficient = gap_torque_coefficient(np.where(still, 1.0, re), floats(gap) / r)
    power = 0.5 * coefficient * math.pi * floats(density) * w**3 * r**4 * floats(length)
    laminar = laminar_gap_power(r, gap, length, w, viscosity)
    return np.asarray(np.maximum(power, laminar) * floats(roughness_factor))


def disc_torque_coefficient(reynolds: ArrayLike, gap_ratio: ArrayLike) -> FloatArray:
    """Return C_m of both sides of an enclosed disc, torque = C_m rho w² R⁵ / 2.

    Daily, Nece, "Chamber dimension effects on induced flow and frictional resistance of enclosed
    rotating disks", *J. Basic Eng.* 82, 1960 (from memory): the largest of the four regimes
    2 pi/(s Re), 3.70 s^0.1/Re^0.5, 0.080/(s^(1/6) Re^0.25) and 0.102 s^0.1/Re^0.2.

    Parameters
    ----------
    reynolds
        rho w R² / mu, above zero.
    gap_ratio
        s, axial gap over R.
    """
    re, s = floats(reynolds), floats(gap_ratio)
    regimes = (
        2.0 * math.pi / (s * re),
        3.70 * s**0.1 / re**0.5,
        0.080 / (s ** (1.0 / 6.0) * re**0.25),
        0.102 * s**0.1 / re**0.2,
    )
    return np.asarray(np.maximum.reduce(np.broadcast_arrays(*regimes)))


def disc_power(
    radius: ArrayLike,
    axial_gap: ArrayLike,
    speed: ArrayLike,
    density: ArrayLike,
    viscosity: ArrayLike,
    inner_radius: ArrayLike = 0.0,
) -> FloatArray:
    """Return the friction power in W of both end faces of the rotor together.

    `disc_torque_coefficient`; a shaft takes away the share (r/R)⁵ of the moment, an
    approximation by the turbulent distribution.

    Parameters
    ----------
    radius, axial_gap
        Rotor radius and gap between face and housing in m.
    speed
        Angular speed in rad/s.
    density, viscosity
        Of the gas, in kg/m3 and Pa s.
    inner_radius
        Shaft radius at the faces in m.
    """
    r, w = floats(radius), np.abs(floats(speed))
    re = floats(density) * w * r**2 / floats(viscosity)
    coefficient = disc_torque_coefficient(np.where(re > 0.0, re, 1.0), floats(axial_gap) / r)
    share = 1.0 - (floats(inner_radius) / r) ** 5
    return np.asarray(0.5 * coefficient * floats(density) * w**3 * r**5 * share)
