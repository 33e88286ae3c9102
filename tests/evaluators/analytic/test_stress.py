"""Torque and force of gap harmonics: closed forms, quadrature, Lorentz's force on wires."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from outside import OutsideChecks

from evaluators.analytic import stress
from evaluators.analytic.rotor import MU_0, RotorRadii, magnetisation, response, source

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
ORDERS = 12

check = OutsideChecks("force")
SHEET = (
    "exact: pi Rs B1 K/2 (coth(nu ln(Rs/Rr)) ± 1), Maxwell and Lorentz part add or oppose: "
    "Bichsel, dissertation ETH Zurich 1990 (from memory; own evaluation)"
)
PRINTED = {"relative": 1e-6, "why": "seven printed digits"}


def quadrature(
    rising: ComplexArray, falling: ComplexArray, bore: float, radius: float
) -> tuple[float, complex]:
    """Maxwell's stress summed over points of a circle: exact for a band-limited field."""
    order = np.arange(1, rising.size + 1)
    angle = 2.0 * np.pi * np.arange(64) / 64
    ratio = (radius / bore) ** order
    wave = np.exp(1j * order[:, None] * angle)
    radial = 2.0 * np.real((1j * order * (rising * ratio + falling / ratio)) @ wave) / radius
    across = -2.0 * np.real((order * (rising * ratio - falling / ratio)) @ wave) / radius
    normal, shear = 0.5 * (radial**2 - across**2) / MU_0, radial * across / MU_0
    arc = 2.0 * np.pi * radius / 64
    torque = float(np.sum(shear) * arc * radius)
    force = np.sum((normal + 1j * shear) * np.exp(1j * angle)) * arc
    return torque, complex(force)


@pytest.mark.parametrize("radius", [24e-3, 25e-3, 27e-3])
def test_sums_equal_the_stress_on_any_circle(radius: float) -> None:
    generator = np.random.default_rng(2)
    rising, falling = (
        1e-3 * (generator.normal(size=ORDERS) + 1j * generator.normal(size=ORDERS))
        for _ in range(2)
    )
    torque, force = quadrature(rising, falling, 25e-3, radius)
    found = stress.force(rising[None], falling[None], np.array([25e-3]))[0]
    check(
        "torque and force of any field",
        [stress.torque(rising[None], falling[None])[0], found],
        [torque, force],
        relative=1e-9,
        why="the same sum in another order: rounding",
        source="Maxwell's stress summed over points of any circle in the gap",
    )


def test_force_of_two_fields_is_the_mixed_part() -> None:
    generator = np.random.default_rng(3)
    fields = generator.normal(size=(4, 1, ORDERS)) + 1j * generator.normal(size=(4, 1, ORDERS))
    bore = np.array([30e-3])
    whole = stress.force(fields[0] + fields[1], fields[2] + fields[3], bore)
    parts = sum(stress.force(fields[i], fields[j], bore) for i in (0, 1) for j in (2, 3))
    assert whole[0] == pytest.approx(parts[0], rel=1e-12)


# -- wires: force and torque by Biot and Savart, and Lorentz ----------------------------------

INSIDE = [(7e-3, 0.3, 40.0), (9e-3, 2.1, -90.0), (4e-3, 4.4, 50.0)]  # radius m, angle, A
OUTSIDE = [(41e-3, 1.0, 300.0), (50e-3, 2.9, -700.0), (45e-3, 5.5, 400.0)]


def place(wire: tuple[float, float, float]) -> complex:
    return wire[0] * complex(np.exp(1j * wire[1]))


def lorentz(
    on: list[tuple[float, float, float]], by: list[tuple[float, float, float]]
) -> ComplexArray:
    """Force F_x + j F_y per metre on each wire of `on`.

    Two wires attract with mu0 I1 I2 / (2 pi d).
    """
    forces = []
    for wire in on:
        total = 0j
        for other in by:
            apart = place(other) - place(wire)
            if apart != 0:
                total += MU_0 * wire[2] * other[2] / (2.0 * np.pi) * apart / abs(apart) ** 2
        forces.append(total)
    return np.array(forces)


def wires_in_the_gap(bore: float) -> tuple[ComplexArray, ComplexArray]:
    """Coefficients of A between the inner and the outer wires, orders 1 to 80.

    A = -mu0 I/(2 pi) ln|z - z0|, expanded in r/d outside the circle of the wires and in d/r inside.
    """
    order = np.arange(1, 81)
    rising, falling = np.zeros(80, dtype=complex), np.zeros(80, dtype=complex)
    for radius, angle, current in INSIDE:
        part = (radius / bore) ** order * np.exp(-1j * order * angle) / (2.0 * order)
        falling += MU_0 * current / (2.0 * np.pi) * part
    for radius, angle, current in OUTSIDE:
        part = (bore / radius) ** order * np.exp(-1j * order * angle) / (2.0 * order)
        rising += MU_0 * current / (2.0 * np.pi) * part
    return rising, falling


def test_force_and_torque_on_wires() -> None:
    # The currents inside sum to zero, as they do in a rotor: no term in ln r.
    assert sum(wire[2] for wire in INSIDE) == 0.0
    bore = 25e-3
    rising, falling = wires_in_the_gap(bore)
    forces = lorentz(INSIDE, OUTSIDE)
    found = stress.force(rising[None], falling[None], np.array([bore]))[0]
    torque = sum((np.conj(place(w)) * f).imag for w, f in zip(INSIDE, forces, strict=True))
    check(
        "force and torque on wires within wires",
        [found, stress.torque(rising[None], falling[None])[0]],
        [forces.sum(), torque],
        relative=1e-9,
        why="series of ratio 9/41 per order, cut at 80: rounding",
        source="Biot, Savart and Lorentz: mu0 I1 I2/(2 pi d) between every two wires",
    )


def test_action_equals_reaction() -> None:
    # The stress on the circle is the force on the inside; the outside feels the opposite, and the
    # forces of the inner wires on each other add nothing.
    rising, falling = wires_in_the_gap(25e-3)
    found = stress.force(rising[None], falling[None], np.array([25e-3]))[0]
    assert found == pytest.approx(-lorentz(OUTSIDE, INSIDE).sum(), rel=1e-9)
    assert abs(lorentz(INSIDE, INSIDE).sum()) < 1e-12
    alone = stress.force(0.0 * rising[None], falling[None], np.array([25e-3]))[0]
    assert abs(alone) < 1e-15


# -- rotor of magnets and a current sheet on the bore ---------------------------------------------

SHEET_FORCE = [
    # p, B1 at the bore (T), order of the sheet, force (N/m) of 10 kA/m. Radii 20, 24, 25 mm,
    # radial magnetisation over 0.8 of the pitch, 1.2 T, mu_r = 1; + for nu = p + 1.
    (1, 1.039318, 2, 1382.586),
    (2, 1.031641, 1, 1440.442),
    (2, 1.031641, 3, 1098.112),
    (4, 1.002616, 3, 279.7647),
]


def magnets_and_sheet(
    pole_pairs: int, sheet_order: int, sheet: complex
) -> tuple[RotorRadii, ComplexArray, ComplexArray, float]:
    """Coefficients of orders 1.. with the fundamental of the magnets and a sheet at the bore."""
    rotor = RotorRadii(np.array([20e-3]), np.array([24e-3]), np.array([25e-3]), 1.0)
    order = np.array([pole_pairs])
    zero = np.zeros((1, 1))
    parts = magnetisation(np.array([0.8]), 1.2, pole_pairs, order, "radial")
    magnet = source(rotor, *parts, order, zero).bore[0, 0]
    rising, falling = np.zeros((1, 8), dtype=complex), np.zeros((1, 8), dtype=complex)
    rising[0, pole_pairs - 1] += 0.5 * magnet
    falling[0, pole_pairs - 1] += 0.5 * magnet
    # K along +z lowers H_theta from the gap to the iron, so mu0 H_theta = -mu0 K at the bore.
    tangential = -0.5 * MU_0 * sheet
    potential = response(rotor, np.array([sheet_order]), zero)[0, 0] * tangential
    swing = 25e-3 / sheet_order * tangential
    rising[0, sheet_order - 1] += 0.5 * (potential - swing)
    falling[0, sheet_order - 1] += 0.5 * (potential + swing)
    return rotor, rising, falling, 2.0 * pole_pairs * abs(magnet) / 25e-3


@pytest.mark.parametrize(("pole_pairs", "density", "sheet_order", "expected"), SHEET_FORCE)
def test_force_of_a_sheet_one_pole_pair_apart(
    pole_pairs: int, density: float, sheet_order: int, expected: float
) -> None:
    rotor, rising, falling, fundamental = magnets_and_sheet(pole_pairs, sheet_order, 1e4)
    assert fundamental == pytest.approx(density, rel=1e-6)  # seven digits printed
    force = stress.force(rising, falling, rotor.bore)[0]
    what = "force of magnets and a current sheet one pole pair apart"
    check(what, abs(force), expected, **PRINTED, source=SHEET)
    # Turning the sheet by an angle of its own order turns the force by that angle, no more.
    turned = stress.force(
        *magnets_and_sheet(pole_pairs, sheet_order, 1e4 * np.exp(0.7j))[1:3], rotor.bore
    )
    assert abs(turned[0]) == pytest.approx(expected, rel=1e-6)
    assert abs(np.angle(turned[0] / force)) == pytest.approx(0.7, rel=1e-9)


@pytest.mark.parametrize(("pole_pairs", "expected"), [(1, 40.81392), (2, 40.51243), (4, 39.37265)])
def test_torque_of_an_aligned_sheet(pole_pairs: int, expected: float) -> None:
    # A sheet of order p in phase with the flux density, 20 kA/m, same rotor. B_r ~ cos(p theta)
    # pushes a sheet K ~ cos along +z by z x r, counter-clockwise.
    _, rising, falling, _ = magnets_and_sheet(pole_pairs, pole_pairs, 2e4)
    check(
        "torque of magnets and an aligned current sheet",
        stress.torque(rising, falling)[0],
        -expected,
        **PRINTED,
        source="Lorentz: pi Rs² B1 K, own evaluation",
    )
