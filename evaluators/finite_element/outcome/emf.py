"""Flux linkage and EMF of one phase over the turn, without current."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.solution.batch import BatchField, Solution

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


def phase_linkage(batch: BatchField, unloaded: Solution) -> FloatArray:
    """Flux linkage of phase one by the magnets, one turn per coil, (turn, LANES), Wb/m.

    At equal steps over one turn from rotor angle 0. `unloaded` covers one cogging period; with
    the rotor turned on by 2 pi j/Q + k pi/p the field is the same turned by j slots, times (-1)^k.
    """
    model = batch.model
    conductors = model.task.winding.phase_conductors("torque")
    sector = model.symmetry.torque
    slots = np.arange(model.slots)
    signs = float(sector.sign) ** (slots // sector.slots)
    around = unloaded.linkage[:, slots % sector.slots] * signs[:, None]
    shift, sign = _periods(model.slots, model.pole_pairs, model.task.winding.family.cogging_periods)
    parts = [
        factor * np.einsum("s,tsl->tl", conductors, np.roll(around, j, axis=1))
        for j, factor in zip(shift, sign, strict=True)
    ]
    return np.concatenate(parts)


def emf(linkage: FloatArray, speed: float) -> FloatArray:
    """EMF d(linkage)/dt at `speed` (rad/s) from a turn's `linkage` (turn, n), V/m.

    The derivative of the trigonometric interpolation.
    """
    count = linkage.shape[0]
    order = np.fft.rfftfreq(count, 1.0 / count)
    spectrum = 1j * order[:, None] * np.fft.rfft(linkage, axis=0)
    if count % 2 == 0:
        spectrum[-1] = 0.0  # its sine is not seen by the samples
    return np.asarray(speed * np.fft.irfft(spectrum, count, axis=0))


def _periods(slots: int, pole_pairs: int, periods: int) -> tuple[IntArray, FloatArray]:
    """Slots and sign by which the field has turned after m cogging periods, (periods,) each."""
    shift = np.zeros(periods, dtype=np.int64)
    sign = np.zeros(periods)
    for j in range(slots):
        for k in range(2 * pole_pairs):
            # 2 pi j/Q + k pi/p in cogging periods of 2 pi/lcm(Q, 2 p).
            m = (j * (periods // slots) + k * (periods // (2 * pole_pairs))) % periods
            shift[m], sign[m] = j, (-1.0) ** k
    return shift, sign
