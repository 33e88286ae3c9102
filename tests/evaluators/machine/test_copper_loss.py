"""Copper: resistance, cylinders in fields and slot-bar formulas against tables."""

from __future__ import annotations

import math

import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.machine.losses.copper import (
    rotating_field_loss,
    skin_depth,
    slot_bar_factor,
    slot_bar_factors,
    slot_loss,
    strand_factor,
    transverse_field_loss,
    winding_resistance,
)

RHO = 1.0 / 58e6
MU_0 = 4e-7 * math.pi

check = OutsideChecks("losses")
PRINTED = {"why": "printed digits"}
CYLINDER = "own evaluation of Landau, Lifshitz, section 59, problem 2 (from memory)"


def wire_of(x: float, frequency: float = 1e3) -> float:
    """Diameter whose argument is x."""
    return 2.0 * x / math.sqrt(2.0) * float(skin_depth(frequency, RHO))


def test_skin_depth_of_copper() -> None:
    check(
        "skin depth of copper at 50 Hz and 20 °C",
        skin_depth(50.0, RHO),
        9.3e-3,
        relative=0.01,
        why="two printed digits",
        source="common practice: about 9.3 mm",
    )
    assert skin_depth(50.0, RHO) == pytest.approx(math.sqrt(2 * RHO / (100 * math.pi * MU_0)))
    assert skin_depth(0.0, RHO) == math.inf


def test_direct_current_is_the_limit() -> None:
    assert transverse_field_loss(1e-3, 0.1, 0.0, RHO) == 0.0
    assert slot_bar_factor(0.0, 7) == 1.0


def test_wire_in_a_slow_transverse_field() -> None:
    """0.1404972 W/m for 1 mm, 58 MS/m, 1 kHz, 0.05 T."""
    check(
        "loss of a thin wire in a slow transverse field",
        transverse_field_loss(1e-3, 0.05, 1.0, RHO) * 1e6,
        0.1404972,
        relative=1e-6,
        **PRINTED,
        source="own evaluation of the closed form pi sigma w² B² d⁴/128",
    )
    # At 1 kHz itself the wire is 0.48 skin depths thick and shields itself a little.
    assert 0.999 < transverse_field_loss(1e-3, 0.05, 1e3, RHO) / 0.1404972 < 1.0


@pytest.mark.parametrize(("frequency", "power"), [
    (10.0, 17.87628), (50.0, 391.2065), (200.0, 2251.503), (1000.0, 5861.523),
    (5000.0, 13986.55),
])  # fmt: skip
def test_cylinder_in_a_rotating_field(frequency: float, power: float) -> None:
    """a = 10 mm, 58 MS/m, 0.1 T."""
    found = rotating_field_loss(0.02, frequency, RHO) * 0.01
    check(
        "loss of a copper cylinder in a rotating field",
        found,
        power,
        relative=1e-6,
        **PRINTED,
        source=CYLINDER,
    )


def test_peak_torque_of_the_cylinder() -> None:
    """At a/delta = 1.778373 (138.1204 Hz): T/L = 1.887259 N m/m at 0.1 T."""
    f = np.linspace(130.0, 146.0, 1601)
    torque = rotating_field_loss(0.02, f, RHO) * 0.01 / (2.0 * math.pi * f)
    check(
        "largest torque on a copper cylinder in a rotating field",
        torque.max(),
        1.887259,
        relative=1e-6,
        **PRINTED,
        source=CYLINDER,
    )
    check(
        "frequency of that torque",
        f[np.argmax(torque)],
        138.1204,
        absolute=0.02,
        unit="Hz",
        why="two steps of the scan",
        source=CYLINDER,
    )


@pytest.mark.parametrize(("frequency", "power"), [
    (1e3, 168.6781), (5e3, 3051.868), (20e3, 10813.71),
])  # fmt: skip
def test_magnet_like_cylinder(frequency: float, power: float) -> None:
    """a = 12 mm, 1.5 uohm m, 0.02 T."""
    found = rotating_field_loss(0.024, frequency, 1.5e-6) * 4e-4
    check(
        "loss of a cylinder as resistive as a magnet in a rotating field",
        found,
        power,
        relative=1e-6,
        **PRINTED,
        source=CYLINDER,
    )


@pytest.mark.parametrize(("xi", "phi", "psi", "two", "four"), [
    (0.5, 1.005542, 0.0207808, 1.026323, 1.109446),
    (1.0, 1.085636, 0.3203734, 1.406009, 2.687503),
    (1.5, 1.378094, 1.401217, 2.779311, 8.384177),
    (2.0, 1.897806, 3.248683, 5.146489, 18.14122),
    (3.0, 3.010136, 6.528166, 9.538301, 35.65096),
])  # fmt: skip
def test_bar_in_a_slot(xi: float, phi: float, psi: float, two: float, four: float) -> None:
    factors = slot_bar_factors(xi)
    for what, found, expected in (
        ("skin factor of a bar in a slot", factors[0], phi),
        ("proximity factor of a bar in a slot", factors[1], psi),
        ("resistance of two bars in a slot", slot_bar_factor(xi, 2), two),
        ("resistance of four bars in a slot", slot_bar_factor(xi, 4), four),
    ):
        digits = 6e-8 if expected < 1.0 else 6e-7 if expected < 10.0 else 6e-6
        source = "Field 1905; Emde 1908; Dowell, Proc. IEE 113(8), 1966; recomputed"
        check(what, found, expected, absolute=digits, **PRINTED, source=source)


def test_slot_bar_series_joins_smoothly_and_large_bars_do_not_overflow() -> None:
    below, above = (np.array(slot_bar_factors(x)) for x in (0.02 - 1e-9, 0.02 + 1e-9))
    np.testing.assert_allclose(below, above, atol=1e-8)  # cosh - cos cancels 1e-16 / xi²
    phi, psi = slot_bar_factors(1e4)
    assert phi == pytest.approx(1e4, rel=1e-9)  # a bar carries current in one skin depth
    assert psi == pytest.approx(2e4, rel=1e-9)


def test_strands_lose_what_their_slot_field_induces() -> None:
    """Thin strands: extra loss equals the loss of single wires in the slot's cross field.

    B rises linearly over the depth, so its mean square is a third of (mu0 N I / b)². Dowell puts
    a square of equal area in place of the round wire, which loses pi/3 of its d⁴ law.
    """
    diameter, strands, width, depth, frequency = 0.3e-3, 900.0, 6e-3, 20e-3, 1e3
    extra = strand_factor(diameter, strands, width, depth, frequency, RHO) - 1.0
    current = 1.0
    peak = MU_0 * strands * current / width
    mean_square = peak**2 / 3.0
    cross = transverse_field_loss(diameter, 1.0, frequency, RHO) * mean_square * strands
    direct = strands * 0.5 * current**2 * RHO / (math.pi / 4 * diameter**2)
    check(
        "extra loss of thin strands in a slot",
        extra,
        float(cross / direct) * math.pi / 3.0,
        relative=0.002,
        why="55 layers leave 1/55² = 0.03 % to the layers' own field, skin effect less",
        source="single wires in the linear cross field of the slot; square for round by Dowell",
    )


def test_resistance_and_loss_of_a_coil() -> None:
    """50 turns of 1 mm wire, 0.2 m a turn: 10 m of wire, 0.21951 ohm at 58 MS/m."""
    area = 50 * math.pi / 4 * 1e-6
    resistance = winding_resistance(50, 0.2, area, RHO)
    assert resistance == pytest.approx(10.0 * RHO / (math.pi / 4 * 1e-6), rel=1e-12)
    # The loss does not know the number of turns.
    assert slot_loss(50 * 3.0, 0.2, area, RHO) == pytest.approx(9.0 * float(resistance))
