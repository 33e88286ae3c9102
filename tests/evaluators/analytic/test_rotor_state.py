"""Pull of a displaced rotor and flux density in the magnets, against closed forms."""

from __future__ import annotations

from dataclasses import replace

import machines
import numpy as np
import pytest
from numpy.typing import NDArray
from outside import OutsideChecks

from evaluators.analytic.gap import GapField
from evaluators.analytic.rotor import MU_0, RotorRadii, magnetisation, source
from evaluators.analytic.rotor_state import displacement_stiffness, lowest_magnet_density
from evaluators.machine.geometry.cross_sections import CrossSections

FloatArray = NDArray[np.float64]

check = OutsideChecks("force")
check_magnets = OutsideChecks(
    "demagnetisation", "Furlani, Permanent Magnet and Electromechanical Devices, 2001"
)

NO_TIPS = np.zeros((1, 1, 2, 0), dtype=complex)
UNUSED = np.zeros((1, 23), dtype=complex)  # as many orders as the field has classes


def smooth_gap(core: float, bore: float, order: int, density: float) -> FloatArray:
    """Stiffness between perfect cylinders with one order of the given density at the bore."""
    size = np.array([[0.25 * density * bore / order]])
    depth = np.log(bore / core)
    eta = [np.array([[np.tanh(near * depth) if near else 1.0]]) for near in (order - 1, order + 1)]
    one = np.ones((1, 1))
    return displacement_stiffness(
        np.array([bore]), np.array([order]), size, size, (eta[0], eta[1]), (one, one)
    )


@pytest.mark.parametrize(
    ("pole_pairs", "density", "expected"), [(1, 1.039318, 4_573_941), (2, 1.031641, 7_774_065)]
)
def test_exact_stiffness_with_curvature(pole_pairs: int, density: float, expected: float) -> None:
    # Rr = 20, Rs = 25 mm, fundamental only.
    found = smooth_gap(20e-3, 25e-3, pole_pairs, density)
    check(
        "stiffness of a displaced rotor, magnets' fundamental",
        found[0],
        expected,
        relative=2e-6,
        why="B1 has seven digits",
        source="closed form (own derivation), confirmed to 1e-5 by an eccentric rotor in "
        "scikit-fem: 4,573,902 and 7,774,009 N/m per m",
    )


@pytest.mark.parametrize("order", [1, 2, 5])
def test_thin_gap_limit(order: int) -> None:
    # Half of it for two poles without a homopolar path.
    gap, radius, density = 1e-6, 25e-3, 0.8
    found = smooth_gap(radius - gap, radius, order, density)
    thin = np.pi * radius * density**2 / (2.0 * MU_0 * gap) * (0.5 if order == 1 else 1.0)
    check(
        "stiffness of a displaced rotor in a thin gap",
        found[0],
        thin,
        relative=1e-4,
        why="gap over radius, times the order",
        source="pi R B²/(2 mu0 g): Covo, AIEE Trans. 73, 1954 (from memory)",
    )


def two_pole(core: float, magnet: float, bore: float, arc: float = 1.0) -> CrossSections:
    of = machines.task(12, 1, 2)
    sections = machines.sections(of, machines.designs())
    shift = bore - float(sections.bore_radius[0])
    stator = {
        name: getattr(sections, name) + shift
        for name in ("bore_radius", "tip_radius", "wedge_radius", "slot_radius", "outer_radius")
    }
    return replace(
        sections,
        shaft_radius=np.array([0.5 * core]),
        core_radius=np.array([core]),
        magnet_radius=np.array([magnet]),
        rotor_radius=np.array([0.5 * (magnet + bore)]),
        magnet_arc_ratio=np.array([arc]),
        **stator,
    )


def smooth_field(sections: CrossSections, direction: str, recoil: float) -> GapField:
    orders = np.arange(1, 46, 2)
    rotor = RotorRadii.of(sections, recoil)
    parts = magnetisation(sections.magnet_arc_ratio, 1.2, 1, orders, direction)
    bore = source(rotor, *parts, orders, np.zeros((1, orders.size))).bore[:, :, None]
    return GapField(orders, orders[:, None], 0.5 * bore, 0.5 * bore, bore[:, :, 0], NO_TIPS)


def no_current() -> GapField:
    zero = np.zeros((1, 1, 1), dtype=complex)
    return GapField(np.array([1]), np.array([[1]]), zero, zero, zero[:, :, 0], NO_TIPS)


def test_uniform_density_of_a_diametral_cylinder() -> None:
    # B inside a uniformly magnetised cylinder in an iron tube is uniform along its magnetisation,
    # (Br/2)(1 + a^2/b^2) for mu_r = 1: 1.016667 T for a = 10, b = 12 mm, 1.2 T. Every point of the
    # surface tells it, the edges too, where the radial component is nearly nothing.
    sections = two_pole(1e-6, 10e-3, 12e-3)
    found = lowest_magnet_density(
        sections,
        smooth_field(sections, "parallel", 1.0),
        no_current(),
        np.arange(1, 46, 2),
        UNUSED,
        1.0,
        1.2,
    )
    check_magnets(
        "density in a diametral cylinder in an iron tube",
        found[0],
        1.016667,
        relative=1e-6,
        why="seven printed digits; the core of 1 um does not matter",
    )


def test_recoil_permeability_lowers_it() -> None:
    # Uniform as well.
    sections = two_pole(1e-6, 10e-3, 12e-3)
    found = lowest_magnet_density(
        sections,
        smooth_field(sections, "parallel", 1.05),
        no_current(),
        np.arange(1, 46, 2),
        UNUSED,
        1.05,
        1.2,
    )
    check_magnets(
        "density in that cylinder with a permeability of 1.05",
        found[0],
        1.008959,
        relative=1e-6,
        why="seven printed digits",
        source="boundary-value problem, own evaluation",
    )


def test_current_against_the_magnets_lowers_it() -> None:
    # A tenth of the fundamental against the magnets is as if nine tenths of it were left.
    sections = two_pole(10e-3, 18e-3, 20e-3, arc=0.8)
    orders = np.arange(1, 46, 2)
    magnets = smooth_field(sections, "radial", 1.05)
    alone = lowest_magnet_density(sections, magnets, no_current(), orders, UNUSED, 1.05, None)
    part = -0.1 * magnets.rising[:, :1]
    against = GapField(np.array([1]), np.array([[1]]), part, part, part[:, :, 0], NO_TIPS)
    loaded = lowest_magnet_density(sections, magnets, against, orders, UNUSED, 1.05, None)
    left = magnets.rising.copy()
    left[:, 0] *= 0.9
    weaker = replace(magnets, rising=left, falling=left)
    expected = lowest_magnet_density(sections, weaker, no_current(), orders, UNUSED, 1.05, None)
    assert loaded[0] == pytest.approx(expected[0], rel=1e-12)
    assert loaded[0] < alone[0]


def test_tangential_field_crosses_the_surface_as_h() -> None:
    """B inside from B_r and H_theta steady at the surface, with a field that only rises outwards.

    B_theta/mu0 = H_theta outside, B = mu0 (mu_r H + M) inside, M along the axis of the magnet.
    """
    sections = two_pole(10e-3, 18e-3, 20e-3, arc=0.5)
    rising = np.array([[[-4e-3j]]])
    field = GapField(np.array([1]), np.array([[1]]), rising, 0.0 * rising, rising[:, :, 0], NO_TIPS)
    found = lowest_magnet_density(
        sections, field, no_current(), np.array([1]), UNUSED[:, :1], 1.3, 0.9
    )
    angle = 0.25 * np.pi * np.linspace(-0.98, 0.98, 25)
    # A = 8e-3 (r/R) sin(theta): a uniform field of 0.4 T along the axis.
    normal, across = 0.4 * np.cos(angle), -0.4 * np.sin(angle)
    inside = 1.3 * across - 0.9 * np.sin(angle)
    along = normal * np.cos(angle) - inside * np.sin(angle)
    assert along.argmin() == 12
    assert found[0] == pytest.approx(along.min(), rel=1e-12)
    # Against the magnet the edges lie lowest, where mu_r counts.
    found = lowest_magnet_density(
        sections,
        replace(field, rising=-rising),
        no_current(),
        np.array([1]),
        UNUSED[:, :1],
        1.3,
        0.1,
    )
    along = -normal * np.cos(angle) + (1.3 * across + 0.1 * np.sin(angle)) * np.sin(angle)
    assert along.argmin() in (0, 24)
    assert found[0] == pytest.approx(along.min(), rel=1e-12)
