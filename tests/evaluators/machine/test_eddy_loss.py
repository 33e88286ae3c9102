"""Eddy currents of magnets and sleeve against exact fields, blocks, and direct integration."""

from __future__ import annotations

import math
import time
from typing import Any

import mpmath
import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.machine.losses.eddy import (
    block_length_factor,
    block_loss,
    ring_length_factor,
    rotor_eddy_loss,
    segment_share,
)
from evaluators.machine.losses.ring import (
    ring_field_ratio,
    ring_loss,
    sheet_flux_density,
    static_field_ratio,
)

MU_0 = 4e-7 * math.pi
IRON, MAGNET, BORE, MU_R, RHO = 0.020, 0.024, 0.025, 1.05, 1.5e-6
SHEET = 1e4  # A/m

check = OutsideChecks("losses")
RING = "own solution of the diffusion equation in the ring by two routes (Poynting, volume)"
PRINTED = {"relative": 1e-6, "why": "seven printed digits"}

# Order, frequency in Hz, exact loss in W/m.
EXACT = [
    (1, 100.0, 148.4842), (1, 1e3, 2741.988), (1, 1e4, 3373.482),
    (2, 100.0, 9.556257), (2, 1e3, 741.6309), (2, 1e4, 3216.731),
    (4, 100.0, 0.5710469), (4, 1e3, 56.08825), (4, 1e4, 2035.723),
]  # fmt: skip


def ring(order: float, frequency: float, **changes: Any) -> float:
    """Loss per metre of the closed magnet ring under the bore sheet, fast form."""
    b = sheet_flux_density(
        order, SHEET, BORE, MAGNET, static_field_ratio(order, IRON, MAGNET, MU_R)
    )
    arguments: dict[str, Any] = {
        "iron_radius": IRON, "magnet_radius": MAGNET, "rotor_radius": MAGNET, "bore_radius": BORE,
        "length": math.inf, "magnet_resistivity": RHO, "recoil_permeability": MU_R,
    }  # fmt: skip
    loss = rotor_eddy_loss([order], [frequency], np.atleast_1d(b), **{**arguments, **changes})
    return float(loss.magnet[0])


@pytest.mark.parametrize(("order", "frequency", "power"), EXACT)
def test_exact_ring(order: int, frequency: float, power: float) -> None:
    q = ring_field_ratio(order, frequency, IRON, MAGNET, RHO, MU_R)
    b = sheet_flux_density(order, SHEET, BORE, MAGNET, q)
    loss = ring_loss(order, frequency, b, IRON, MAGNET, RHO, MU_R)
    check("eddy loss of a closed magnet ring, exact form", loss, power, **PRINTED, source=RING)


@pytest.mark.parametrize(("order", "frequency"), [(1, 50.0), (7, 2e4), (20, 300.0)])
def test_field_ratio_against_mpmath(order: int, frequency: float) -> None:
    with mpmath.workdps(30):
        k = mpmath.sqrt(-2j * mpmath.pi * frequency * MU_0 * MU_R / RHO)

        def j(r: float, d: int) -> Any:
            return mpmath.besselj(order, k * r, derivative=d)

        def y(r: float, d: int) -> Any:
            return mpmath.bessely(order, k * r, derivative=d)

        slope = y(IRON, 1) * j(MAGNET, 1) - j(IRON, 1) * y(MAGNET, 1)
        value = y(IRON, 1) * j(MAGNET, 0) - j(IRON, 1) * y(MAGNET, 0)
        expected = complex(MAGNET * k * slope / (MU_R * value))
    q = ring_field_ratio(order, frequency, IRON, MAGNET, RHO, MU_R)
    check(
        "field ratio at the face of a closed magnet ring",
        complex(q),
        expected,
        relative=1e-9,
        why="rounding of the library's Bessel functions",
        source="mpmath, Bessel functions with 30 digits",
    )


def test_exact_ring_refuses_what_it_cannot_compute() -> None:
    assert np.isnan(ring_field_ratio(1, 1e6, IRON, MAGNET, 1.7e-8))


@pytest.mark.parametrize(("order", "limit"), [(1, 155.4166), (2, 9.584195), (4, 0.5711514)])
def test_fast_ring_without_reaction(order: int, limit: float) -> None:
    """Resistance-limited loss at 100 Hz, from 1 mHz by the square of the frequency."""
    slow = ring(order, 1e-3) * (100.0 / 1e-3) ** 2
    check(
        "eddy loss of a closed magnet ring without reaction",
        slow,
        limit,
        **PRINTED,
        source="closed form of the static field, own evaluation",
    )


@pytest.mark.parametrize(("order", "frequency", "power"), EXACT)
def test_fast_ring_with_reaction(order: int, frequency: float, power: float) -> None:
    """The reaction is taken of the static profile: as good as magnet over skin depth is small."""
    thickness = MAGNET - IRON
    depth = math.sqrt(RHO / (math.pi * frequency * MU_0))
    excess = ring(order, frequency) / power - 1.0
    assert excess > -1e-6  # never too low, but for printed digits
    check.within(
        "excess of the fast form over the exact loss of a closed ring, against its room "
        "0.005 + 0.6 (thickness/skin depth)²",
        excess / (0.005 + 0.6 * (thickness / depth) ** 2),
        -np.inf,
        1.0,
        why="the reaction of the static profile errs in second order of thickness over skin "
        "depth, 0.65 at most here",
        source=RING,
    )


def test_segment_share_by_integration() -> None:
    """Mean square of the wave less the square of its mean over one segment, by quadrature."""
    for order, angle in [(1, 0.3), (4, 0.6), (5, 2.0), (13, 0.05)]:
        theta = (np.arange(20_000) + 0.5) / 20_000 * angle
        wave = np.exp(1j * order * theta)
        check(
            "share of the eddy loss that segments leave",
            segment_share(order, angle),
            np.mean(np.abs(wave - wave.mean()) ** 2),
            relative=1e-6,
            why="midpoint rule with 20,000 points",
            source="variance of the wave over one segment by quadrature",
        )


@pytest.mark.parametrize("order", [1, 2, 3, 8])
def test_closed_ring_has_the_whole_share(order: int) -> None:
    assert segment_share(order, 2.0 * math.pi) == pytest.approx(1.0, abs=1e-12)
    series, exact = (segment_share(order, a / order) for a in (2e-3 - 1e-12, 2e-3 + 1e-12))
    assert series == pytest.approx(exact, rel=1e-5)  # 1 - sinc² cancels ten digits there


# Timoshenko, Goodier, Theory of Elasticity; recomputed digits.
TORSION = [
    (1.0, 0.1405770), (1.2, 0.1661189), (1.5, 0.1957607), (2.0, 0.2286817), (2.5, 0.2493651),
    (3.0, 0.2633169), (4.0, 0.2808130), (5.0, 0.2913168), (10.0, 0.3123250),
]  # fmt: skip


@pytest.mark.parametrize(("ratio", "k1"), TORSION)
def test_block_follows_the_torsion_table(ratio: float, k1: float) -> None:
    source = "torsion of a rectangular bar: Timoshenko, Goodier, Theory of Elasticity; recomputed"
    check(
        "length factor of a magnet block",
        block_length_factor(ratio) / 3.0,
        k1,
        absolute=6e-8,
        why="printed digits",
        source=source,
    )
    # Turned by 90 degrees the block is the same: J = k1 a b³ with b the short side.
    turned = block_length_factor(1.0 / ratio) / 3.0
    check("length factor of a block turned round", turned, k1 / ratio**2, **PRINTED, source=source)


@pytest.mark.parametrize(("a", "b", "watt_per_m"), [
    (0.020, 0.010, 6.018660), (0.010, 0.010, 1.849920), (0.040, 0.010, 14.78140),
])  # fmt: skip
def test_block_in_a_uniform_field(a: float, b: float, watt_per_m: float) -> None:
    """1.5 uohm m, 1 kHz, 0.02 T peak."""
    check(
        "eddy loss of a magnet block in a uniform field",
        [block_loss(a, b, 0.02, 1e3, 1.5e-6), block_loss(b, a, 0.02, 1e3, 1.5e-6)],
        watt_per_m,
        **PRINTED,
        source="own evaluation of the torsion series of a rectangular bar",
    )


def test_endless_strip() -> None:
    """A 10 mm strip in the same field, W/m3."""
    strip = block_loss(0.010, 1e6, 0.02, 1e3, 1.5e-6) / (0.010 * 1e6)
    check(
        "eddy loss of an endless strip in a uniform field",
        strip,
        43864.91,
        **PRINTED,
        source="own evaluation of the closed form w² B² b² sigma/24",
    )


def test_narrow_segments_of_a_rotor_are_blocks() -> None:
    """Thin magnets, segments far below the wavelength: the loss is that of the blocks alone."""
    outer, thickness, angle, piece, b, f = 0.05, 0.2e-3, 0.02, 1.5e-3, 0.1, 500.0
    loss = rotor_eddy_loss(
        [2.0], [f], [[b]], iron_radius=[outer - thickness], magnet_radius=[outer],
        rotor_radius=[outer], bore_radius=[outer + 2e-3], length=[0.06],
        magnet_resistivity=[RHO], magnet_segment_angle=[angle], magnet_segment_length=[piece],
        magnet_coverage=[0.8],
    ).magnet[0, 0]  # fmt: skip
    blocks = 0.8 * 2.0 * math.pi / angle
    one = block_loss(angle * outer, piece, b, f, RHO) * thickness / piece
    check(
        "eddy loss of narrow, thin magnets on a rotor",
        loss,
        float(blocks * one),
        relative=0.006,
        why="thickness 0.4 % of the radius, wavelength 157 segments: half a per cent together",
        source="blocks in a uniform field, by themselves",
    )


def test_length_of_a_closed_ring_by_two_published_ways() -> None:
    """Equivalent block (torsion) against Russell, Norsworthy 1958, for a pole of usual length."""
    for order, length in [(2, 0.06), (4, 0.04), (4, 0.08)]:
        width = math.sqrt(12.0) * MAGNET / order
        block = block_length_factor(length / width)
        ring_way = ring_length_factor(order, length, MAGNET)
        check(
            "length factor of a closed ring, by an equivalent block",
            block,
            float(ring_way),
            relative=0.1,
            why="correlation against correlation, for poles of usual length",
            source="Russell, Norsworthy 1958",
        )


def test_ring_length_limits() -> None:
    assert ring_length_factor(4, 1e3, MAGNET) == pytest.approx(1.0, abs=1e-4)
    x = 1e-3 / MAGNET * 0.5 * 4
    check(
        "length factor of a short closed ring",
        ring_length_factor(4, 1e-3, MAGNET),
        x * x / 3.0,
        relative=0.01,
        why="tanh x = x - x³/3 leaves terms of x²",
        source="first term of Russell, Norsworthy 1958",
    )


def tube(frequency: float, thickness: float, conductivity: float) -> float:
    """Loss of a thin conducting sleeve in free space, 0.1 T rotating."""
    loss = rotor_eddy_loss(
        [1.0], [frequency], [[0.1]], iron_radius=[0.0], magnet_radius=[0.015 - thickness],
        rotor_radius=[0.015], bore_radius=[math.inf], length=[math.inf],
        magnet_resistivity=[math.inf], sleeve_resistivity=[1.0 / conductivity],
    )  # fmt: skip
    return float(loss.sleeve[0, 0])


@pytest.mark.parametrize("frequency", [10.0, 964.9637, 10e3])
def test_thin_tube_in_a_rotating_field(frequency: float) -> None:
    """R = 15 mm, sigma d = 17.5 kS; the torque peaks at 964.9637 Hz."""
    thickness = 5e-6  # thin enough for the formula of a sheet: 3 d/R = 0.1 %
    conductivity = 35e6 * 0.5e-3 / thickness
    omega = 2.0 * math.pi * frequency
    x = 0.5 * omega * MU_0 * conductivity * thickness * 0.015
    expected = math.pi * 0.015**3 * conductivity * thickness * (omega * 0.1) ** 2 / (1.0 + x * x)
    found = tube(frequency, thickness, conductivity)
    check(
        "eddy loss of a thin conducting sleeve",
        found,
        expected,
        relative=0.002,
        why="wall of 5 um for the formula's sheet: 3 d/R = 0.1 %",
        source="pi R³ sigma d w² B²/(1 + (w mu0 sigma d R/2)²), closed form",
    )
    if frequency == 964.9637:
        check(
            "largest torque on a thin conducting sleeve, N m/m",
            found / omega,
            5.625,
            relative=0.002,
            why="as the loss",
            source="pi R² B²/mu0, closed form",
        )


def test_sleeve_shields_the_magnets() -> None:
    arguments: dict[str, Any] = {
        "iron_radius": [0.016], "magnet_radius": [0.020], "rotor_radius": [0.022],
        "bore_radius": [0.023], "length": [0.05], "magnet_resistivity": [RHO],
        "magnet_segment_angle": [0.7],
    }  # fmt: skip
    order, frequency, b = np.array([2.0, 8.0]), np.array([2e3, 8e3]), np.full((1, 2), 0.02)
    bare = rotor_eddy_loss(order, frequency, b, **arguments)
    steel = rotor_eddy_loss(order, frequency, b, sleeve_resistivity=[1.2e-6], **arguments)
    fibre = rotor_eddy_loss(order, frequency, b, sleeve_resistivity=[3e-3], **arguments)
    assert np.all(steel.magnet < fibre.magnet)
    assert np.all(fibre.magnet < bare.magnet)
    assert np.all(bare.sleeve == 0.0)
    # The division of the driving field is linear: the losses share one reaction factor.
    ratio = steel.magnet / bare.magnet
    silver = rotor_eddy_loss(order, frequency, b, sleeve_resistivity=[1e-12], **arguments)
    assert np.all(ratio < 1.0)
    assert np.all(silver.magnet < 1e-6 * bare.magnet)


def test_losses_scale_with_the_square_of_the_field() -> None:
    assert ring(2, 1e3, magnet_segment_angle=0.4) > 0.0
    one, two = (
        rotor_eddy_loss(
            [4.0], [1e3], [[b]], iron_radius=[IRON], magnet_radius=[MAGNET], rotor_radius=[MAGNET],
            bore_radius=[BORE], length=[0.04], magnet_resistivity=[RHO],
        ).magnet
        for b in (0.1, 0.2)
    )  # fmt: skip
    assert two == pytest.approx(4.0 * one, rel=1e-12)


def test_profile_is_continuous_at_order_one_and_stable_at_high_orders() -> None:
    near = ring(1.0 + 1e-6, 100.0, magnet_segment_angle=1.0)
    assert ring(1.0, 100.0, magnet_segment_angle=1.0) == pytest.approx(near, rel=1e-5)
    assert np.isfinite(ring(180.0, 100.0))


@pytest.mark.benchmark
def test_speed_for_a_batch() -> None:
    n, h = 100, 60
    order = np.arange(1.0, h + 1.0)
    started = time.perf_counter()
    rotor_eddy_loss(
        order, np.full((n, h), 4e3), np.full((n, h), 0.01), iron_radius=np.full(n, IRON),
        magnet_radius=np.full(n, MAGNET), rotor_radius=np.full(n, MAGNET + 1e-3),
        bore_radius=np.full(n, BORE + 1e-3), length=np.full(n, 0.05),
        magnet_resistivity=np.full(n, RHO), sleeve_resistivity=np.full(n, 1e-6),
    )  # fmt: skip
    assert time.perf_counter() - started < 0.05  # 0.5 ms a design, ten times what is expected
