"""Rotating discs, Lamé and shrink fits against handbook closed forms.

Timoshenko, *Strength of Materials*, part II; Roark's tables (pages from memory). Steel of
7850 kg/m3, 210 GPa, 0.3 at 30 000 1/min unless said; digits as printed, so 1e-6.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from evaluators.machine.mechanics.rings import (
    Part,
    plane_strain,
    pressure_stress,
    rotating_disc_growth,
    rotating_disc_stress,
    shrink_fit,
    thin_ring_stress,
    tip_speed,
)

STEEL = {"density": 7850.0, "poisson": 0.3}
W = 30_000 * math.pi / 30.0
RIM = 0.03


def mpa(value: float) -> object:
    return pytest.approx(value * 1e6, rel=1e-6)


def test_thin_ring_and_tip_speed() -> None:
    assert thin_ring_stress(7850.0, RIM, W) == mpa(69.72876)
    assert tip_speed(RIM, -W) == pytest.approx(30.0 * math.pi, rel=1e-12)


def test_solid_disc() -> None:
    centre = rotating_disc_stress(0.0, 0.0, RIM, speed=W, **STEEL)
    assert centre.hoop == mpa(28.76311)
    assert centre.radial == mpa(28.76311)
    rim = rotating_disc_stress(RIM, 0.0, RIM, speed=W, **STEEL)
    assert rim.hoop == mpa(12.20253)
    assert abs(rim.radial) < 1e-6  # Pa, rounding of a free surface


def test_disc_with_a_hole() -> None:
    radius = np.array([0.01, 0.03, math.sqrt(0.01 * 0.03)])
    stress = rotating_disc_stress(radius, 0.01, RIM, speed=W, **STEEL)
    assert stress.hoop[0] == mpa(58.88206)
    assert stress.hoop[1] == mpa(18.59433)
    assert stress.radial[2] == mpa(12.78361)
    growth = rotating_disc_growth(radius[:2], 0.01, RIM, young=210e9, speed=W, **STEEL)
    np.testing.assert_allclose(growth, [2.803908e-6, 2.656334e-6], rtol=1e-6)


def test_growth_is_compatible_with_the_strains() -> None:
    """The hoop strain is u/r and the radial strain du/dr, both from the same stresses."""
    r = np.linspace(0.01, RIM, 4001)
    growth = rotating_disc_growth(r, 0.01, RIM, young=210e9, speed=W, **STEEL)
    stress = rotating_disc_stress(r, 0.01, RIM, speed=W, **STEEL)
    radial_strain = (stress.radial - 0.3 * stress.hoop) / 210e9
    # Central differences, second order in a step of 5 um.
    np.testing.assert_allclose(np.gradient(growth, r)[1:-1], radial_strain[1:-1], atol=1e-10)


def test_long_cylinder_by_plane_strain_constants() -> None:
    _, nu = plane_strain(210e9, 0.3)
    solid = rotating_disc_stress(0.0, 0.0, RIM, 7850.0, nu, W).hoop
    assert solid == mpa(29.88375)
    assert solid == pytest.approx(7850 * (W * RIM) ** 2 * (3 - 0.6) / (8 * 0.7), rel=1e-12)
    assert rotating_disc_stress(0.01, 0.01, RIM, 7850.0, nu, W).hoop == mpa(60.87431)


def test_pinhole_doubles_the_stress() -> None:
    hole = rotating_disc_stress(1e-7, 1e-7, RIM, speed=W, **STEEL).hoop
    centre = rotating_disc_stress(0.0, 0.0, RIM, speed=W, **STEEL).hoop
    assert hole / centre == pytest.approx(2.0, rel=1e-9)


def test_thin_disc_is_a_ring() -> None:
    stress = rotating_disc_stress(RIM, RIM * (1 - 1e-6), RIM, speed=W, **STEEL).hoop
    assert stress == pytest.approx(float(thin_ring_stress(7850.0, RIM, W)), rel=2e-6)


def test_lame() -> None:
    stress = pressure_stress(np.array([0.05, 0.10]), 0.05, 0.10, 60e6, 0.0)
    np.testing.assert_allclose(stress.hoop, [100e6, 40e6], rtol=1e-12)
    np.testing.assert_allclose(stress.radial, [-60e6, 0.0], atol=1e-6)
    solid = pressure_stress(0.0, 0.0, 0.05, 0.0, 10e6)
    np.testing.assert_allclose(solid, -10e6, rtol=1e-12)


def test_shrink_fit_at_rest() -> None:
    """Solid shaft of 25 mm, hub to 50 mm, same steel, 25 um: p = E d/(2R) (b² - R²)/b²."""
    part = Part(210e9, 0.3, 7850.0)
    fit = shrink_fit(part, part, 0.0, 0.025, 0.050, 25e-6, 0.0)
    assert fit.pressure == mpa(78.75)
    assert fit.hub_hoop == mpa(131.25)


def test_sleeve_on_a_solid_rotor() -> None:
    rotor, sleeve = Part(160e9, 0.24, 7500.0), Part(205e9, 0.29, 8200.0)
    w = np.array([0.0, 30_000.0, 60_000.0]) * math.pi / 30.0
    fit = shrink_fit(rotor, sleeve, 0.0, 0.020, 0.024, 40e-6, w)
    np.testing.assert_allclose(fit.pressure, [60.21261e6, 54.79642e6, 38.54785e6], rtol=1e-6)
    np.testing.assert_allclose(fit.hub_hoop, [333.9063e6, 347.9589e6, 390.1167e6], rtol=1e-6)
    assert fit.lift_off_speed * 30.0 / math.pi == pytest.approx(100_027.2, rel=1e-6)
    lifted = shrink_fit(rotor, sleeve, 0.0, 0.020, 0.024, 40e-6, fit.lift_off_speed)
    assert abs(lifted.pressure) < 1.0  # Pa, of 60 MPa at rest


def test_heavy_shaft_never_lifts_off() -> None:
    dense, light = Part(100e9, 0.3, 19_000.0), Part(400e9, 0.3, 1_500.0)
    fit = shrink_fit(dense, light, 0.0, 0.020, 0.021, 1e-6, 1000.0)
    assert fit.lift_off_speed == math.inf
