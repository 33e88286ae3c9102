"""The nonlinear circuit of teeth and yoke, against general solvers and finite differences."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray
from outside import OutsideChecks
from scipy.optimize import root

from evaluators.analytic import network
from evaluators.analytic.answers import Answers, circulant
from evaluators.analytic.network import Sources, StatorCircuit, YokePath
from evaluators.analytic.rotor import MU_0
from evaluators.analytic.tips import WEIGHTS, ToothTips
from evaluators.machine.materials.magnetization import MagnetizationCurve

FloatArray = NDArray[np.float64]

SLOTS = 12
PROFILE = np.array([0.8, 1.0, 1.2, 1.25])
MEAN_PROFILE = float(PROFILE @ np.array([0.375, 0.25, 0.375, 0.0]))  # as Simpson's 3/8 rule
# TEAM workshop problem 13 (Nakata, Takahashi, Fujiwara): an open table with a sharp knee.
CURVE = MagnetizationCurve(
    [0.0, 16.0, 54.0, 143.0, 210.0, 247.0, 342.0, 509.0, 933.0, 1934.0, 4993.0, 9423.0],
    [0.0, 0.0025, 0.0125, 0.05, 0.2, 0.5, 1.0, 1.3, 1.5, 1.6, 1.7, 1.8],
)

check = OutsideChecks("field")


def circuit(overhang: float = 0.0) -> StatorCircuit:
    one = np.ones(1)
    return StatorCircuit(
        tooth_width=5e-3 * one,
        tooth_length=18e-3 * one,
        yoke_thickness=6e-3 * one,
        yoke=YokePath(slot=13e-3 * one, root=7e-3 * one, spread=0.85 * one),
        tips=ToothTips(
            length=overhang * one,
            corner=0.4 * overhang * one,
            angle=0.1 * one,
            sheet=0.1 * one,
            thickness=1e-3 * np.array([[1.0, 1.4, 1.8, 2.0]]),
            steepness=0.5 * one,
        ),
        profile=PROFILE[None],
        curve=CURVE,
    )


def gap_answer(tips: bool = False) -> Answers:
    """Answer of a uniform gap of 3 mm with 10 mm of tooth face, and of nothing else.

    Two slots' potential difference is the flux of the tooth between, (mmf difference) mu0 w / g:
    the inverse of a second difference, by Fourier residue g / (4 w sin^2(pi c / Q)). The flanges'
    answers are made up, symmetric and small beside it.
    """
    residue = np.arange(1, SLOTS)
    spectrum = np.zeros((1, SLOTS))
    spectrum[0, 1:] = 10.0 / 3.0 / (4.0 * np.sin(np.pi * residue / SLOTS) ** 2)
    near = np.zeros((SLOTS, 2, SLOTS))
    for slot in range(SLOTS):
        near[slot, :, slot] = 0.5
        near[slot, 0, slot - 1], near[slot, 1, slot - 1] = 0.2, -0.2
        near[slot, 0, (slot + 1) % SLOTS], near[slot, 1, (slot + 1) % SLOTS] = -0.2, 0.2
    own = np.array([[[1.1, 0.3], [0.3, 1.1]]])
    to_tips = near.reshape(1, 2 * SLOTS, SLOTS) * float(tips)
    return Answers(circulant(spectrum), to_tips, own, np.ones((1, 4)))


def sources(slots: FloatArray, tips: float = 0.0) -> Sources:
    """The slots alone, or flanges that carry a share of the flux beside them."""
    places = np.array([0.5, 0.9, 1.2, 1.3])
    sides = np.stack([slots, -np.roll(slots, 2, axis=2)], axis=-1)
    flux = tips * sides[..., None] * places
    return Sources(slots, flux, 100.0 * tips * sides, np.zeros_like(slots))


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
        root = CURVE.field(of.yoke.spread[0] * potential[j] / of.yoke_thickness[0])
        lost[j] = of.tooth_length[0] * (before - after)
        lost[j] += of.yoke.slot[0] * along + of.yoke.root[0] * root
    return MU_0 * lost


@pytest.mark.parametrize("amplitude", [2e-3, 8e-3, 12e-3])
def test_solution_against_a_general_solver(amplitude: float) -> None:
    of, answer, alone = circuit(), gap_answer(), wave(amplitude)
    state = network.solve(of, answer, sources(alone), alone, 1)
    for k in range(alone.shape[1]):

        def equation(a: FloatArray, target: FloatArray = alone[0, k]) -> FloatArray:
            return a - target + answer.slots[0] @ lost_voltage(of, a)

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
        state = network.solve(of, answer, sources(alone), alone, 1)
        share.append(np.abs(state.potential).max() / amplitude)
    assert 1.0 > share[0] > share[1] > share[2] > 0.3


@pytest.mark.parametrize(("pole_pairs", "period", "sign"), [(2, 3, -1), (4, 3, 1), (1, 6, -1)])
def test_one_period_tells_all_slots(pole_pairs: int, period: int, sign: int) -> None:
    of, answer = circuit(), gap_answer()
    alone = wave(9e-3, pole_pairs)
    whole = network.solve(of, answer, sources(alone), alone, 1)
    part = network.solve(
        of,
        answer.fold(period, sign),
        sources(alone[..., :period]),
        alone[..., :period],
        sign,
    )
    unfolded = network.unfold(part, SLOTS, sign)
    # Both solve the same equations to 1e-10 of the potential.
    np.testing.assert_allclose(unfolded.potential, whole.potential, atol=1e-8 * 9e-3)
    np.testing.assert_allclose(unfolded.lost, whole.lost, atol=1e-6 * np.abs(whole.lost).max())
    np.testing.assert_allclose(unfolded.tooth_slope, whole.tooth_slope, rtol=1e-5)


def test_small_field_on_top_is_the_derivative() -> None:
    of, answer, alone = circuit(), gap_answer(), wave(9e-3)
    state = network.solve(of, answer, sources(alone), alone, 1)
    rng = np.random.default_rng(4)
    direction = rng.normal(size=alone.shape)
    step = 1e-6
    up, down = (
        network.solve(of, answer, sources(alone + side * step * direction), state.potential, 1).lost
        for side in (1.0, -1.0)
    )
    zero = np.zeros((*direction.shape, 1))
    found = network.small_lost(
        state, answer, direction[..., None], np.stack([zero, zero], axis=3), zero, 1
    )[0][..., 0]
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
    exact = network.solve(of, answer, sources(alone), alone, 1).potential
    errors = []
    for iterations in range(1, 8):
        monkeypatch.setattr(network, "ITERATIONS", iterations)
        found = network.solve(of, answer, sources(alone), alone, 1).potential
        errors.append(float(np.abs(found - exact).max() / 8e-3))
    close = [e for e in errors if 1e-7 < e < 2e-2]
    after = [errors[errors.index(e) + 1] for e in close]
    assert close
    # The curve's slope jumps at its knots, so the constant is large; linear convergence would fail.
    assert all(new < 50.0 * old**2 + 1e-9 for old, new in zip(close, after, strict=True))


def test_flux_that_circles_in_the_yoke_costs_no_gap() -> None:
    """Three slots a period: the third harmonic of the yoke's voltage must vanish around it."""
    of, answer, alone = circuit(), gap_answer(), wave(12e-3, pole_pairs=4)
    state = network.solve(of, answer, sources(alone), alone, 1)
    density = state.potential[0] / of.yoke_thickness[0]
    along = of.yoke.slot * CURVE.field(density)
    along = along + of.yoke.root * CURVE.field(of.yoke.spread * density)
    # The gap's answer to circulating flux is large but finite: 1 % of the largest field is left.
    assert np.abs(along.sum(axis=1)).max() < 0.01 * np.abs(along).max()
    assert np.abs(state.potential.sum(axis=2)).max() > 1e-6  # which takes a circling flux


# -- the flanges of the tooth tips ---------------------------------------------------------------


def flange_voltage(of: StatorCircuit, mean: float, flux: FloatArray, face: float) -> float:
    """mu0 times a flange's voltage: its `flux` (4,) under perfect iron, its `mean` as it is."""
    total, steep = 0.0, of.tips.steepness[0]
    now = flux + of.profile[0] * (mean - flux @ WEIGHTS)
    for place in range(4):
        along = now[place] / of.tips.thickness[0, place]
        # The lines run from the face's density to the slope of the underside, linearly between;
        # where both oppose each other their product is left out.
        inclined = (face**2 + max(steep * along * face, 0.0) + (steep * along) ** 2) / 3.0
        size = np.sqrt(along**2 + inclined)
        length = of.tips.length[0] * WEIGHTS[place] + (of.tips.corner[0] if place == 3 else 0.0)
        total += length * float(CURVE.field(size)) * along / size
    return MU_0 * total


@pytest.mark.parametrize(("share", "saturated"), [(0.1, 1e-6), (0.3, 1e-5)])
def test_flanges_against_a_general_solver(share: float, saturated: float) -> None:
    of, answer, alone = circuit(3e-3), gap_answer(tips=True), wave(8e-3, positions=2)
    given = sources(alone, share)
    state = network.solve(of, answer, given, alone, 1)
    for k in range(alone.shape[1]):
        flux, face = given.tips[0, k].reshape(-1, 4), given.faces[0, k].reshape(-1)

        def equation(
            x: FloatArray, k: int = k, flux: FloatArray = flux, face: FloatArray = face
        ) -> FloatArray:
            a, tips = x[:SLOTS], x[SLOTS:]
            lost = lost_voltage(of, a)
            flange = np.array(
                [flange_voltage(of, *each) for each in zip(tips, flux, face, strict=True)]
            )
            own = np.kron(np.eye(SLOTS), answer.own[0])
            slots = a - alone[0, k] + answer.slots[0] @ lost + answer.to_tips[0].T @ flange
            return np.concatenate(
                [slots, tips - flux @ WEIGHTS + answer.to_tips[0] @ lost + own @ flange]
            )

        start = np.concatenate([state.potential[0, k], 0.9 * (flux @ WEIGHTS)])
        expected = root(equation, start, tol=1e-12).x
        assert np.abs(equation(expected)).max() < 1e-11
        check(
            "potentials of the circuit with saturated tooth tips over the wave's amplitude",
            state.potential[0, k] / 8e-3,
            expected[:SLOTS] / 8e-3,
            absolute=1e-7,
            why="both stop at 1e-9 of the amplitude or below",
            source="scipy.optimize.root (Powell's hybrid method), flange by flange",
        )
        voltage = np.array(
            [flange_voltage(of, *each) for each in zip(expected[SLOTS:], flux, face, strict=True)]
        )
        assert np.abs(voltage).max() > saturated
        np.testing.assert_allclose(
            state.tips_lost[0, k].ravel(), voltage, atol=1e-6 * np.abs(voltage).max()
        )


def test_small_field_on_saturated_flanges_is_the_derivative() -> None:
    of, answer, alone = circuit(3e-3), gap_answer(tips=True), wave(8e-3, positions=2)
    given = sources(alone, 0.3)
    state = network.solve(of, answer, given, alone, 1)
    rng = np.random.default_rng(5)
    slots, tips = rng.normal(size=alone.shape), rng.normal(size=given.tips.shape[:-1])
    step = 1e-7
    up, down = (
        network.solve(
            of,
            answer,
            replace(
                given,
                slots=given.slots + side * step * slots,
                # The same shift, by the profile, that the flanges' own voltage makes.
                tips=given.tips + side * step * tips[..., None] * of.profile[0] / MEAN_PROFILE,
            ),
            state.potential,
            1,
        )
        for side in (1.0, -1.0)
    )
    found, found_tips = network.small_lost(
        state, answer, slots[..., None], tips[..., None], np.zeros_like(slots)[..., None], 1
    )
    for each, high, low in (
        (found, up.lost, down.lost),
        (found_tips, up.tips_lost, down.tips_lost),
    ):
        exact = (high - low) / (2.0 * step)
        check(
            "voltage that saturated tooth tips take of a small field",
            each[..., 0] / np.abs(exact).max(),
            exact / np.abs(exact).max(),
            absolute=1e-4,
            why="the difference errs with the square of the step, and by rounding over the step",
            source="central difference of the full solution",
        )
