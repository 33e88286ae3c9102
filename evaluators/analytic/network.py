"""Teeth and yoke as a nonlinear circuit around the slots, at every rotor position.

Seen from the gap, iron that takes magnetic voltage is a current in each slot, minus the voltage
lost on the way around it (`evaluators.analytic.gap`). With a_j the potential of slot j, tooth j
carries a_j - a_(j-1) and the yoke behind slot j carries a_j, so

    a = alone - G V(a),   V_j = U(a_j - a_(j-1)) - U(a_(j+1) - a_j) + Y(a_j),

where `alone` is the potential under perfect iron, G the answer of the gap to slot currents, and U
and Y the voltages of a tooth and of one slot pitch of yoke by the steel's curve. Newton's method
solves it for all designs and positions at once. A small current on top, the suspension's, meets the
differential reluctance that each tooth has at that position, so saturation that travels with the
rotor turns and modulates the force (magnetic circuits with one branch per tooth: Ostovic, Dynamics
of Saturated Electric Machines, 1989).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic.rotor import MU_0
from evaluators.machine.geometry import CrossSections
from evaluators.machine.magnetization import MagnetizationCurve

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

ITERATIONS = 12
TOLERANCE = 1e-10  # of the largest potential of a design; Newton passes it in one step more
CIRCULATING = 1e5
"""Answer of the gap to equal currents in all slots over the largest other: flux that circles in
the yoke does not cross the gap, so in truth it is without bound."""


@dataclass(frozen=True)
class StatorCircuit:
    """Stator iron of n designs; arrays (n,), lengths in m."""

    tooth_width: FloatArray
    tooth_length: FloatArray
    yoke_thickness: FloatArray
    yoke_length: FloatArray
    curve: MagnetizationCurve

    @classmethod
    def of(cls, sections: CrossSections, curve: MagnetizationCurve) -> StatorCircuit:
        """Circuit of the given cross-sections; the yoke's pitch is at its middle radius."""
        radius = 0.5 * (sections.slot_radius + sections.outer_radius)
        return cls(
            tooth_width=sections.tooth_width,
            tooth_length=sections.slot_radius - sections.bore_radius,
            yoke_thickness=sections.yoke_thickness,
            yoke_length=2.0 * np.pi * radius / sections.family.slots,
            curve=curve,
        )

    def voltages(
        self, tooth_flux: FloatArray, yoke_flux: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
        """mu0 times voltage, and its slope, of teeth and of yoke pitches, (n, ...) Wb/m each."""
        extra = (1,) * (tooth_flux.ndim - 1)
        width, length = self.tooth_width.reshape(-1, *extra), self.tooth_length.reshape(-1, *extra)
        thick, pitch = (
            self.yoke_thickness.reshape(-1, *extra),
            self.yoke_length.reshape(-1, *extra),
        )
        flux_density = np.stack([tooth_flux / width, yoke_flux / thick])
        field, slope = self.curve.field_and_slope(flux_density)
        return (
            MU_0 * length * field[0],
            MU_0 * length / width * slope[0],
            MU_0 * pitch * field[1],
            MU_0 * pitch / thick * slope[1],
        )


@dataclass(frozen=True)
class CircuitState:
    """Solution at every position.

    Attributes
    ----------
    potential : array (n, k, Q), Wb/m
        Of the slots.
    lost : array (n, k, Q), Wb/m
        mu0 times the voltage lost around each slot.
    tooth_slope, yoke_slope : arrays (n, k, Q)
        mu0 times differential reluctance.
    """

    potential: FloatArray
    lost: FloatArray
    tooth_slope: FloatArray
    yoke_slope: FloatArray


def circulant(spectrum: FloatArray) -> FloatArray:
    """Answer matrix G (n, Q, Q) of slot potentials to mu0 times slot currents.

    `spectrum` (n, Q) is the answer by Fourier residue, real because a slot is its own mirror.
    """
    bounded = spectrum.copy()
    bounded[:, 0] = CIRCULATING * np.abs(spectrum[:, 1:]).max(axis=1)
    first = np.real(np.fft.ifft(bounded, axis=1))
    slots = spectrum.shape[1]
    shift = (np.arange(slots)[:, None] - np.arange(slots)) % slots
    return np.asarray(first[:, shift])


def fold(matrix: FloatArray, period: int, sign: int) -> FloatArray:
    """Answer matrix for patterns that repeat after `period` slots with `sign`, (n, q, q)."""
    rows, slots, _ = matrix.shape
    weight = float(sign) ** (np.arange(slots) // period)
    weighted = matrix[:, :period, :] * weight
    return np.asarray(weighted.reshape(rows, period, -1, period).sum(axis=2))


def _jacobian(
    answer: FloatArray, tooth_slope: FloatArray, yoke_slope: FloatArray, sign: int
) -> FloatArray:
    """1 + G dV/da, (n, k, q, q); tooth j lies before slot j."""
    period = answer.shape[-1]
    before = tooth_slope
    after = np.roll(tooth_slope, -1, axis=-1)
    slot = np.arange(period)
    reluctance = np.zeros((*tooth_slope.shape, period))
    reluctance[..., slot, slot] = before + after + yoke_slope
    wrap = np.where(slot == 0, sign, 1)
    # Slot j loses voltage to slot j - 1 through tooth j and to slot j + 1 through tooth j + 1.
    reluctance[..., slot, slot - 1] -= before * wrap
    reluctance[..., slot - 1, slot] -= before * wrap
    return np.asarray(np.eye(period) + answer[:, None] @ reluctance)


def solve(
    circuit: StatorCircuit, answer: FloatArray, alone: FloatArray, start: FloatArray, sign: int
) -> CircuitState:
    """Slot potentials at every position.

    Parameters
    ----------
    answer : array (n, q, q)
        From `circulant`, folded if the pattern repeats.
    alone : array (n, k, q), Wb/m
        Potentials under perfect iron.
    start : array (n, k, q), Wb/m
        First guess.
    sign : int
        +1 or -1: the pattern repeats, or repeats reversed, after q slots.
    """
    potential = start
    turned = np.swapaxes(answer, 1, 2)

    def lost_at(a: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
        previous = np.roll(a, 1, axis=-1)
        previous[..., 0] *= sign
        tooth, tooth_slope, yoke, yoke_slope = circuit.voltages(a - previous, a)
        after = np.roll(tooth, -1, axis=-1)
        after[..., -1] *= sign
        return tooth - after + yoke, tooth_slope, yoke_slope

    scale = np.abs(alone).max(axis=(1, 2), keepdims=True)
    lost, tooth_slope, yoke_slope = lost_at(potential)
    residual = potential - alone + lost @ turned
    size = np.abs(residual).max(axis=2, keepdims=True)
    for _ in range(ITERATIONS):
        # What has converged stays as it is, so that no design depends on its batch.
        done = size <= TOLERANCE * scale
        if np.all(done):
            break
        matrix = _jacobian(answer, tooth_slope, yoke_slope, sign)
        step = np.linalg.solve(matrix, residual[..., None])[..., 0]
        length = np.ones_like(size)
        for _ in range(4):
            trial = potential - length * step
            trial_lost, trial_tooth, trial_yoke = lost_at(trial)
            trial_residual = trial - alone + trial_lost @ turned
            trial_size = np.abs(trial_residual).max(axis=2, keepdims=True)
            worse = (trial_size > size) & ~done
            if not np.any(worse):
                break
            length = np.where(worse, 0.4 * length, length)
        potential, lost = np.where(done, potential, trial), np.where(done, lost, trial_lost)
        residual = np.where(done, residual, trial_residual)
        size = np.where(done, size, trial_size)
        tooth_slope = np.where(done, tooth_slope, trial_tooth)
        yoke_slope = np.where(done, yoke_slope, trial_yoke)
    return CircuitState(potential, lost, tooth_slope, yoke_slope)


def unfold(state: CircuitState, slots: int, sign: int) -> CircuitState:
    """The state of all slots from that of one period."""
    repeats = slots // state.potential.shape[-1]
    signs = np.repeat(float(sign) ** np.arange(repeats), state.potential.shape[-1])

    def wide(values: FloatArray, turned: FloatArray) -> FloatArray:
        return np.asarray(np.tile(values, (1, 1, repeats)) * turned)

    same = np.ones(slots)
    return CircuitState(
        potential=wide(state.potential, signs),
        lost=wide(state.lost, signs),
        tooth_slope=wide(state.tooth_slope, same),
        yoke_slope=wide(state.yoke_slope, same),
    )


def small_lost(state: CircuitState, answer: FloatArray, alone: FloatArray) -> FloatArray:
    """mu0 times the voltage that small additional potentials lose, (n, k, Q, r) Wb/m.

    Parameters
    ----------
    state : CircuitState
        Of all slots.
    answer : array (n, Q, Q)
    alone : array (n, k, Q, r), Wb/m
        Small potentials under perfect iron, r of them.
    """
    matrix = _jacobian(answer, state.tooth_slope, state.yoke_slope, 1)
    small = np.linalg.solve(matrix, alone)
    through = state.tooth_slope[..., None] * (small - np.roll(small, 1, axis=2))
    return np.asarray(through - np.roll(through, -1, axis=2) + state.yoke_slope[..., None] * small)
