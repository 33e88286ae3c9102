"""Field of the magnets under a smooth bore, against the published solution and closed forms.

Tables: harmonics and sums evaluated from the papers, and harmonic by harmonic from a boundary-value
problem of the scalar potential; all digits printed agree. Positive on the magnet axis at theta = 0.
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from outside import OutsideChecks

from evaluators.analytic.rotor import (
    MU_0,
    RotorRadii,
    core_share,
    magnetisation,
    response,
    source,
)

FloatArray = NDArray[np.float64]
PRINTED = {"relative": 1e-7, "why": "the tables hold eight digits"}

check = OutsideChecks(
    "field",
    "own evaluation of Zhu, Howe, Bolte, Ackermann, IEEE Trans. Magn. 29(1), 1993 (radial) and "
    "Zhu, Howe, Chan, IEEE Trans. Magn. 38(1), 2002 (both directions)",
)
DIRECT = "boundary-value problem of rotor and gap solved directly"

CASE_A_ORDERS = (2, 6, 10, 14, 18, 22)
CASE_A = {
    # radial flux density in mid-gap (24.5 mm), tangential there, radial at the bore (25 mm), T
    "radial": (
        (1.0436851, 0.042147594, 1.0219770),
        (-0.20084062, -0.024226604, -0.19538660),
        (0.0, 0.0, 0.0),
        (0.068073774, 0.018756339, 0.064130039),
        (-0.075398960, -0.026270798, -0.069260756),
        (0.054411646, 0.022707837, 0.048457817),
    ),
    "parallel": (
        (1.0480968, 0.042325754, 1.0262970),
        (-0.068188996, -0.0082253673, -0.066337260),
        (-0.091012499, -0.018140852, -0.087402510),
        (0.11058924, 0.030470606, 0.10418244),
        (-0.078644498, -0.027401621, -0.072242076),
        (0.035501272, 0.014815893, 0.031616654),
    ),
}
CASE_A_SUMS = {
    # degrees: the same three, summed over the orders 2, 6, .. 798
    "radial": {
        0: (0.86998599, 0.0, 0.85258432),
        15: (0.86909092, 0.00027505504, 0.85167028),
        30: (0.82506782, 0.016606693, 0.80513834),
    },
    "parallel": {
        0: (0.94910709, 0.0, 0.92992890),
        15: (0.91391523, 0.0058333184, 0.89533192),
        30: (0.70066794, 0.047090785, 0.68053875),
    },
}


def radii(core: float, magnet: float, bore: float, recoil: float) -> RotorRadii:
    return RotorRadii(np.array([core]), np.array([magnet]), np.array([bore]), recoil)


def amplitudes(
    rotor: RotorRadii, orders: NDArray[np.int64], pole_pairs: int, arc: float, direction: str
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Amplitudes of cos (radial, mid-gap), sin (tangential, mid-gap), cos (radial, bore), T.

    Under a smooth perfect bore rising and falling part are equal: no tangential field there.
    """
    parts = magnetisation(np.array([arc]), 1.2, pole_pairs, orders, direction)
    bore = source(rotor, *parts, orders, np.zeros((1, orders.size))).bore[0]
    middle = 0.5 * (rotor.magnet[0] + rotor.bore[0])
    ratio = (middle / rotor.bore[0]) ** orders
    radial = 1j * orders * 0.5 * bore * (ratio + 1.0 / ratio) / middle
    tangential = -orders * 0.5 * bore * (ratio - 1.0 / ratio) / middle
    # exp(j n theta) and its conjugate: cos has twice the real part, sin minus twice the other.
    assert np.abs(radial.imag).max() < 1e-12
    assert np.abs(tangential.real).max() < 1e-12
    at_bore = 2.0 * np.real(1j * orders * bore) / rotor.bore[0]
    return 2.0 * radial.real, -2.0 * tangential.imag, at_bore


@pytest.mark.parametrize("direction", ["radial", "parallel"])
def test_harmonics_of_a_four_pole_ring(direction: str) -> None:
    rotor = radii(20e-3, 24e-3, 25e-3, 1.05)
    found = amplitudes(rotor, np.array(CASE_A_ORDERS), 2, 0.8, direction)
    check(
        "harmonics of a four-pole magnet ring in mid-gap and at the bore",
        np.transpose(found),
        CASE_A[direction],
        **PRINTED,
        absolute=1e-12,
        unit="T",
    )


@pytest.mark.parametrize("direction", ["radial", "parallel"])
@pytest.mark.parametrize("angle", [0, 15, 30])
def test_sum_over_the_harmonics(direction: str, angle: int) -> None:
    rotor = radii(20e-3, 24e-3, 25e-3, 1.05)
    orders = 2 * np.arange(1, 400, 2)
    radial, tangential, bore = amplitudes(rotor, orders, 2, 0.8, direction)
    theta = np.radians(angle)
    cosine, sine = np.cos(orders * theta), np.sin(orders * theta)
    found = (radial @ cosine, tangential @ sine, bore @ cosine)
    check(
        "field of a four-pole magnet ring, 200 harmonics summed",
        found,
        CASE_A_SUMS[direction][angle],
        relative=1e-7,
        absolute=1e-8,
        unit="T",
        why="cancellation among terms of 1 T leaves eight digits after the point",
    )


def test_two_pole_branch() -> None:
    # n = 1 has its own particular solution. Same sources.
    rotor = radii(10e-3, 18e-3, 20e-3, 1.05)
    orders = np.array([1, 3, 7])
    parallel = np.transpose(amplitudes(rotor, orders, 1, 1.0, "parallel"))
    what = "harmonics of a two-pole magnet ring, whose first order is a case of its own"
    check(what, parallel[0], (0.93663599, 0.048001056, 0.88863494), **PRINTED)
    # A whole two-pole ring magnetised in one direction makes no other order.
    np.testing.assert_allclose(parallel[1:], 0.0, atol=1e-12)
    radial = np.transpose(amplitudes(rotor, orders, 1, 0.8, "radial"))
    table = (
        (0.86471479, 0.044315212, 0.82039957),
        (-0.16320046, -0.024916908, -0.15322277),
        (0.053301196, 0.018355848, 0.047538747),
    )
    check(what, radial, table, **PRINTED)


def test_solid_uniformly_magnetised_cylinder_in_a_perfect_bore() -> None:
    rotor = radii(1e-6, 10e-3, 12e-3, 1.0)
    _, _, bore = amplitudes(rotor, np.array([1]), 1, 1.0, "parallel")
    check(
        "field at the bore of a diametral cylinder in an iron tube",
        bore[0],
        0.83333333,
        relative=1e-7,
        why="the core is shrunk until it no longer matters: (1 um/10 mm)² = 1e-8",
        source="B_r = Br a²/b²: Furlani, Permanent Magnet and Electromechanical Devices, 2001",
    )


@pytest.mark.parametrize(
    ("order", "at_bore", "at_core"),
    [
        (1, 0.0572468, 0.06981317),
        (2, 0.03000264, 0.0340552),
        (3, 0.02149548, 0.02179958),
        (5, 0.01558959, 0.01153268),
        (7, 0.01372257, 0.006891488),
    ],
)
def test_current_sheet_on_the_bore(order: int, at_bore: float, at_core: float) -> None:
    """B_r = mu0 K (Rs/r) ((r/Rr)^n + (Rr/r)^n) / ((Rs/Rr)^n - (Rr/Rs)^n), both sides iron.

    K = 10 kA/m, 25 and 20 mm.
    """
    rotor = radii(20e-3, 24e-3, 25e-3, 1.0)
    orders, core = np.array([order]), np.zeros((1, 1))
    potential = response(rotor, orders, core)[0, 0] * MU_0 * 1e4
    share = core_share(rotor, orders, core)[0, 0]
    check(
        "field of a current sheet at the bore and on the core",
        [order * abs(potential) / 25e-3, order * abs(potential * share) / 20e-3],
        [at_bore, at_core],
        relative=2e-6,
        why="seven digits",
        source="own evaluation of Hughes, Miller, Proc. IEE 124(2), 1977",
    )


@pytest.mark.parametrize("order", [1, 2, 4, 14])
@pytest.mark.parametrize(("permeability", "hole"), [(40.0, 0.5), (1000.0, 0.2), (3.0, 0.9)])
def test_rotor_of_finite_permeability(order: int, permeability: float, hole: float) -> None:
    """Magnets and core against the boundary-value problem solved directly.

    Unknown coefficients of r^n and r^-n in core, magnets and gap; conditions: no flux at the
    core's hole, A and H_theta steady at core and magnet, no H_theta at the bore.
    """
    core, magnet, bore, recoil = 20e-3, 24e-3, 25e-3, 1.08
    radial, tangential = 0.9, -0.4  # of the magnets, T
    n, inner = order, hole * core

    def value(r: float) -> FloatArray:
        return np.array([(r / core) ** n, (r / core) ** -n])

    def slope(r: float) -> FloatArray:  # of r^n and r^-n, dA/dr
        return np.array([(r / core) ** n, -((r / core) ** -n)]) * n / r

    curl = tangential / 2j - 1j * n * 0.5 * radial
    if n == 1:
        special = lambda r: -0.5 * curl * r * np.log(r)  # noqa: E731
        special_slope = lambda r: -0.5 * curl * (np.log(r) + 1.0)  # noqa: E731
    else:
        special = lambda r: curl * r / (n * n - 1)  # noqa: E731
        special_slope = lambda r: curl / (n * n - 1)  # noqa: E731
    matrix, right = np.zeros((6, 6), dtype=complex), np.zeros(6, dtype=complex)
    matrix[0, :2] = value(inner)
    matrix[1, :2], matrix[1, 2:4], right[1] = value(core), -value(core), special(core)
    # H_theta mu0: -A'/mu in the core, (-A' - M_theta)/recoil in the magnets.
    matrix[2, :2], matrix[2, 2:4] = slope(core) / permeability, -slope(core) / recoil
    right[2] = (special_slope(core) + tangential / 2j) / recoil
    matrix[3, 2:4], matrix[3, 4:], right[3] = value(magnet), -value(magnet), -special(magnet)
    matrix[4, 2:4], matrix[4, 4:] = slope(magnet) / recoil, -slope(magnet)
    right[4] = -(special_slope(magnet) + tangential / 2j) / recoil
    matrix[5, 4:] = slope(bore)
    answer = np.linalg.solve(matrix, right)

    rotor = radii(core, magnet, bore, recoil)
    admittance = np.array([[recoil / permeability / np.tanh(-n * np.log(hole))]])
    found = source(rotor, np.array([[radial]]), np.array([[tangential]]), np.array([n]), admittance)
    words = {
        "relative": 1e-9,
        "why": "two solutions of one linear problem; room for the conditioning of r^-14",
        "source": DIRECT,
    }
    check(
        "potential of magnets on a core of finite permeability, at bore and core",
        [found.bore[0, 0], found.core[0, 0]],
        [value(bore) @ answer[4:], value(core) @ answer[:2]],
        **words,
    )

    # Without magnets, a field mu0 H_theta = 1 T at the bore: A there, and A at the core over it.
    matrix[5, 4:], right[:] = -slope(bore), 0.0
    right[5] = 1.0
    answer = np.linalg.solve(matrix, right)
    share = (value(core) @ answer[:2]) / (value(bore) @ answer[4:])
    found_share = core_share(rotor, np.array([n]), admittance)[0, 0]
    check(
        "answer of a rotor of finite permeability to currents, at bore and core",
        [response(rotor, np.array([n]), admittance)[0, 0], found_share],
        [(value(bore) @ answer[4:]).real, share.real],
        **words,
    )


def test_field_scales_with_remanence_and_not_with_size() -> None:
    # Magnetostatics without current knows no length: all radii doubled, the same flux density.
    orders = np.array([2, 6, 10])
    small = amplitudes(radii(20e-3, 24e-3, 25e-3, 1.05), orders, 2, 0.7, "parallel")
    large = amplitudes(radii(40e-3, 48e-3, 50e-3, 1.05), orders, 2, 0.7, "parallel")
    np.testing.assert_allclose(small, large, rtol=1e-12)
