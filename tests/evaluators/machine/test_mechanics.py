"""Rotating discs and Lamé against handbook closed forms.

Steel of 7850 kg/m3, 210 GPa, 0.3 at 30 000 1/min unless said.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.machine.mechanics.rings import (
    outside_pressure_compliance,
    pressure_stress,
    rotating_disc_growth,
    rotating_disc_stress,
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


def test_tip_speed() -> None:
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
        7850.0 * (RIM * W) ** 2,
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


@pytest.mark.parametrize("bore", [0.0, 0.010])
def test_pressure_from_outside_shrinks(bore: float) -> None:
    young, poisson, outer = 160e9, 0.24, 0.020
    stress = pressure_stress(outer, bore, outer, 0.0, 1.0)
    check(
        "shrinkage of discs under outside pressure, solid and hollow",
        outside_pressure_compliance(bore, outer, young, poisson),
        -outer * (stress.hoop - poisson * stress.radial) / young,
        relative=1e-12,
        why="rounding",
        source="Hooke's law on Lamé's stress",
    )
    if bore == 0.0:  # all directions alike
        expected = outer * (1.0 - poisson) / young
        assert outside_pressure_compliance(bore, outer, young, poisson) == pytest.approx(expected)
