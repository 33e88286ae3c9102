"""The nonlinear circuit of teeth and yoke, against general solvers and finite differences."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from outside import OutsideChecks
from scipy.optimize import root

from evaluators.analytic import network
from evaluators.analytic.network import StatorCircuit
from evaluators.analytic.rotor import MU_0
from evaluators.machine.materials.magnetization import MagnetizationCurve

FloatArray = NDArray[np.float64]

SLOTS = 12
# TEAM workshop problem 13 (Nakata, Takahashi, Fujiwara): an open table with a sharp knee.
CURVE = MagnetizationCurve(
    [0.0, 16.0, 54.0, 143.0, 210.0, 247.0, 342.0, 509.0, 933.0, 1934.0, 4993.0, 9423.0],
    [0.0, 0.0025, 0.0125, 0.05, 0.2, 0.5, 1.0, 1.3, 1.5, 1.6, 1.7, 1.8],
)

check = OutsideChecks("field")


def circuit(rows: int = 1) -> StatorCircuit:
    return StatorCircuit(
        tooth_width=np.full(rows, 5e-3),
        tooth_length=np.full(rows, 18e-3),
        yoke_thickness=np.full(rows, 6e-3),
        yoke_length=np.full(rows, 20e-3),
        curve=CURVE,
    )


def gap_answer() -> FloatArray:
    """Answer of a uniform gap of 3 mm with 10 mm of tooth face, and of nothing else.

    Two slots' potential difference is the flux of the tooth between, (mmf difference) mu0 w / g:
    the inverse of a second difference, by Fourier residue g / (4 w sin^2(pi c / Q)).
    """
    residue = np.arange(1, SLOTS)
    spectrum = np.zeros((1, SLOTS))
    spectrum[0, 1:] = 10.0 / 3.0 / (4.0 * np.sin(np.pi * residue / SLOTS) ** 2)
    return network.circulant(spectrum)


def wave(amplitude: float, pole_pairs: int = 2, positions: int = 5) -> FloatArray:
    angle = 2.0 * np.pi * pole_pairs * np.arange(SLOTS) / SLOTS
    turn = np.linspace(0.0, 1.0, positions)[:, None]
    return amplitude * np.cos(angle - turn)[None]


def lost_voltage(of: StatorCircuit, potential: FloatArray) -> FloatArray:
    """mu0 times the voltage around each slot, written out slot by slot."""
    lost = np.zeros(SLOTS)
    for j in range(SLOTS):
        before = CURVE.field((potential[j] - potential[j - 1]) / of.tooth_width[0])
        after = CURVE.field((potential[(j + 1) % SLOTS] - potential[j]) / of.tooth_width[0])
        along = CURVE.field(potential[j] / of.yoke_thickness[0])
        lost[j] = of.tooth_length[0] * (before - after) + of.yoke_length[0] * along
    return MU_0 * lost


@pytest.mark.parametrize("amplitude", [2e-3, 8e-3, 12e-3])
def test_solution_against_a_general_solver(amplitude: float) -> None:
    of, answer, alone = circuit(), gap_answer(), wave(amplitude)
    state = network.solve(of, answer, alone, alone, 1)
    for k in range(alone.shape[1]):

        def equation(a: FloatArray, target: FloatArray = alone[0, k]) -> FloatArray:
            return a - target + answer[0] @ lost_voltage(of, a)

        expected = root(equation, state.potential[0, k] * 0.95, tol=1e-13)
        assert np.abs(equation(state.potential[0, k])).max() < 1e-9 * amplitude
        check(
            "potentials of the saturated circuit of teeth and yoke over the wave's amplitude",
            state.potential[0, k] / amplitude,
            expected.x / amplitude,
            absolute=1e-8,
            why="both stop at 1e-9 of the amplitude or below",
            source="scipy.optimize.root (Powell's hybrid method), slot by slot",
        )
        np.testing.assert_allclose(
            state.lost[0, k], lost_voltage(of, state.potential[0, k]), atol=1e-12
        )


def test_saturation_takes_flux_and_stays_below_the_linear_answer() -> None:
    of, answer = circuit(), gap_answer()
    share = []
    for amplitude in (5e-3, 9e-3, 12e-3):
        alone = wave(amplitude)
        state = network.solve(of, answer, alone, alone, 1)
        share.append(np.abs(state.potential).max() / amplitude)
    assert 1.0 > share[0] > share[1] > share[2] > 0.3


@pytest.mark.parametrize(("pole_pairs", "period", "sign"), [(2, 3, -1), (4, 3, 1), (1, 6, -1)])
def test_one_period_tells_all_slots(pole_pairs: int, period: int, sign: int) -> None:
    of, answer = circuit(), gap_answer()
    alone = wave(9e-3, pole_pairs)
    whole = network.solve(of, answer, alone, alone, 1)
    part = network.solve(
        of, network.fold(answer, period, sign), alone[..., :period], alone[..., :period], sign
    )
    unfolded = network.unfold(part, SLOTS, sign)
    # Both solve the same equations to 1e-10 of the potential.
    np.testing.assert_allclose(unfolded.potential, whole.potential, atol=1e-8 * 9e-3)
    np.testing.assert_allclose(unfolded.lost, whole.lost, atol=1e-6 * np.abs(whole.lost).max())
    np.testing.assert_allclose(unfolded.tooth_slope, whole.tooth_slope, rtol=1e-5)


def test_small_field_on_top_is_the_derivative() -> None:
    of, answer, alone = circuit(), gap_answer(), wave(9e-3)
    state = network.solve(of, answer, alone, alone, 1)
    rng = np.random.default_rng(4)
    direction = rng.normal(size=alone.shape)
    step = 1e-6
    up, down = (
        network.solve(of, answer, alone + side * step * direction, state.potential, 1).lost
        for side in (1.0, -1.0)
    )
    found = network.small_lost(state, answer, direction[..., None])[..., 0]
    check(
        "voltage that saturated iron takes of a small field",
        found,
        (up - down) / (2.0 * step),
        relative=1e-4,
        absolute=1e-5,
        why="the difference errs with the square of the step; rounding over the step where it is "
        "small",
        source="central difference of the full solution",
    )


def test_newton_converges_quadratically(monkeypatch: pytest.MonkeyPatch) -> None:
    """Errors after each iteration: each at most a constant times the square of the last."""
    of, answer, alone = circuit(), gap_answer(), wave(8e-3)
    exact = network.solve(of, answer, alone, alone, 1).potential
    errors = []
    for iterations in range(1, 8):
        monkeypatch.setattr(network, "ITERATIONS", iterations)
        found = network.solve(of, answer, alone, alone, 1).potential
        errors.append(float(np.abs(found - exact).max() / 8e-3))
    close = [e for e in errors if 1e-7 < e < 2e-2]
    after = [errors[errors.index(e) + 1] for e in close]
    assert close
    # The curve's slope jumps at its knots, so the constant is large; linear convergence would fail.
    assert all(new < 50.0 * old**2 + 1e-9 for old, new in zip(close, after, strict=True))


def test_flux_that_circles_in_the_yoke_costs_no_gap() -> None:
    """Three slots a period: the third harmonic of the yoke's voltage must vanish around it."""
    of, answer, alone = circuit(), gap_answer(), wave(12e-3, pole_pairs=4)
    state = network.solve(of, answer, alone, alone, 1)
    along = CURVE.field(state.potential[0] / of.yoke_thickness[0])
    # The gap's answer to circulating flux is large but finite: 1 % of the largest field is left.
    assert np.abs(along.sum(axis=1)).max() < 0.01 * np.abs(along).max()
    assert np.abs(state.potential.sum(axis=2)).max() > 1e-6  # which takes a circling flux
