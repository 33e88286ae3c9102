"""Rotating rings and discs, pressure on rings, and shrink fits: elastic closed forms.

All are plane stress; `plane_strain` turns elastic constants into those of a long cylinder with
free ends, whose stresses in the plane follow the same formulas. Sources: Timoshenko, *Strength of
Materials*, part II, chapter on rotating discs; Young, Budynas, *Roark's Formulas for Stress and
Strain*, tables on rotating discs and thick vessels (from memory).
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


def thin_ring_stress(density: ArrayLike, radius: ArrayLike, speed: ArrayLike) -> FloatArray:
    """Return the hoop stress in Pa of a thin ring turning by itself, rho w² r².

    Density in kg/m3, mean radius in m, angular speed in rad/s.
    """
    return np.asarray(floats(density) * (floats(radius) * floats(speed)) ** 2)


def plane_strain(young: ArrayLike, poisson: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Return Young's modulus and Poisson's ratio to use for a long cylinder.

    E / (1 - nu²) and nu / (1 - nu).
    """
    nu = floats(poisson)
    return np.asarray(floats(young) / (1.0 - nu * nu)), np.asarray(nu / (1.0 - nu))


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


def inside_pressure_compliance(
    inner_radius: ArrayLike, outer_radius: ArrayLike, young: ArrayLike, poisson: ArrayLike
) -> FloatArray:
    """Return the growth of the inner radius per inside pressure in m/Pa."""
    a, b = floats(inner_radius), floats(outer_radius)
    shape = (b * b + a * a) / (b * b - a * a) + floats(poisson)
    return np.asarray(a / floats(young) * shape)


def outside_pressure_compliance(
    inner_radius: ArrayLike, outer_radius: ArrayLike, young: ArrayLike, poisson: ArrayLike
) -> FloatArray:
    """Return the shrinkage of the outer radius per outside pressure in m/Pa."""
    a, b = floats(inner_radius), floats(outer_radius)
    shape = (b * b + a * a) / (b * b - a * a) - floats(poisson)
    return np.asarray(b / floats(young) * shape)


class Part(NamedTuple):
    """Elastic constants of an isotropic part: Pa, dimensionless, kg/m3."""

    young: ArrayLike
    poisson: ArrayLike
    density: ArrayLike


class ShrinkFit(NamedTuple):
    """State of a shrink fit; arrays of the common shape of the arguments."""

    pressure: FloatArray
    """Contact pressure in Pa; negative values mean that the hub has lifted."""
    hub_hoop: FloatArray
    """Hoop stress in Pa at the inner radius of the hub."""
    lift_off_speed: FloatArray
    """Angular speed in rad/s at which the pressure vanishes; infinite if it never does."""


def shrink_fit(
    shaft: Part,
    hub: Part,
    bore_radius: ArrayLike,
    contact_radius: ArrayLike,
    outer_radius: ArrayLike,
    interference: ArrayLike,
    speed: ArrayLike,
) -> ShrinkFit:
    """Return the state of a hub shrunk onto a shaft of equal length, turning.

    Parameters
    ----------
    shaft, hub
        Elastic constants.
    bore_radius, contact_radius, outer_radius
        m; bore of the shaft (zero for a solid one), contact, and outside of the hub.
    interference
        Radial interference at rest in m.
    speed
        Angular speed in rad/s.
    """
    r = contact_radius
    compliance = outside_pressure_compliance(bore_radius, r, shaft.young, shaft.poisson)
    compliance = compliance + inside_pressure_compliance(r, outer_radius, hub.young, hub.poisson)
    shaft_growth = rotating_disc_growth(
        r, bore_radius, r, shaft.density, shaft.young, shaft.poisson, 1.0
    )
    hub_growth = rotating_disc_growth(r, r, outer_radius, hub.density, hub.young, hub.poisson, 1.0)
    opening = hub_growth - shaft_growth
    square = floats(speed) ** 2
    pressure = (floats(interference) - opening * square) / compliance
    pressed = np.maximum(pressure, 0.0)
    hoop = pressure_stress(r, r, outer_radius, pressed, 0.0).hoop
    hoop = hoop + rotating_disc_stress(r, r, outer_radius, hub.density, hub.poisson, speed).hoop
    opens = opening > 0.0
    lift = np.sqrt(np.maximum(floats(interference), 0.0) / np.where(opens, opening, 1.0))
    return ShrinkFit(
        pressure=np.asarray(pressure),
        hub_hoop=np.asarray(hoop),
        lift_off_speed=np.asarray(np.where(opens, lift, np.inf)),
    )
