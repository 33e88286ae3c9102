"""Rotating discs, Lamé and shrink fits against handbook closed forms.

Steel of 7850 kg/m3, 210 GPa, 0.3 at 30 000 1/min unless said.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from outside import OutsideChecks

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

check = OutsideChecks(
    "mechanics",
    "own evaluation of Timoshenko, Strength of Materials, part II; Roark's tables (from memory)",
)
PRINTED = {"relative": 1e-6, "why": "seven printed digits"}


def test_thin_ring_and_tip_speed() -> None:
    check("stress of a thin ring", thin_ring_stress(7850.0, RIM, W), 69.72876e6, **PRINTED)
    assert tip_speed(RIM, -W) == pytest.approx(30.0 * math.pi, rel=1e-12)


def test_solid_disc() -> None:
    centre = rotating_disc_stress(0.0, 0.0, RIM, speed=W, **STEEL)
    rim = rotating_disc_stress(RIM, 0.0, RIM, speed=W, **STEEL)
    check(
        "stress of a solid disc: both at the centre, hoop at the rim",
        [centre.hoop, centre.radial, rim.hoop],
        [28.76311e6, 28.76311e6, 12.20253e6],
        **PRINTED,
    )
    assert abs(rim.radial) < 1e-6  # Pa, rounding of a free surface


def test_disc_with_a_hole() -> None:
    radius = np.array([0.01, 0.03, math.sqrt(0.01 * 0.03)])
    stress = rotating_disc_stress(radius, 0.01, RIM, speed=W, **STEEL)
    check(
        "stress of a disc with a hole: hoop at hole and rim, largest radial",
        [stress.hoop[0], stress.hoop[1], stress.radial[2]],
        [58.88206e6, 18.59433e6, 12.78361e6],
        **PRINTED,
    )
    growth = rotating_disc_growth(radius[:2], 0.01, RIM, young=210e9, speed=W, **STEEL)
    check("growth of a disc with a hole", growth, [2.803908e-6, 2.656334e-6], **PRINTED)


def test_growth_is_compatible_with_the_strains() -> None:
    """The hoop strain is u/r and the radial strain du/dr, both from the same stresses."""
    r = np.linspace(0.01, RIM, 4001)
    growth = rotating_disc_growth(r, 0.01, RIM, young=210e9, speed=W, **STEEL)
    stress = rotating_disc_stress(r, 0.01, RIM, speed=W, **STEEL)
    radial_strain = (stress.radial - 0.3 * stress.hoop) / 210e9
    check(
        "radial strain of a disc by the slope of its growth",
        np.gradient(growth, r)[1:-1],
        radial_strain[1:-1],
        absolute=1e-10,
        why="central differences, second order in a step of 5 um; strains of 1e-4",
        source="Hooke's law and compatibility",
    )


def test_long_cylinder_by_plane_strain_constants() -> None:
    _, nu = plane_strain(210e9, 0.3)
    solid = rotating_disc_stress(0.0, 0.0, RIM, 7850.0, nu, W).hoop
    assert solid == pytest.approx(7850 * (W * RIM) ** 2 * (3 - 0.6) / (8 * 0.7), rel=1e-12)
    hollow = rotating_disc_stress(0.01, 0.01, RIM, 7850.0, nu, W).hoop
    check(
        "hoop stress of long cylinders, solid and hollow",
        [solid, hollow],
        [29.88375e6, 60.87431e6],
        **PRINTED,
    )


def test_pinhole_doubles_the_stress() -> None:
    hole = rotating_disc_stress(1e-7, 1e-7, RIM, speed=W, **STEEL).hoop
    centre = rotating_disc_stress(0.0, 0.0, RIM, speed=W, **STEEL).hoop
    check(
        "stress at a pinhole over that of a solid disc",
        hole / centre,
        2.0,
        relative=1e-9,
        why="square of the hole's radius over the disc's",
    )


def test_thin_disc_is_a_ring() -> None:
    stress = rotating_disc_stress(RIM, RIM * (1 - 1e-6), RIM, speed=W, **STEEL).hoop
    check(
        "stress of a disc that is nearly a ring",
        stress,
        float(thin_ring_stress(7850.0, RIM, W)),
        relative=2e-6,
        why="thickness over radius is 1e-6",
        source="rho (w r)² of a thin ring",
    )


def test_lame() -> None:
    stress = pressure_stress(np.array([0.05, 0.10]), 0.05, 0.10, 60e6, 0.0)
    check(
        "hoop stress of a thick tube under pressure",
        stress.hoop,
        [100e6, 40e6],
        relative=1e-12,
        why="rounding",
        source="Lamé, by hand",
    )
    np.testing.assert_allclose(stress.radial, [-60e6, 0.0], atol=1e-6)
    solid = pressure_stress(0.0, 0.0, 0.05, 0.0, 10e6)
    np.testing.assert_allclose(solid, -10e6, rtol=1e-12)


def test_shrink_fit_at_rest() -> None:
    """Solid shaft of 25 mm, hub to 50 mm, same steel, 25 um."""
    part = Part(210e9, 0.3, 7850.0)
    fit = shrink_fit(part, part, 0.0, 0.025, 0.050, 25e-6, 0.0)
    check(
        "pressure and hoop stress of a shrink fit at rest",
        [fit.pressure, fit.hub_hoop],
        [78.75e6, 131.25e6],
        **PRINTED,
        source="p = E d/(2R) (b² - R²)/b², Lamé, by hand",
    )


def test_sleeve_on_a_solid_rotor() -> None:
    rotor, sleeve = Part(160e9, 0.24, 7500.0), Part(205e9, 0.29, 8200.0)
    w = np.array([0.0, 30_000.0, 60_000.0]) * math.pi / 30.0
    fit = shrink_fit(rotor, sleeve, 0.0, 0.020, 0.024, 40e-6, w)
    source = "Lamé and rotating discs superposed, own evaluation"
    expected = [60.21261e6, 54.79642e6, 38.54785e6]
    check("pressure of a turning shrink fit", fit.pressure, expected, **PRINTED, source=source)
    expected = [333.9063e6, 347.9589e6, 390.1167e6]
    check("hoop stress of a turning shrink fit", fit.hub_hoop, expected, **PRINTED, source=source)
    lift_off = fit.lift_off_speed * 30.0 / math.pi
    check("lift-off speed of a shrink fit", lift_off, 100_027.2, **PRINTED, source=source)
    lifted = shrink_fit(rotor, sleeve, 0.0, 0.020, 0.024, 40e-6, fit.lift_off_speed)
    assert abs(lifted.pressure) < 1.0  # Pa, of 60 MPa at rest


def test_heavy_shaft_never_lifts_off() -> None:
    dense, light = Part(100e9, 0.3, 19_000.0), Part(400e9, 0.3, 1_500.0)
    fit = shrink_fit(dense, light, 0.0, 0.020, 0.021, 1e-6, 1000.0)
    assert fit.lift_off_speed == math.inf
