"""Field orders that mix in magnets which conduct by themselves."""

from __future__ import annotations

import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.analytic.mixing import mixed_to_separate
from evaluators.machine.losses.eddy import segment_share

check = OutsideChecks("losses")
ORDERS = np.array([4, -4, 12, -20, 5, 8])
FREQUENCIES = np.array([3, 3, 3, 3, 3, 7])
PAIRS = 4


@pytest.mark.parametrize(("segments", "arc_ratio"), [(1, 1.0), (1, 0.7), (3, 0.85)])
def test_against_the_currents_of_every_segment(segments: int, arc_ratio: float) -> None:
    """Mean square of the currents of all magnets, integrated over each segment.

    The order 5 lies no multiple of 2 p from the others, and the order 8 has its own frequency.
    """
    random = np.random.default_rng(5)
    wave = random.normal(size=ORDERS.size) + 1j * random.normal(size=ORDERS.size)
    angle = arc_ratio * np.pi / PAIRS / segments
    # Gauss-Legendre points of a segment: 40 integrate order 20 over an eighth of a turn exactly.
    nodes, weights = np.polynomial.legendre.leggauss(40)
    power = 0.0
    for pole in range(2 * PAIRS):
        for segment in range(segments):
            place = segment - 0.5 * (segments - 1)
            phi = np.pi * pole / PAIRS + angle * (place + 0.5 * nodes)
            for frequency in (3, 7):
                own = frequency == FREQUENCIES
                drive = wave[own] @ np.exp(1j * ORDERS[own, None] * phi)
                current = drive - 0.5 * (weights @ drive)
                power += 0.5 * (weights @ np.abs(current) ** 2)
    power = power / (2 * PAIRS * segments)
    alone = np.abs(wave) ** 2 * segment_share(ORDERS, angle)
    found = mixed_to_separate(
        alone[None, :],
        (wave / np.abs(wave))[None, :],
        ORDERS,
        FREQUENCIES,
        PAIRS,
        segments,
        np.array([angle]),
    )
    check(
        "currents of orders that mix in magnet segments",
        found[0] * alone.sum(),
        power,
        relative=1e-9,
        why="both are exact but for rounding",
        source="integral of the currents over every segment by Gauss-Legendre quadrature",
    )
    assert abs(found[0] - 1.0) > 0.01  # mixing matters here
