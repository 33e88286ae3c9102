"""Iron loss against the closed forms of its three terms."""

from __future__ import annotations

import math

import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.machine.losses.iron import (
    IronLossCoefficients,
    classical_coefficient,
    excess_constant,
    fit_iron_loss,
    iron_loss_from_waveform,
    iron_loss_sine,
)

check = OutsideChecks("losses")
POLYGON = "the polygon through 4096 samples is short by (pi/4096)²/3 = 2e-7"

LAW = IronLossCoefficients(hysteresis=0.0150, exponent=1.9, classical=4.0e-5, excess=6e-4)
# Own evaluation of the three-term law, W/kg at 0.5, 1.0 and 1.5 T.
LAW_TABLE = {
    50.0: (0.300958, 1.06213, 2.23516),
    100.0: (0.714047, 2.5, 5.24316),
    400.0: (4.90472, 17.2, 36.1817),
    1000.0: (20.7274, 73.9737, 157.266),
}
SAMPLES = 4096
PHASE = 2.0 * math.pi * np.arange(SAMPLES) / SAMPLES
SINE = np.sin(PHASE)
TRIANGLE = 2.0 / math.pi * np.arcsin(SINE)


def test_three_terms() -> None:
    for frequency, row in LAW_TABLE.items():
        check(
            "three-term loss of a sheet under sine",
            iron_loss_sine(LAW, [0.5, 1.0, 1.5], frequency).total,
            row,
            relative=5e-6,
            why="six printed digits",
            source="own evaluation of Bertotti's law, IEEE Trans. Magn. 24(1), 1988",
        )


def test_fit_recovers_its_coefficients() -> None:
    f, b = (a.ravel() for a in np.meshgrid([50.0, 100.0, 400.0, 1000.0], [0.5, 1.0, 1.5]))
    fit = fit_iron_loss(f, b, iron_loss_sine(LAW, b, f).total)
    found = (fit.hysteresis, fit.exponent, fit.classical, fit.excess)
    expected = (LAW.hysteresis, LAW.exponent, LAW.classical, LAW.excess)
    np.testing.assert_allclose(found, expected, rtol=1e-6)  # exact data, least squares at rounding
    assert fit.exponent_slope < 1e-6


def test_fit_with_given_classical_part_recovers_the_growing_exponent() -> None:
    law = IronLossCoefficients(0.014, 1.4, 5e-5, 5e-4, exponent_slope=0.6)
    f, b = (a.ravel() for a in np.meshgrid([50.0, 400.0, 2000.0], np.linspace(0.2, 1.7, 9)))
    fit = fit_iron_loss(f, b, iron_loss_sine(law, b, f).total, classical=5e-5)
    found = (fit.hysteresis, fit.exponent, fit.exponent_slope, fit.excess)
    np.testing.assert_allclose(found, (0.014, 1.4, 0.6, 5e-4), rtol=1e-6)


@pytest.mark.parametrize(("thickness", "frequency", "peak", "watt_per_m3"), [
    (0.35e-3, 50.0, 1.5, 2176.248),
    (0.35e-3, 1000.0, 0.5, 96722.12),
    (0.20e-3, 1000.0, 1.0, 126330.9),
])  # fmt: skip
def test_classical_lamination_loss(
    thickness: float, frequency: float, peak: float, watt_per_m3: float
) -> None:
    """sigma = 1.92 MS/m."""
    k = classical_coefficient(thickness, 1.0 / 1.92e6, 7600.0)
    check(
        "classical loss of a sheet",
        k * (frequency * peak) ** 2 * 7600.0,
        watt_per_m3,
        relative=1e-6,
        why="printed digits",
        source="own evaluation of pi² f² B² d² sigma/6: Bozorth, Ferromagnetism, 1951 (from "
        "memory)",
    )


def test_excess_constant() -> None:
    check(
        "constant of the excess loss",
        excess_constant(),
        8.76,
        absolute=5e-3,
        why="printed digits",
        source="Bertotti, IEEE Trans. Magn. 24(1), 1988",
    )
    assert excess_constant() == pytest.approx(8.763365, abs=5e-7)


def test_waveform_of_a_sine_is_the_law() -> None:
    part = iron_loss_from_waveform(LAW, 1.2 * SINE, 400.0)
    law = iron_loss_sine(LAW, 1.2, 400.0)
    # The polygon through 4096 samples is short by (pi/4096)²/3 = 2e-7.
    np.testing.assert_allclose(part, law, rtol=1e-6)


def test_smooth_derivative_of_a_sine() -> None:
    """sin(h/2) (26 - 2 cos h)/24 over h/2 for steps of h: short by 3/640 h⁴."""
    few, step = 1.2 * SINE[::256], 2.0 * math.pi / 16.0
    smooth, polygon = (
        iron_loss_from_waveform(LAW, few, 400.0, smooth=way) for way in (True, False)
    )
    law = iron_loss_sine(LAW, 1.2, 400.0)
    exact = math.sin(0.5 * step) * (26.0 - 2.0 * math.cos(step)) / 24.0 / (0.5 * step)
    assert smooth.classical / law.classical == pytest.approx(exact**2, rel=1e-12)
    # The next term of the series is a thirtieth of the first.
    assert 1.0 - exact**2 == pytest.approx(3.0 / 320.0 * step**4, rel=0.05)
    assert 1.0 - polygon.classical / law.classical > 0.01
    assert smooth.hysteresis == polygon.hysteresis


def test_triangle_over_sine() -> None:
    part = iron_loss_from_waveform(LAW, TRIANGLE, 50.0)
    law = iron_loss_sine(LAW, 1.0, 50.0)
    check(
        "classical and excess loss of a triangle over those of a sine",
        [part.classical / law.classical, part.excess / law.excess],
        [8.0 / math.pi**2, 8.0 / 8.763365],
        relative=1e-6,
        why="exact for a polygon; seven digits of the constant",
        source="means of (dB/dt)² and |dB/dt|^1.5 by hand",
    )
    assert part.classical / law.classical == pytest.approx(8.0 / math.pi**2, rel=1e-9)
    assert part.hysteresis == pytest.approx(law.hysteresis, rel=1e-12)  # same peak


def test_rotating_field_has_twice_the_classical_loss() -> None:
    part = iron_loss_from_waveform(LAW, SINE, 50.0, np.cos(PHASE))
    law = iron_loss_sine(LAW, 1.0, 50.0)
    check(
        "classical and excess loss of a rotating field over those of an alternating one",
        [part.classical / law.classical, part.excess / law.excess],
        [2.0, (2 * math.pi) ** 1.5 / 8.763365],
        relative=1e-6,
        why=POLYGON,
        source="constant |dB/dt|, by hand",
    )
    assert part.hysteresis == pytest.approx(2.0 * law.hysteresis, rel=1e-6)


def test_harmonics_and_waveform_agree_on_the_classical_part() -> None:
    """Parseval: the classical loss of a waveform is the sum over its harmonics."""
    amplitude = np.array([[1.0, 0.3, 0.1], [0.5, 0.0, 0.2]])
    order = np.array([1.0, 3.0, 7.0])
    wave = np.einsum("nh,ht->nt", amplitude, np.sin(np.outer(order, PHASE)))
    f = np.array([50.0, 400.0])
    by_wave = iron_loss_from_waveform(LAW, wave, f)
    by_harmonic = iron_loss_sine(LAW, amplitude, f[:, None] * order)
    check(
        "classical loss of a waveform by its harmonics",
        by_wave.classical,
        by_harmonic.classical.sum(axis=1),
        relative=2e-5,
        why="the polygon is short by (7 pi/4096)²/3 = 1e-5 at most",
        source="Parseval's theorem",
    )


def test_minor_loops_add_hysteresis_only_where_b_turns_back() -> None:
    third = np.sin(PHASE) + 0.2 * np.sin(3 * PHASE)
    path = np.abs(np.diff(np.append(third, third[0]))).sum()
    plain = iron_loss_from_waveform(LAW, third, 50.0)
    looped = iron_loss_from_waveform(LAW, third, 50.0, minor_loops=True)
    swing = third.max() - third.min()
    expected = path / (2.0 * swing)
    assert looped.hysteresis / plain.hysteresis == pytest.approx(expected, rel=1e-9)
    assert expected > 1.02  # the third harmonic makes dents at the crests
    sine = iron_loss_from_waveform(LAW, SINE, 50.0, minor_loops=True)
    assert sine.hysteresis == pytest.approx(iron_loss_sine(LAW, 1.0, 50.0).hysteresis, rel=1e-6)


def test_no_field_no_loss() -> None:
    assert iron_loss_sine(LAW, 0.0, 50.0).total == 0.0
    assert (
        iron_loss_from_waveform(LAW, np.zeros((3, 24)), 50.0, minor_loops=True).total.sum() == 0.0
    )


@pytest.mark.parametrize("change", [{"hysteresis": -1.0}, {"exponent": 7.0}, {"excess": math.nan}])
def test_bad_coefficients_are_refused(change: dict[str, float]) -> None:
    good = {"hysteresis": 0.01, "exponent": 2.0, "classical": 1e-5, "excess": 1e-4}
    with pytest.raises(ValueError, match=next(iter(change))):
        IronLossCoefficients(**{**good, **change})


def test_bad_loss_tables_are_refused() -> None:
    with pytest.raises(ValueError, match="at least 6 points"):
        fit_iron_loss([50.0], [1.0], [1.0])
    with pytest.raises(ValueError, match="positive"):
        fit_iron_loss([50.0] * 6, [1.0] * 6, [0.0] * 6)
