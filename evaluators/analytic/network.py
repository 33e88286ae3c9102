"""Teeth and yoke as a nonlinear circuit around the slots, at every rotor position.

Seen from the gap, iron that takes magnetic voltage is a current in each slot, minus the voltage
lost on the way around it (`evaluators.analytic.gap`). With a_j the potential at the bottom of slot
j, the yoke behind it carries a_j and tooth j carries a_j - a_(j-1), less the part d_j of the slots'
own leakage that enters it only towards its root, so

    a = alone - G V(a),   V_j = U(a_j - a_(j-1) - d_j) - U(a_(j+1) - a_j - d_(j+1)) + Y(a_j),

where `alone` is the potential under perfect iron, G the answer of the gap to slot currents, and U
and Y the voltages of a tooth and of one slot pitch of yoke by the steel's curve. Newton's method
solves it for all designs and positions at once. A small current on top, the suspension's, meets the
differential reluctance that each tooth has at that position, so saturation that travels with the
rotor turns and modulates the force (magnetic circuits with one branch per tooth: Ostovic, Dynamics
of Saturated Electric Machines, 1989).
"""

from __future__ import annotations

from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic.rotor import MU_0
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.materials.magnetization import MagnetizationCurve

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

ITERATIONS = 30
SHORTENED = 4
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

    def rows(self, selection: NDArray[np.int64]) -> StatorCircuit:
        """The circuits of the selected designs, repeated if named twice."""
        return StatorCircuit(
            self.tooth_width[selection],
            self.tooth_length[selection],
            self.yoke_thickness[selection],
            self.yoke_length[selection],
            self.curve,
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
        At the bottom of the slots.
    tooth_flux : array (n, k, Q), Wb/m
        Mean over the length of the tooth before each slot.
    lost, lost_in_teeth : array (n, k, Q), Wb/m
        mu0 times the voltage lost around each slot, and the part of it in the two teeth.
    tooth_slope, yoke_slope : arrays (n, k, Q)
        mu0 times differential reluctance.
    """

    potential: FloatArray
    tooth_flux: FloatArray
    lost: FloatArray
    lost_in_teeth: FloatArray
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


def _reluctance(tooth_slope: FloatArray, yoke_slope: FloatArray, sign: int) -> FloatArray:
    """dV/da, (..., q, q); tooth j lies before slot j."""
    period = tooth_slope.shape[-1]
    slot = np.arange(period)
    matrix = np.zeros((*tooth_slope.shape, period))
    matrix[..., slot, slot] = tooth_slope + np.roll(tooth_slope, -1, axis=-1) + yoke_slope
    # Slot j loses voltage to slot j - 1 through tooth j and to slot j + 1 through tooth j + 1.
    beside = tooth_slope * np.where(slot == 0, sign, 1)
    matrix[..., slot, slot - 1] -= beside
    matrix[..., slot - 1, slot] -= beside
    return matrix


@dataclass(frozen=True)
class _Points:
    """Every design at every position as one row, (m, q): what Newton's method works on."""

    circuit: StatorCircuit
    answer: FloatArray
    alone: FloatArray
    late: FloatArray
    sign: int

    def rows(self, selection: NDArray[np.int64]) -> _Points:
        return _Points(
            self.circuit.rows(selection),
            self.answer[selection],
            self.alone[selection],
            self.late[selection],
            self.sign,
        )

    def state(self, potential: FloatArray) -> CircuitState:
        before = np.roll(potential, 1, axis=-1)
        before[..., 0] *= self.sign
        tooth_flux = potential - before - self.late
        tooth, tooth_slope, yoke, yoke_slope = self.circuit.voltages(tooth_flux, potential)
        after = np.roll(tooth, -1, axis=-1)
        after[..., -1] *= self.sign
        in_teeth = tooth - after
        lost = in_teeth + yoke
        return CircuitState(potential, tooth_flux, lost, in_teeth, tooth_slope, yoke_slope)

    def residual(self, state: CircuitState) -> FloatArray:
        driven = (self.answer @ state.lost[..., None])[..., 0]
        return np.asarray(state.potential - self.alone + driven)

    def step(self, state: CircuitState) -> FloatArray:
        """One damped step: shortened, by row, until the residual falls or four times."""
        residual = self.residual(state)
        size = np.abs(residual).max(axis=1)
        slope = _reluctance(state.tooth_slope, state.yoke_slope, self.sign)
        matrix = np.eye(slope.shape[-1]) + self.answer @ slope
        whole = np.linalg.solve(matrix, residual[..., None])[..., 0]
        length = np.ones_like(size)
        for _ in range(SHORTENED):
            trial = state.potential - length[:, None] * whole
            worse = np.abs(self.residual(self.state(trial))).max(axis=1) > size
            if not np.any(worse):
                break
            length = np.where(worse, 0.4 * length, length)
        return np.asarray(trial)


def solve(
    circuit: StatorCircuit,
    answer: FloatArray,
    alone: FloatArray,
    start: FloatArray,
    sign: int,
    late: FloatArray | float = 0.0,
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
    late : array (n, k, q), optional, Wb/m
        Leakage d that enters the tooth before each slot only towards its root.
    """
    shape = alone.shape
    owner = np.repeat(np.arange(shape[0]), shape[1])
    points = _Points(
        circuit.rows(owner),
        answer[owner],
        alone.reshape(owner.size, -1),
        np.broadcast_to(late, shape).reshape(owner.size, -1),
        sign,
    )
    allowed = TOLERANCE * np.abs(alone).max(axis=(1, 2))[owner]
    potential = start.reshape(owner.size, -1).copy()
    # What has converged stays as it is: no design depends on its batch, and work shrinks.
    active = np.arange(owner.size)
    for _ in range(ITERATIONS):
        part = points.rows(active)
        state = part.state(potential[active])
        unsettled = np.abs(part.residual(state)).max(axis=1) > allowed[active]
        if not np.any(unsettled):
            break
        active = active[unsettled]
        part = points.rows(active)
        potential[active] = part.step(part.state(potential[active]))
    state = points.state(potential)
    return CircuitState(*(getattr(state, item.name).reshape(shape) for item in fields(state)))


def unfold(state: CircuitState, slots: int, sign: int) -> CircuitState:
    """The state of all slots from that of one period."""
    repeats = slots // state.potential.shape[-1]
    signs = np.repeat(float(sign) ** np.arange(repeats), state.potential.shape[-1])

    def wide(values: FloatArray, turned: FloatArray) -> FloatArray:
        return np.asarray(np.tile(values, (1, 1, repeats)) * turned)

    same = np.ones(slots)
    return CircuitState(
        potential=wide(state.potential, signs),
        tooth_flux=wide(state.tooth_flux, signs),
        lost=wide(state.lost, signs),
        lost_in_teeth=wide(state.lost_in_teeth, signs),
        tooth_slope=wide(state.tooth_slope, same),
        yoke_slope=wide(state.yoke_slope, same),
    )


def small_lost(
    state: CircuitState,
    answer: FloatArray,
    alone: FloatArray,
    late: FloatArray | None = None,
) -> FloatArray:
    """mu0 times the voltage that small additional potentials lose, (n, k, Q, r) Wb/m.

    Parameters
    ----------
    state : CircuitState
        Of all slots.
    answer : array (n, Q, Q)
    alone : array (n, k, Q, r), Wb/m
        Small potentials under perfect iron, r of them.
    late : array (n, k, Q, r), optional, Wb/m
        Their leakage that enters the teeth only towards the root.
    """
    if late is None:
        late = np.zeros_like(alone)

    def around(tooth: FloatArray) -> FloatArray:
        voltage = state.tooth_slope[..., None] * tooth
        return np.asarray(voltage - np.roll(voltage, -1, axis=2))

    load = alone + answer[:, None] @ around(late)
    slope = _reluctance(state.tooth_slope, state.yoke_slope, 1)
    small = np.linalg.solve(np.eye(slope.shape[-1]) + answer[:, None] @ slope, load)
    through = small - np.roll(small, 1, axis=2) - late
    return around(through) + state.yoke_slope[..., None] * small
