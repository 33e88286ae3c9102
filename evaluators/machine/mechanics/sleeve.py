"""Retaining sleeve over magnet segments on a core: pressures, stresses, interference, lift-off.

The core is an isotropic disc, the magnets are segments that press on each other neither along the
hoop nor pull (they only pass on pressure and add their own centrifugal load), and the sleeve is a
ring that may be stiffer along the hoop than across it. Plane stress, linear elastic: everything
is linear in interference, squared speed and temperature, so that interference and lift-off speed
follow in closed form.

A computed margin proves no rotor. A sleeve that bursts at speed kills; only an overspeed test
under containment, by the rules that apply at the place of use, shows that it holds.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.materials.kinds import Magnet, SleeveMaterial, StructuralMaterial
from evaluators.machine.mechanics.rings import (
    Stress,
    outside_pressure_compliance,
    rotating_disc_growth,
)
from evaluators.machine.quantity import FloatArray, floats

STRESS_POINTS = 5
"""Radii in the wall of the sleeve at which stresses are looked at, both faces included."""


@dataclass(frozen=True)
class Ring:
    """Cylindrically orthotropic ring; every entry a scalar or an array of designs.

    `poisson` is the contraction along the radius under stress along the hoop. SI units.
    """

    inner_radius: FloatArray
    outer_radius: FloatArray
    density: FloatArray
    young_hoop: FloatArray
    young_radial: FloatArray
    poisson: FloatArray
    expansion_hoop: FloatArray
    expansion_radial: FloatArray

    def __post_init__(self) -> None:
        if np.any(self.outer_radius <= self.inner_radius):
            worst = np.min(self.outer_radius - self.inner_radius)
            msg = f"wall thickness of the sleeve = {worst} m must be above 0"
            raise ValueError(msg)

    def stress(
        self, position: ArrayLike, pressure: ArrayLike, speed: ArrayLike, heating: ArrayLike
    ) -> Stress:
        """Return the stress at a relative position in the wall, 0 inside and 1 outside.

        The stress function F = r sigma_radial obeys r² F'' + r F' - k² F =
        -(3 + nu) rho w² r³ + E_hoop (a_radial - a_hoop) dT r with k² = E_hoop / E_radial.
        Lekhnitskii, *Anisotropic Plates*, 1968, for rings under pressure (from memory); the
        terms of rotation and heat are derived here and checked by integration in the tests.

        Parameters
        ----------
        pressure
            On the inner face in Pa.
        speed
            rad/s.
        heating
            Uniform rise above the stress-free temperature in K.
        """
        b = self.outer_radius
        tau = self.inner_radius / b
        t = tau + floats(position) * (1.0 - tau)
        k = self._anisotropy()
        load = self.density * (floats(speed) * b) ** 2
        # Particular solutions: s3 t² of rotation and s1 of unequal expansion.
        s3 = -(3.0 + self.poisson) * load / (9.0 - k * k)
        mismatch = self.young_hoop * (self.expansion_radial - self.expansion_hoop)
        isotropic = np.abs(k - 1.0) < 1e-9
        s1 = mismatch * floats(heating) / np.where(isotropic, np.inf, 1.0 - k * k)
        inner_rise, inner_fall = tau ** (k - 1.0), tau ** (-k - 1.0)
        rise = -floats(pressure) - s3 * tau * tau - s1 + (s3 + s1) * inner_fall
        rise = rise / (inner_rise - inner_fall)
        fall = -(s3 + s1) - rise
        up, down = rise * t ** (k - 1.0), fall * t ** (-k - 1.0)
        return Stress(
            radial=np.asarray(up + down + s3 * t * t + s1),
            hoop=np.asarray(k * (up - down) + (3.0 * s3 + load) * t * t + s1),
        )

    def growth(self, pressure: ArrayLike, speed: ArrayLike, heating: ArrayLike) -> FloatArray:
        """Return the growth of the inner radius in m under the loads of `stress`."""
        stress = self.stress(0.0, pressure, speed, heating)
        strain = (stress.hoop - self.poisson * stress.radial) / self.young_hoop
        return np.asarray(self.inner_radius * (strain + self.expansion_hoop * floats(heating)))

    def _anisotropy(self) -> FloatArray:
        k = np.sqrt(self.young_hoop / self.young_radial)
        # The rotational term is singular at k = 3 although the solution is not.
        return np.asarray(np.where(np.abs(k - 3.0) < 1e-5, 3.0 + 1e-5, k))


@dataclass(frozen=True)
class RotorSection:
    """Core, magnets and sleeve of a rotor; every entry a scalar or an array of designs, SI units.

    `magnet_density` is that of magnets and fillers together, smeared over the circumference.
    """

    core_inner_radius: FloatArray
    core_outer_radius: FloatArray
    core_density: FloatArray
    core_young: FloatArray
    core_poisson: FloatArray
    core_expansion: FloatArray
    magnet_density: FloatArray
    magnet_young: FloatArray
    magnet_expansion: FloatArray
    sleeve: Ring

    def __post_init__(self) -> None:
        if np.any(self.core_outer_radius <= self.core_inner_radius):
            worst = np.min(self.core_outer_radius - self.core_inner_radius)
            msg = f"wall thickness of the core = {worst} m must be above 0"
            raise ValueError(msg)
        if np.any(self.sleeve.inner_radius < self.core_outer_radius):
            worst = np.min(self.sleeve.inner_radius - self.core_outer_radius)
            msg = f"magnet thickness = {worst} m must be 0 or more"
            raise ValueError(msg)

    @classmethod
    def from_materials(
        cls,
        core: StructuralMaterial,
        magnet: Magnet,
        sleeve: SleeveMaterial,
        *,
        core_inner_radius: ArrayLike,
        core_outer_radius: ArrayLike,
        magnet_outer_radius: ArrayLike,
        sleeve_outer_radius: ArrayLike,
        temperature_C: ArrayLike,
    ) -> RotorSection:
        """Build from materials at a rotor temperature in °C, radii in m."""
        at = temperature_C
        return cls(
            core_inner_radius=floats(core_inner_radius),
            core_outer_radius=floats(core_outer_radius),
            core_density=core.density.at(at),
            core_young=core.young_modulus.at(at),
            core_poisson=core.poisson_ratio.at(at),
            core_expansion=core.expansion.at(at),
            magnet_density=magnet.density.at(at),
            magnet_young=magnet.young_modulus.at(at),
            magnet_expansion=magnet.expansion_along.at(at),
            sleeve=Ring(
                inner_radius=floats(magnet_outer_radius),
                outer_radius=floats(sleeve_outer_radius),
                density=sleeve.density.at(at),
                young_hoop=sleeve.young_modulus.at(at),
                young_radial=sleeve.young_modulus_radial.at(at),
                poisson=sleeve.poisson_ratio.at(at),
                expansion_hoop=sleeve.expansion.at(at),
                expansion_radial=sleeve.expansion_radial.at(at),
            ),
        )


class SleeveState(NamedTuple):
    """State of the rotor section; pressures and stresses in Pa, arrays (n,)."""

    sleeve_pressure: FloatArray
    """Between magnets and sleeve."""
    core_pressure: FloatArray
    """Between core and magnets; negative when they part, by the pressure that is missing."""
    hoop_stress: FloatArray
    """Largest hoop stress in the sleeve."""
    equivalent_stress: FloatArray
    """Largest von Mises stress in the sleeve, meaningful for metals."""
    radial_tension: FloatArray
    """Largest tensile radial stress in the sleeve, which splits a wound fibre; zero or more."""


def sleeve_stress(
    section: RotorSection, interference: ArrayLike, speed: ArrayLike, heating: ArrayLike = 0.0
) -> SleeveState:
    """Return pressures and stresses at a speed and temperature.

    Parameters
    ----------
    section
        Rotor of n designs.
    interference
        Radial interference between magnets and sleeve, cold and at rest, in m, shape (n,).
    speed
        Angular speed in rad/s, shape (n,).
    heating
        Uniform rise above the assembly temperature in K, shape (n,).
    """
    ring = section.sleeve
    square = floats(speed) ** 2
    fixed, per_square, centrifugal = _sleeve_pressure_terms(section, interference, heating)
    pressed = fixed + per_square * square
    ratio = ring.inner_radius / section.core_outer_radius
    core = (pressed - centrifugal * square) * ratio
    # Lifted magnets lean on the sleeve with nothing but their own weight.
    sleeve_pressure = np.where(core >= 0.0, pressed, centrifugal * square)

    position = np.linspace(0.0, 1.0, STRESS_POINTS)
    positions = position.reshape((-1,) + (1,) * sleeve_pressure.ndim)
    stress = ring.stress(positions, sleeve_pressure, speed, heating)
    mises = np.sqrt(stress.radial**2 + stress.hoop**2 - stress.radial * stress.hoop)
    return SleeveState(
        sleeve_pressure=sleeve_pressure,
        core_pressure=np.asarray(core),
        hoop_stress=stress.hoop.max(axis=0),
        equivalent_stress=mises.max(axis=0),
        # The outer face is free: what stands there is the rounding of a zero.
        radial_tension=np.maximum(stress.radial[:-1].max(axis=0), 0.0),
    )


def lift_off_speed(
    section: RotorSection, interference: ArrayLike, heating: ArrayLike = 0.0
) -> FloatArray:
    """Return the angular speed in rad/s at which the magnets leave the core.

    Zero if they are loose at rest, infinite if they never leave. Arguments as `sleeve_stress`.
    """
    fixed, per_square, centrifugal = _sleeve_pressure_terms(section, interference, heating)
    loss = centrifugal - per_square
    leaves = loss > 0.0
    speed = np.sqrt(np.maximum(fixed, 0.0) / np.where(leaves, loss, 1.0))
    return np.asarray(np.where(leaves, speed, np.where(fixed >= 0.0, np.inf, 0.0)))


def required_interference(
    section: RotorSection,
    speed: ArrayLike,
    heating: ArrayLike = 0.0,
    core_pressure: ArrayLike = 0.0,
) -> FloatArray:
    """Return the interference in m that leaves `core_pressure` (Pa) at a speed and temperature.

    Arguments otherwise as for `sleeve_stress`. Negative values mean that a gap would do.
    """
    fixed, per_square, centrifugal = _sleeve_pressure_terms(section, 0.0, heating)
    one, _, _ = _sleeve_pressure_terms(section, 1.0, heating)
    square = floats(speed) ** 2
    wanted = floats(core_pressure) * section.core_outer_radius / section.sleeve.inner_radius
    wanted = wanted + centrifugal * square
    return np.asarray((wanted - fixed - per_square * square) / (one - fixed))


def _sleeve_pressure_terms(
    section: RotorSection, interference: ArrayLike, heating: ArrayLike
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Sleeve pressure while in contact = first + second * speed²; third: magnets per speed².

    Force balance of a segment per radian: p_sleeve R = p_core r + rho w² (R³ - r³)/3, and the
    growth of the sleeve equals that of core and magnets plus the interference.
    """
    ring, hot = section.sleeve, floats(heating)
    core, outer = section.core_outer_radius, ring.inner_radius
    thickness = outer - core
    centrifugal = section.magnet_density * (outer**3 - core**3) / (3.0 * outer)
    # The mean of the pressures on both faces compresses the magnets.
    half = 0.5 * thickness / section.magnet_young
    core_give = half + outside_pressure_compliance(
        section.core_inner_radius, core, section.core_young, section.core_poisson
    )
    ratio = outer / core
    stiffness = ring.growth(1.0, 0.0, 0.0) + half + ratio * core_give
    core_growth = rotating_disc_growth(
        core,
        section.core_inner_radius,
        core,
        section.core_density,
        section.core_young,
        section.core_poisson,
        1.0,
    )
    per_square = core_growth - ring.growth(0.0, 1.0, 0.0) + ratio * centrifugal * core_give
    warm = section.core_expansion * core + section.magnet_expansion * thickness
    fixed = floats(interference) + warm * hot - ring.growth(0.0, 0.0, hot)
    return (
        np.asarray(fixed / stiffness),
        np.asarray(per_square / stiffness),
        np.asarray(centrifugal),
    )
