"""Which part of a machine has to be solved, and at which rotor positions.

A machine repeats itself after 2 pi/S: the magnets turn into themselves or their opposites, and so
do the currents. Only Q/S slots are meshed, and the field in the next sector is that in this one
times +1 or -1. The torque field (magnets and torque current) usually has a smaller sector than
the suspension field, whose orders n = p +- 1 do not fit it; the sector of the latter holds a
whole number of the former.

In time the machine repeats itself after 60 electrical degrees, up to a turn of the whole picture:
with the rotor turned on by 2 pi j/Q + k pi/p, the field is the old one turned by j slots, times
(-1)^k.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import gcd

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.winding.winding import Winding

ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]

TOLERANCE = 1e-9  # on currents of order one: above rounding, far below a wrong winding


class SymmetryError(ValueError):
    """A winding lacks a symmetry that the evaluator relies on."""


@dataclass(frozen=True)
class Sector:
    """A part of the circle: `slots` slots, `count` times in the circle.

    The field in the next sector is `sign` times that in this one; the orders of such a field are
    0 (sign +1) or count/2 (sign -1) modulo `count`.
    """

    slots: int
    count: int
    sign: int

    @property
    def lowest_order(self) -> int:
        """Order that, together with all multiples of `count`, makes up the field."""
        return 0 if self.sign > 0 else self.count // 2


@dataclass(frozen=True)
class Symmetry:
    """Sectors and repetition of one winding.

    Attributes
    ----------
    torque, suspension : Sector
        The smallest sectors of both fields.
    torque_phase : float
        Angle psi that puts the torque current in phase with the EMF: slot current
        Re(I torque_slot_mmf exp(j (p theta + psi))).
    shift, sign : array (6 p,) of int
        Slots j by which the field is turned, and its sign, m sixths of an electrical period later.
    torque_shift, torque_sign : array (6 p,) of int
        The same for the torque field alone, which may repeat itself by smaller shifts.
    """

    winding: Winding
    torque: Sector
    suspension: Sector
    torque_phase: float
    shift: IntArray
    sign: IntArray
    torque_shift: IntArray
    torque_sign: IntArray

    def orbits(self) -> list[tuple[int, int]]:
        """One slot of the torque sector for each kind of slot, and how many are of that kind.

        Slots of one kind see the same torque field, at other times.
        """
        step = gcd(self.torque.slots, *(int(j) for j in self.torque_shift))
        return [(slot, self.torque.slots // step) for slot in range(step)]


def symmetry(winding: Winding) -> Symmetry:
    """Find the smallest sectors and the repetition in time of a winding.

    Raises
    ------
    SymmetryError
        If the fields do not repeat themselves after 60 electrical degrees.
    """
    family = winding.family
    slots, pairs = family.slots, family.pole_pairs
    torque, suspension = winding.torque_slot_mmf, winding.suspension_slot_mmf
    counts = [d for d in range(1, slots + 1) if gcd(slots, 2 * pairs) % d == 0]
    count = max(s for s in counts if _repeats(torque, slots // s, (-1) ** (2 * pairs // s)))
    torque_sector = Sector(slots // count, count, (-1) ** (2 * pairs // count))
    found = [
        Sector(slots // s, s, sign)
        for s in counts
        for sign in ((1, -1) if s % 2 == 0 else (1,))
        if count % s == 0 and s <= 2 and _repeats(suspension, slots // s, sign)
    ]
    angle = np.pi * (2 * np.arange(slots) + 1) / slots
    phase = np.pi - np.angle(np.sum(torque * np.exp(1j * pairs * angle)))
    shift, sign = _sixths([torque, suspension], slots, pairs)
    torque_shift, torque_sign = _sixths([torque], slots, pairs)
    return Symmetry(
        winding=winding,
        torque=torque_sector,
        suspension=found[-1],
        torque_phase=float(phase),
        shift=shift,
        sign=sign,
        torque_shift=torque_shift,
        torque_sign=torque_sign,
    )


def _repeats(values: ComplexArray, step: int, factor: complex) -> bool:
    return bool(np.max(np.abs(np.roll(values, -step) - factor * values)) < TOLERANCE)


def _repeats_up_to_phase(values: ComplexArray, step: int) -> bool:
    used = int(np.argmax(np.abs(values)))
    factor = values[(used + step) % values.size] / values[used]
    return abs(abs(factor) - 1.0) < TOLERANCE and _repeats(values, step, complex(factor))


def _sixths(currents: list[ComplexArray], slots: int, pairs: int) -> tuple[IntArray, IntArray]:
    """Smallest shift and its sign for every sixth; the first current must turn with the magnets."""
    found: dict[int, tuple[int, int]] = {}
    for j in range(slots):
        if not _repeats(currents[0], j, complex(np.exp(-2j * np.pi * pairs * j / slots))):
            continue
        if not all(_repeats_up_to_phase(item, j) for item in currents[1:]):
            continue
        for k in range(2 * pairs):
            # Rotor angle 2 pi j/Q + k pi/p, counted in sixths of a period, pi/(3 p).
            sixths, rest = divmod(6 * pairs * j + 3 * k * slots, slots)
            if rest == 0:
                found.setdefault(sixths % (6 * pairs), (j, 1 - 2 * (k % 2)))
    if len(found) < 6 * pairs:
        msg = f"Q{slots}p{pairs}: the currents do not repeat themselves after 60 electrical degrees"
        raise SymmetryError(msg)
    pick = [found[m] for m in range(6 * pairs)]
    return (
        np.array([j for j, _ in pick], dtype=np.int64),
        np.array([sign for _, sign in pick], dtype=np.int64),
    )
