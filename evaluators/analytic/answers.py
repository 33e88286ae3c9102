"""What the slots and the flanges beside their mouths see of voltages lost in the iron.

A voltage lost around a slot is a current in it, minus that voltage. A voltage lost along a flange
is missing in the mouth only, and stands on the flange's face as a sheet of current. All slots are
alike, so the answers are circulant and follow from one slot, Fourier residue by residue; by
reciprocity they are symmetric.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic.gap import GapField, SlottedGap
from evaluators.analytic.tips import WEIGHTS

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

CIRCULATING = 1e5
"""Answer of the gap to equal currents in all slots over the largest other: flux that circles in
the yoke does not cross the gap, so in truth it is without bound."""


@dataclass(frozen=True)
class Answers:
    """Answers of n designs to mu0 times voltages, in Wb/m; flange 2 j lies before, 2 j + 1 behind.

    Attributes
    ----------
    slots : array (n, Q, Q)
        Slot potentials to voltages around slots.
    to_tips : array (n, 2 Q, Q)
        Mean flux of flanges to voltages around slots, and transposed the potentials to voltages of
        flanges.
    own : array (n, 2, 2)
        Mean flux of a slot's flanges to their own voltages.
    profile : array (n, 4)
        Flux at `evaluators.analytic.tips.PLACES` to the flange's own voltage, over its mean.
    """

    slots: FloatArray
    to_tips: FloatArray
    own: FloatArray
    profile: FloatArray

    @classmethod
    def of(cls, gap: SlottedGap, tip: GapField) -> Answers:
        """Answers of a gap that holds every Fourier residue of the slots.

        `tip` is its `tip_reaction`.
        """
        shift = np.exp(1j * np.pi * gap.orders / gap.slots)
        current, mouth = gap.reaction, gap.mouth
        local = (tip.rising + tip.falling) * shift
        face = np.sum((current.rising + current.falling) * shift * gap.sheet, axis=2)
        behind = np.sum(local * gap.sheet, axis=2)
        before = np.conj(np.sum(local * np.conj(gap.sheet), axis=2))
        slot = current.slot + (mouth.wall_permeance @ WEIGHTS)[:, None]
        to_behind = np.real(np.fft.ifft(slot - face, axis=1))
        to_before = np.real(np.fft.ifft(slot - np.conj(face), axis=1))
        same = np.real(slot - face - tip.slot + behind).mean(axis=1)
        other = np.real(slot - face - np.conj(tip.slot) + before).mean(axis=1)
        own = np.stack([np.stack([same, other], axis=1), np.stack([other, same], axis=1)], axis=2)
        places = current.tips[:, :, 1, :-1] + mouth.wall_permeance[:, None] - tip.tips[:, :, 1, :-1]
        slots = gap.slots
        distance = (np.arange(slots)[:, None] - np.arange(slots)) % slots
        to_tips = np.stack([to_before[:, distance], to_behind[:, distance]], axis=2)
        return cls(
            slots=circulant(np.real(current.slot) + mouth.yoke_permeance[:, None]),
            to_tips=to_tips.reshape(-1, 2 * slots, slots),
            own=own,
            profile=np.real(places).mean(axis=1) / same[:, None],
        )

    def fold(self, period: int, sign: int) -> Answers:
        """The same for patterns that repeat after `period` slots with `sign`."""
        return Answers(
            fold(self.slots, period, sign), fold(self.to_tips, period, sign), self.own, self.profile
        )


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
    """Answer matrix for patterns that repeat after `period` slots with `sign`.

    (n, r Q, Q) in, (n, r q, q) out.
    """
    rows, seen, slots = matrix.shape
    weight = float(sign) ** (np.arange(slots) // period)
    kept = matrix[:, : seen * period // slots, :] * weight
    return np.asarray(kept.reshape(rows, kept.shape[1], -1, period).sum(axis=2))
