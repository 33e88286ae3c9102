"""Star of slots: phase belts at the torque pole pairs, group split at the suspension pole pairs.

Both steps work on whole numbers, so no phasor is ever placed by a rounded angle. Method: star of
slots after Bianchi and Dai Pre, "Use of the star of slots in designing fractional-slot
single-layer synchronous motors", IEE Proc. EPA 153(3), 2006 (from memory), folded by 180 degrees
because every coil can be turned round.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

IntArray = NDArray[np.int64]
ComplexArray = NDArray[np.complex128]

PHASES = 3

BALANCE_TOLERANCE = 1e-9
"""Allowed imbalance over the phasor's magnitude: above rounding (1e-13), below any real fault."""


class WindingError(ValueError):
    """A family that cannot be wound; `condition` names the failed condition in a few words."""

    def __init__(self, message: str, condition: str) -> None:
        super().__init__(message)
        self.condition = condition

    def __reduce__(self) -> tuple[type[WindingError], tuple[str, str]]:
        return WindingError, (str(self), self.condition)


def unit_phasors(numerators: IntArray, denominator: int) -> ComplexArray:
    """Unit phasors exp(2j pi numerators / denominator), reduced to one turn before rounding."""
    angle = 2.0 * np.pi * np.remainder(numerators, denominator) / denominator
    return np.asarray(np.exp(1j * angle), dtype=np.complex128)


def phase_belts(slots: int, pole_pairs: int) -> tuple[IntArray, IntArray]:
    """Phase (0, 1, 2) and sense (+1, -1) of each coil of a double-layer three-phase winding.

    The star at `pole_pairs` has Q/t spokes, t = gcd(Q, p). Six belts of 60 electrical degrees in
    the order +0 -2 +1 -0 +2 -1 cover it, each starting a quarter of a spoke pitch before a
    spoke: belts are then half a spoke pitch or a whole one on the grid, so that no boundary
    ever meets a spoke. Any other boundary between spokes gives the same winding turned about
    the shaft. Coil 0 is always phase 0 with sense +1.

    Parameters
    ----------
    slots : int
        Number of slots Q, which is also the number of coils.
    pole_pairs : int
        Pole pairs p of the torque field.

    Returns
    -------
    phase, sense : (Q,) integer arrays

    Raises
    ------
    WindingError
        If the spokes do not divide by three: no symmetrical three-phase winding exists.
    """
    periodicity = math.gcd(slots, pole_pairs)
    spokes = slots // periodicity
    if spokes % PHASES:
        msg = (
            f"{slots} slots at {pole_pairs} pole pairs make a star of {spokes} spokes, "
            f"which does not divide among {PHASES} phases"
        )
        raise WindingError(msg, "star divides among phases")
    spoke = pole_pairs * np.arange(slots, dtype=np.int64) % slots // periodicity
    belt = (12 * spoke + 3) // (2 * spokes)
    phase = np.array([0, 2, 1, 0, 2, 1], dtype=np.int64)[belt]
    sense = np.array([1, -1, 1, -1, 1, -1], dtype=np.int64)[belt]
    return phase, sense


def split_groups(
    slots: int, suspension_pole_pairs: int, phase: IntArray, sense: IntArray
) -> IntArray:
    """Group (0 = a, 1 = b) of each coil, from the star at the suspension pole pairs.

    A line through the origin cuts the star of phase 0's sensed coil phasors in two, group b
    being reversed for suspension. The sum of signed phasors is longest for some such line: a
    phasor on the wrong side of its own resultant would lengthen it by changing sides. All lines
    between neighbouring phasors are tried, at most Q/3; of equally long sums the one whose
    group a reaches furthest from the first coil on wins. Phase belts at a p that is no multiple of
    three repeat every 120 degrees, so the split is turned by Q/3 and 2Q/3 coils for the others.

    Parameters
    ----------
    slots, suspension_pole_pairs : int
        Q, a multiple of three, and ps.
    phase, sense : (Q,) integer arrays
        As returned by `phase_belts` for pole pairs that are no multiple of three.

    Returns
    -------
    group : (Q,) integer array
        The first coil of phase 0 is in group a.
    """
    coils = np.flatnonzero(phase == 0).astype(np.int64)
    # Angles in units of pi / Q, from the first coil.
    angle = 2 * suspension_pole_pairs * coils + np.where(sense[coils] > 0, 0, slots)
    angle = (angle - angle[0]) % (2 * slots)
    phasors = unit_phasors(angle, 2 * slots)
    splits = []
    for edge in np.unique(angle % slots):
        # The line lies a quarter unit beyond a phasor, hence between two neighbours.
        side = (4 * (angle - edge) - 1) % (8 * slots) < 4 * slots
        length = float(np.abs(np.sum(np.where(side, -phasors, phasors))))
        splits.append((length, (side ^ side[0]).tolist()))
    longest = max(length for length, _ in splits) - BALANCE_TOLERANCE * coils.size
    chosen = min(split for length, split in splits if length >= longest)
    group = np.zeros(slots, dtype=np.int64)
    for turn in range(PHASES):
        group[(coils + turn * (slots // PHASES)) % slots] = chosen
    return group


def phase_sequence(phasors: ComplexArray) -> int:
    """Sequence of three balanced phasors: +1 if phase k is ahead by +2 pi k/3, -1 if behind.

    `phasors` has shape (3,), one per phase: sums of sensed coil phasors exp(+1j order theta).
    Currents cos(wt - sequence 2 pi k/3) then make a field that turns counter-clockwise.

    Raises
    ------
    WindingError
        If the phasors vanish or are not equal in magnitude and 120 degrees apart.
    """
    size = float(np.max(np.abs(phasors)))
    if size > BALANCE_TOLERANCE:
        for sequence in (1, -1):
            step = np.exp(2j * np.pi * sequence * np.arange(PHASES) / PHASES)
            if float(np.max(np.abs(phasors - phasors[0] * step))) <= BALANCE_TOLERANCE * size:
                return sequence
    msg = "the phases are not equal in magnitude and 120 degrees apart"
    raise WindingError(msg, "phases balanced")
