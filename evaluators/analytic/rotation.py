"""How the harmonics of one family move: which orders turn with which frequency, and for how long
the machine must be followed until its torque and force repeat.

Every field coefficient is written for the spatial order n = 1..N (the conjugate stands for -n) as a
sum of terms exp(j tau angle), angle being the rotor's. Magnets bring tau = -+nu with nu = p, 3p, ..
for the orders n = nu + kQ; both currents bring tau = -+p.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property, reduce
from math import gcd

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic.gap import GapField
from evaluators.machine.winding.winding import Connection, Winding

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]

CANCELLED = 1e-9  # slot current harmonics below this share of the largest are rounding


@dataclass(frozen=True)
class Rotation:
    """Static facts of one family.

    Attributes
    ----------
    winding : Winding
    highest_order : int
        N, the highest spatial order that torque and force are summed to.
    magnet_orders : array (v,) of int
        nu = p, 3p, 5p, ...
    """

    winding: Winding
    highest_order: int
    magnet_orders: IntArray

    @cached_property
    def slots(self) -> int:
        """Q."""
        return self.winding.family.slots

    @cached_property
    def pole_pairs(self) -> int:
        """p."""
        return self.winding.family.pole_pairs

    @cached_property
    def edge_order(self) -> int:
        """Highest order summed for the density at the edges of the magnets: six a slot pitch."""
        return max(6 * self.slots, 3 * self.pole_pairs)

    def current_residues(self, connection: Connection) -> tuple[IntArray, ComplexArray]:
        """Fourier residues of the slot currents that vary as exp(-j p angle).

        Returns
        -------
        residues : array (c,) of int
        current : array (c,), A per ampere-turn of phasor 1
            Of the part multiplying exp(-j p angle); it goes with the conjugate of the phasor.
        """
        mmf = self.winding.slot_mmf(connection)
        # Slot current Re(I C exp(j p angle)) = half of I* C* exp(-j p angle) plus its conjugate.
        spectrum = np.fft.fft(0.5 * np.conj(mmf)) / self.slots
        kept = np.flatnonzero(np.abs(spectrum) > CANCELLED * np.abs(spectrum).max())
        return kept.astype(np.int64), spectrum[kept]

    # -- time dependence -----------------------------------------------------------------

    @cached_property
    def magnet_exponents(self) -> IntArray:
        """tau of the 2v columns of a dense magnet field: -nu, then +nu."""
        return np.concatenate([-self.magnet_orders, self.magnet_orders])

    @cached_property
    def _present(self) -> dict[str, list[set[int]]]:
        """For every order 0..N the exponents tau with which it occurs, by source."""
        orders = range(self.highest_order + 1)
        magnets: list[set[int]] = [
            {int(tau) for tau in self.magnet_exponents if (n + int(tau)) % self.slots == 0}
            for n in orders
        ]
        found = {"magnets": magnets}
        both: tuple[Connection, Connection] = ("torque", "suspension")
        for connection in both:
            residues = {int(r) for r in self.current_residues(connection)[0]}
            found[connection] = [
                {
                    tau
                    for tau, order in ((-self.pole_pairs, n), (self.pole_pairs, -n))
                    if order % self.slots in residues
                }
                for n in orders
            ]
        return found

    @cached_property
    def force_exponents(self) -> tuple[int, int, int]:
        """Exponents, modulo `sectors`, of the force at rest, on i, and on the conjugate of i."""
        rest, direct, mirrored = (min(item, default=0) for item in self._force_sets)
        return rest % self.sectors, direct % self.sectors, mirrored % self.sectors

    @cached_property
    def _force_sets(self) -> tuple[set[int], set[int], set[int]]:
        main = [
            a | b for a, b in zip(self._present["magnets"], self._present["torque"], strict=True)
        ]
        control = self._present["suspension"]
        rest: set[int] = set()
        direct: set[int] = set()
        mirrored: set[int] = set()
        for n in range(2, self.highest_order + 1):
            rest |= {b - a for a in main[n] for b in main[n - 1]}
            for pair in ((main[n], control[n - 1], 1), (control[n], main[n - 1], -1)):
                upper, lower, sign = pair
                for a in upper:
                    for b in lower:
                        own = b if sign == 1 else -a  # sign of the control term in conj(a) b
                        (direct if own > 0 else mirrored).add(b - a)
        return rest, direct, mirrored

    @cached_property
    def sectors(self) -> int:
        """How many times per revolution torque and force repeat.

        Torque repeats as it is; the parts of the force repeat turned by a fixed angle
        (`force_exponents`), so one sector tells the whole turn.
        """
        differences: list[int] = []
        main = [
            a | b for a, b in zip(self._present["magnets"], self._present["torque"], strict=True)
        ]
        for taus in main:
            differences += [tau - other for tau in taus for other in taus]
        for exponents in self._force_sets:
            first = min(exponents, default=0)
            differences += [tau - first for tau in exponents]
        return reduce(gcd, (abs(d) for d in differences), 0) or 1

    def positions(self, per_sixth_period: int) -> FloatArray:
        """Rotor angles over one sector, rad; `per_sixth_period` or more in 60 electrical deg."""
        count = -(-per_sixth_period * 6 * self.pole_pairs // self.sectors)
        return np.asarray(2.0 * np.pi / self.sectors * np.arange(count) / count)

    @property
    def slot_period(self) -> tuple[int, int]:
        """After how many slots the field of magnets and torque current repeats, and its sign."""
        number = gcd(self.slots, 2 * self.pole_pairs)
        return self.slots // number, -1 if (2 * self.pole_pairs // number) % 2 else 1

    @cached_property
    def suspension_period(self) -> tuple[int, int]:
        """After how many slots the suspension currents repeat, and their sign.

        A multiple of `slot_period`, so that the saturation repeats too.
        """
        current = self.winding.slot_mmf("suspension")
        small = CANCELLED * float(np.abs(current).max())
        period = self.slot_period[0]
        for number in range(period, self.slots, period):
            if self.slots % number == 0:
                turned = np.roll(current, -number)
                for sign in (1, -1):
                    if np.allclose(turned, sign * current, rtol=0.0, atol=small):
                        return number, sign
        return self.slots, 1

    # -- dense coefficients ----------------------------------------------------------------

    def dense(self, field: GapField) -> tuple[ComplexArray, ComplexArray]:
        """Rising and falling coefficients of the orders 1..N, per class and sign of tau.

        Returns
        -------
        arrays (n, N, 2c)
            Columns 0..c-1 vary as exp(-j nu angle), columns c..2c-1 as exp(+j nu angle).
        """
        rows, classes = field.rising.shape[0], field.orders.shape[0]
        shape = (rows, self.highest_order, 2 * classes)
        result = []
        order = field.orders
        column = np.broadcast_to(np.arange(classes)[:, None], order.shape)
        ahead = (order >= 1) & (order <= self.highest_order)
        back = (order <= -1) & (order >= -self.highest_order)
        for part in (field.rising, field.falling):
            dense = np.zeros(shape, dtype=np.complex128)
            dense[:, order[ahead] - 1, column[ahead]] = part[:, ahead]
            dense[:, -order[back] - 1, classes + column[back]] = np.conj(part[:, back])
            result.append(dense)
        return result[0], result[1]

    def pair(self, field: GapField) -> tuple[ComplexArray, ComplexArray]:
        """As `dense` for a current field, all of whose classes turn alike: (n, N, 2)."""
        result = []
        order = field.orders
        ahead = (order >= 1) & (order <= self.highest_order)
        back = (order <= -1) & (order >= -self.highest_order)
        for part in (field.rising, field.falling):
            both = np.zeros((part.shape[0], self.highest_order, 2), dtype=np.complex128)
            both[:, order[ahead] - 1, 0] = part[:, ahead]
            both[:, -order[back] - 1, 1] = np.conj(part[:, back])
            result.append(both)
        return result[0], result[1]

    def by_order(self, field: GapField) -> tuple[ComplexArray, ComplexArray]:
        """Rising and falling coefficients of the orders 1..N themselves, (n, N) each."""
        rising, falling = self.pair(field)
        return rising[:, :, 0], falling[:, :, 0]
