"""Copper: resistance, skin effect and slot-bar formulas against tables and mpmath."""

from __future__ import annotations

import math

import mpmath
import numpy as np
import pytest

from evaluators.machine.losses.copper import (
    rotating_field_loss,
    round_wire_factor,
    round_wire_internal_inductance_factor,
    skin_depth,
    slot_bar_factor,
    slot_bar_factors,
    slot_loss,
    strand_factor,
    temperature_from_resistance,
    transverse_field_loss,
    winding_resistance,
)

RHO = 1.0 / 58e6
MU_0 = 4e-7 * math.pi

# Rosa, Grover, NBS Scientific Paper 169; Terman, *Radio Engineers' Handbook*, 1943; recomputed:
# x = a sqrt(w mu0 sigma), R/R0, Li/Li0.
WIRE = [
    (0.5, 1.000325, 0.9998373), (1.0, 1.005187, 0.9974075), (1.5, 1.025824, 0.9871108),
    (2.0, 1.078159, 0.9611351), (2.5, 1.175379, 0.9134656), (3.0, 1.318095, 0.8451665),
    (4.0, 1.677869, 0.6863228), (5.0, 2.042725, 0.5559681), (6.0, 2.393590, 0.4652055),
    (8.0, 3.094446, 0.3510720), (10.0, 3.798576, 0.2816193), (15.0, 5.562079, 0.1882161),
    (20.0, 7.327672, 0.1412790),
]  # fmt: skip


def wire_of(x: float, frequency: float = 1e3) -> float:
    """Diameter whose argument is x."""
    return 2.0 * x / math.sqrt(2.0) * float(skin_depth(frequency, RHO))


def test_skin_depth_of_copper() -> None:
    """Common practice: about 9.3 mm at 50 Hz and 20 °C; sqrt(2/(w mu sigma)) exactly."""
    assert skin_depth(50.0, RHO) == pytest.approx(math.sqrt(2 * RHO / (100 * math.pi * MU_0)))
    assert skin_depth(50.0, RHO) == pytest.approx(9.3e-3, rel=0.01)
    assert skin_depth(0.0, RHO) == math.inf


@pytest.mark.parametrize(("x", "resistance", "inductance"), WIRE)
def test_round_wire_by_itself(x: float, resistance: float, inductance: float) -> None:
    diameter = wire_of(x)
    assert round_wire_factor(diameter, 1e3, RHO) == pytest.approx(resistance, abs=6e-7)
    found = round_wire_internal_inductance_factor(diameter, 1e3, RHO)
    assert found == pytest.approx(inductance, abs=6e-8)  # printed digits


def test_round_wire_of_the_cable_standard() -> None:
    """Neher, McGrath 1957, table III: 10.05 % at x = 2.14, two printed decimals."""
    assert round_wire_factor(wire_of(2.14), 1e3, RHO) - 1.0 == pytest.approx(0.1005, abs=6e-5)


@pytest.mark.parametrize("x", [1e-4, 1e-3, 0.3, 30.0, 300.0])
def test_round_wire_against_mpmath(x: float) -> None:
    with mpmath.workdps(30):
        k = mpmath.mpf(x) * mpmath.exp(-1j * mpmath.pi / 4)
        ratio = k / 2 * mpmath.besselj(0, k) / mpmath.besselj(1, k)
        expected = float(ratio.real)
    # Rounding of the library's Bessel functions.
    assert round_wire_factor(wire_of(x), 1e3, RHO) == pytest.approx(expected, rel=1e-10)


def test_direct_current_is_the_limit() -> None:
    assert round_wire_factor(1e-3, 0.0, RHO) == 1.0
    assert round_wire_internal_inductance_factor(1e-3, 0.0, RHO) == 1.0
    assert transverse_field_loss(1e-3, 0.1, 0.0, RHO) == 0.0
    assert slot_bar_factor(0.0, 7) == 1.0


def test_wire_in_a_slow_transverse_field() -> None:
    """pi sigma w² B² d⁴/128: 0.1404972 W/m for 1 mm, 58 MS/m, 1 kHz, 0.05 T."""
    slow = transverse_field_loss(1e-3, 0.05, 1.0, RHO) * 1e6
    assert slow == pytest.approx(0.1404972, rel=1e-6)
    # At 1 kHz itself the wire is 0.48 skin depths thick and shields itself a little.
    assert 0.999 < transverse_field_loss(1e-3, 0.05, 1e3, RHO) / 0.1404972 < 1.0


@pytest.mark.parametrize(("frequency", "power"), [
    (10.0, 17.87628), (50.0, 391.2065), (200.0, 2251.503), (1000.0, 5861.523),
    (5000.0, 13986.55),
])  # fmt: skip
def test_cylinder_in_a_rotating_field(frequency: float, power: float) -> None:
    """a = 10 mm, 58 MS/m, 0.1 T. Landau, Lifshitz, section 59, problem 2 (from memory)."""
    assert rotating_field_loss(0.02, frequency, RHO) * 0.01 == pytest.approx(power, rel=1e-6)


def test_peak_torque_of_the_cylinder() -> None:
    """At a/delta = 1.778373 (138.1204 Hz): T/L = 1.887259 N m/m at 0.1 T."""
    f = np.linspace(130.0, 146.0, 1601)
    torque = rotating_field_loss(0.02, f, RHO) * 0.01 / (2.0 * math.pi * f)
    assert torque.max() == pytest.approx(1.887259, rel=1e-6)
    assert f[np.argmax(torque)] == pytest.approx(138.1204, abs=0.02)  # two steps of the scan


@pytest.mark.parametrize(("frequency", "power"), [
    (1e3, 168.6781), (5e3, 3051.868), (20e3, 10813.71),
])  # fmt: skip
def test_magnet_like_cylinder(frequency: float, power: float) -> None:
    """a = 12 mm, 1.5 uohm m, 0.02 T."""
    assert rotating_field_loss(0.024, frequency, 1.5e-6) * 4e-4 == pytest.approx(power, rel=1e-6)


@pytest.mark.parametrize(("xi", "phi", "psi", "two", "four"), [
    (0.5, 1.005542, 0.0207808, 1.026323, 1.109446),
    (1.0, 1.085636, 0.3203734, 1.406009, 2.687503),
    (1.5, 1.378094, 1.401217, 2.779311, 8.384177),
    (2.0, 1.897806, 3.248683, 5.146489, 18.14122),
    (3.0, 3.010136, 6.528166, 9.538301, 35.65096),
])  # fmt: skip
def test_bar_in_a_slot(xi: float, phi: float, psi: float, two: float, four: float) -> None:
    """Field 1905; Emde 1908; Dowell, *Proc. IEE* 113(8), 1966."""
    found = slot_bar_factors(xi)
    assert found[0] == pytest.approx(phi, abs=6e-7)  # printed digits, here and below
    assert found[1] == pytest.approx(psi, abs=6e-8 if psi < 1.0 else 6e-7)
    assert slot_bar_factor(xi, 2) == pytest.approx(two, abs=6e-7)
    assert slot_bar_factor(xi, 4) == pytest.approx(four, abs=6e-7 if four < 10.0 else 6e-6)


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
    # 55 layers leave 1/55² = 0.03 % to the field of the layers themselves, skin effect less.
    assert extra == pytest.approx(float(cross / direct) * math.pi / 3.0, rel=0.002)


def test_resistance_and_loss_of_a_coil() -> None:
    """50 turns of 1 mm wire, 0.2 m a turn: 10 m of wire, 0.21951 ohm at 58 MS/m."""
    area = 50 * math.pi / 4 * 1e-6
    resistance = winding_resistance(50, 0.2, area, RHO)
    assert resistance == pytest.approx(10.0 * RHO / (math.pi / 4 * 1e-6), rel=1e-12)
    # The loss does not know the number of turns.
    assert slot_loss(50 * 3.0, 0.2, area, RHO) == pytest.approx(9.0 * float(resistance))


def test_temperature_from_resistance() -> None:
    """IEC 60034-1 (from memory): 0.500 to 0.640 ohm from 22 °C is 93.96 °C, by arithmetic."""
    assert temperature_from_resistance(0.640, 0.500, 22.0) == pytest.approx(93.96, abs=1e-9)
