"""Rotating rings and discs, and pressure on rings: elastic closed forms in plane stress.

Sources: Timoshenko, *Strength of Materials*, part II, chapter on rotating discs; Young, Budynas,
*Roark's Formulas for Stress and Strain*, tables on rotating discs and thick vessels (from memory).
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.quantity import FloatArray, floats


class Stress(NamedTuple):
    """Stress in a ring in Pa, tension positive."""

    radial: FloatArray
    hoop: FloatArray


def tip_speed(radius: ArrayLike, speed: ArrayLike) -> FloatArray:
    """Return the circumferential speed in m/s from radius (m) and angular speed (rad/s)."""
    return np.asarray(floats(radius) * np.abs(floats(speed)))


def rotating_disc_stress(
    radius: ArrayLike,
    inner_radius: ArrayLike,
    outer_radius: ArrayLike,
    density: ArrayLike,
    poisson: ArrayLike,
    speed: ArrayLike,
) -> Stress:
    """Return the stress of a free rotating disc of uniform thickness.

    Parameters
    ----------
    radius
        Where the stress is wanted, in m, above zero unless `inner_radius` is zero.
    inner_radius, outer_radius
        m; an inner radius of zero is a solid disc.
    density, poisson
        kg/m3 and Poisson's ratio.
    speed
        Angular speed in rad/s.
    """
    r, a, b = floats(radius), floats(inner_radius), floats(outer_radius)
    nu = floats(poisson)
    load = floats(density) * floats(speed) ** 2 / 8.0
    # a²b²/r² is zero for a solid disc, at its centre too.
    hole = a * a * b * b / np.where(r > 0.0, r * r, 1.0)
    radial = load * (3.0 + nu) * (a * a + b * b - hole - r * r)
    hoop = load * ((3.0 + nu) * (a * a + b * b + hole) - (1.0 + 3.0 * nu) * r * r)
    return Stress(radial=np.asarray(radial), hoop=np.asarray(hoop))


def rotating_disc_growth(
    radius: ArrayLike,
    inner_radius: ArrayLike,
    outer_radius: ArrayLike,
    density: ArrayLike,
    young: ArrayLike,
    poisson: ArrayLike,
    speed: ArrayLike,
) -> FloatArray:
    """Return the radial displacement in m of a free rotating disc.

    Young's modulus in Pa, the other arguments as for `rotating_disc_stress`.
    """
    stress = rotating_disc_stress(radius, inner_radius, outer_radius, density, poisson, speed)
    strain = (stress.hoop - floats(poisson) * stress.radial) / floats(young)
    return np.asarray(floats(radius) * strain)


def pressure_stress(
    radius: ArrayLike,
    inner_radius: ArrayLike,
    outer_radius: ArrayLike,
    pressure_inside: ArrayLike,
    pressure_outside: ArrayLike,
) -> Stress:
    """Return the stress of a ring under pressure (Lamé).

    Parameters
    ----------
    radius, inner_radius, outer_radius
        m; an inner radius of zero is a solid disc and takes no inside pressure.
    pressure_inside, pressure_outside
        Pa.
    """
    r, a, b = floats(radius), floats(inner_radius), floats(outer_radius)
    p, q = floats(pressure_inside), floats(pressure_outside)
    wall = b * b - a * a
    mean = (p * a * a - q * b * b) / wall
    swing = (p - q) * a * a * b * b / (wall * np.where(r > 0.0, r * r, 1.0))
    return Stress(radial=np.asarray(mean - swing), hoop=np.asarray(mean + swing))


def outside_pressure_compliance(
    inner_radius: ArrayLike, outer_radius: ArrayLike, young: ArrayLike, poisson: ArrayLike
) -> FloatArray:
    """Return the shrinkage of the outer radius per outside pressure in m/Pa."""
    a, b = floats(inner_radius), floats(outer_radius)
    shape = (b * b + a * a) / (b * b - a * a) - floats(poisson)
    return np.asarray(b / floats(young) * shape)
