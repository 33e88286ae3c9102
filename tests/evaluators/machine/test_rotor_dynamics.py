"""Bending speeds of beams against closed forms, and separation margins."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from outside import OutsideChecks
from scipy.optimize import brentq

from evaluators.machine.mechanics.bending import (
    amplification_factor,
    beam_matrices,
    natural_speeds,
    required_margin,
    separation_margin,
)

FloatArray = NDArray[np.float64]

# Steel shaft of the checks: 20 mm, 400 mm, E = 210 GPa, 7850 kg/m3.
E, RHO, NU, D, LONG = 210e9, 7850.0, 0.3, 0.02, 0.4
AREA, SECOND = np.pi * D**2 / 4.0, np.pi * D**4 / 64.0
THIN = 1e30  # shear stiffness of an Euler-Bernoulli beam

check = OutsideChecks("mechanics")
EIGHT = "eight cubic elements: the error of the first mode is of order (1/8)^4"


def uniform(
    elements: int, length: float = LONG, shear: float = THIN, inertia: float = 0.0
) -> tuple[FloatArray, FloatArray]:
    one = np.ones((1, elements))
    return beam_matrices(
        one * length / elements, one * E * SECOND, one * shear, one * RHO * AREA, one * inertia
    )


def pinned(stiffness: FloatArray) -> FloatArray:
    """Springs so stiff at both ends that they count as pins."""
    held = stiffness.copy()
    for unknown in (0, -2):
        held[:, unknown, unknown] += 1e8 * E * SECOND / LONG**3
    return held


def hertz(stiffness: FloatArray, masses: FloatArray) -> FloatArray:
    return natural_speeds(stiffness, masses)[0] / (2.0 * np.pi)


def test_free_and_simply_supported_shaft() -> None:
    stiffness, masses = uniform(8)
    free = hertz(stiffness, masses)
    assert np.all(free[:2] < 1e-3 * free[2])  # two rigid modes
    check(
        "bending frequency of a free shaft",
        free[2],
        575.5390,
        relative=1e-4,
        why=EIGHT,
        source="Euler, Bernoulli: beta L = 4.730040745, closed form",
    )
    check(
        "bending frequency of a pinned shaft",
        hertz(pinned(stiffness), masses)[0],
        253.8895,
        relative=1e-4,
        why=EIGHT + "; springs a hundred million times stiffer than the beam hardly give way",
        source="Euler, Bernoulli: beta L = pi, closed form",
    )


def test_error_falls_with_the_fourth_power() -> None:
    errors = []
    for elements in (4, 8):
        stiffness, masses = uniform(elements)
        errors.append(hertz(stiffness, masses)[2] / 575.53899 - 1.0)
    check.within(
        "order of convergence of the bending frequency",
        np.log2(errors[0] / errors[1]),
        3.5,
        4.5,
        why="half an order, for so few elements",
        source="cubic shapes converge with h^4 (theory of finite elements)",
    )


def test_cantilever_by_a_heavy_end() -> None:
    """A huge mass at one tip clamps the beam."""
    stiffness, masses = uniform(8)
    masses[0, 0, 0] += 1e6
    masses[0, 1, 1] += 1e6
    expected = 1.875104**2 / LONG**2 * np.sqrt(E * SECOND / (RHO * AREA)) / (2.0 * np.pi)
    check(
        "bending frequency of a cantilever",
        hertz(stiffness, masses)[2],
        expected,
        relative=1e-4,
        why=EIGHT,
        source="Euler, Bernoulli: beta L = 1.875104, closed form",
    )


def test_stubby_pinned_beam_by_timoshenko() -> None:
    """Sine modes solve Timoshenko's equations of a pinned beam; five diameters long.

    With w = W sin(kx), psi = P cos(kx): rho A o² W = S k (k W - P) and
    rho I o² P = E I k² P - S (k W - P) (Timoshenko 1921).
    """
    length = 5.0 * D
    shear = 0.9 * E / (2.0 * (1.0 + NU)) * AREA
    inertia = RHO * SECOND
    stiffness, masses = uniform(10, length, shear, inertia)
    k = np.pi / length

    def determinant(o: float) -> float:
        a = shear * k * k - RHO * AREA * o * o
        d = E * SECOND * k * k + shear - inertia * o * o
        return a * d - (shear * k) ** 2

    euler = k * k * np.sqrt(E * SECOND / (RHO * AREA))
    exact = brentq(determinant, 0.1 * euler, euler) / (2.0 * np.pi)
    found = hertz(pinned(stiffness), masses)[0]
    check(
        "bending frequency of a stubby pinned shaft",
        found,
        exact,
        relative=5e-4,
        why="ten elements, shear and rotation included",
        source="sine modes of Timoshenko's beam (1921)",
    )
    assert found < 0.97 * euler / (2.0 * np.pi)  # shear and rotation matter here


def test_stiff_body_on_a_spring() -> None:
    """A body of mass m on two end springs k/2 bounces with sqrt(k/m) and tilts with sqrt(3k/m)."""
    stiffness, masses = uniform(4)
    stiffness[0, 0, 0] += 5.0
    stiffness[0, -2, -2] += 5.0
    mass = RHO * AREA * LONG
    check(
        "rigid modes of a body on two springs",
        natural_speeds(stiffness, masses)[0, :2],
        [np.sqrt(10.0 / mass), np.sqrt(3.0 * 10.0 / mass)],
        relative=1e-4,
        why="the beam bends by E I/(k L³), some 2500 times less than the springs",
        source="sqrt(k/m) and sqrt(3 k/m), closed form",
    )


def test_stepped_beam_by_its_mass_and_symmetry() -> None:
    """The mass matrix holds mass and moment of a stepped beam; turning it round changes nothing."""
    lengths = np.array([[0.1, 0.2, 0.05]])
    diameter = np.array([[0.02, 0.04, 0.03]])
    area, second = np.pi * diameter**2 / 4.0, np.pi * diameter**4 / 64.0
    parts = (lengths, E * second, 0.9 * 80e9 * area, RHO * area, RHO * second)
    stiffness, masses = beam_matrices(*parts)
    rise = np.tile([1.0, 0.0], 4)
    station = np.concatenate([[0.0], np.cumsum(lengths[0])])
    tilt = np.ravel(np.column_stack([station, np.ones(4)]))
    mass = RHO * area * lengths
    assert rise @ masses[0] @ rise == pytest.approx(mass.sum(), rel=1e-12)
    centre = station[:-1] + 0.5 * lengths[0]
    moment = np.sum(mass * (centre**2 + lengths**2 / 12.0) + RHO * second * lengths)
    assert tilt @ masses[0] @ tilt == pytest.approx(moment, rel=1e-12)
    # Rigid motion meets no stiffness.
    scale = np.abs(stiffness).max()
    assert np.abs(stiffness[0] @ rise).max() < 1e-12 * scale
    assert np.abs(stiffness[0] @ tilt).max() < 1e-12 * scale
    turned = beam_matrices(*(part[:, ::-1] for part in parts))
    np.testing.assert_allclose(
        natural_speeds(*turned)[0, 2:], natural_speeds(stiffness, masses)[0, 2:], rtol=1e-9
    )


@pytest.mark.parametrize(("factor", "below", "above"), [
    (2.0, 0.0, 0.0), (2.5, 0.0, 10.0), (3.5, 8.5, 18.5), (5.0, 12.14286, 22.14286),
    (10.0, 15.0, 25.0), (100.0, 16.0, 26.0),
])  # fmt: skip
def test_required_margin(factor: float, below: float, above: float) -> None:
    check(
        "separation margins below and above a bending speed",
        [100.0 * required_margin(factor, above=side) for side in (False, True)],
        [below, above],
        absolute=5e-6,
        unit="% of speed",
        why="printed digits",
        source="API 617 / RP 684 (formula from memory)",
    )


def test_separation_margin() -> None:
    """Range 800 to 1000, amplification factor 3.5: stay above 1185 or below 732."""
    critical = np.array([1185.0, 1300.0, 1000.0, 732.0, 600.0, 900.0])
    margin = separation_margin(critical, 800.0, 1000.0, 3.5)
    assert margin[0] == pytest.approx(0.0, abs=1e-12)
    assert margin[3] == pytest.approx(0.0, abs=1e-12)
    assert np.all(margin[[1, 4]] > 0.0)
    assert np.all(margin[[2, 5]] < 0.0)
    # Nothing runs below a range that begins at rest.
    assert separation_margin(10.0, 0.0, 1000.0, 3.5) < 0.0
    assert amplification_factor(0.05) == pytest.approx(10.0)
