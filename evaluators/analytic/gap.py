"""The field of the slotted gap, solved exactly for all slots of a family at once.

The bore is tooth face (tangential field zero) or slot mouth. In each mouth the tangential field is
a sum of the slot's modes, in the gap a sum of exp(j n theta); both must give the same vector
potential across the mouth (Galerkin mode matching; subdomain models of slotted machines, e.g.
Dubas and Espanet, IEEE Trans. Magn. 45(5), 2009, and Lubin, Mezani, Rezzoug, IEEE Trans. Magn.
47(2), 2011, solve one system for all slots). All slots are alike, so a discrete Fourier transform
over the slots splits the problem: an order n meets only orders n + kQ, and each residue class of orders
is a system of only K unknowns, K modes of one mouth.

Sources: a magnet harmonic of order nu, standing still in the rotor, varies as exp(-j nu angle) in
the stator and belongs to the class of nu; a slot current of Fourier residue s drives the class of
s. Both are linear, so a rotating machine is a sum of such answers and no position is solved twice.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic.rotor import MU_0, RotorRadii, response
from evaluators.analytic.slots import SlotMouth

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]


@dataclass(frozen=True)
class Iron:
    """Magnetic voltage taken by the iron, per design (n,); all zero for perfect iron.

    Attributes
    ----------
    tooth : array (n,)
        Length of air, in m, that takes the voltage of the teeth at the same radial flux.
    yoke : array (n,)
        mu0 H_theta at the bore over A that drives the stator yoke, 1/m.
    core_permeability : array (n,)
        Relative permeability of the rotor core; infinity for a perfect one.
    core_ratio : array (n,)
        Inner over outer radius of the rotor core as far as flux can use it; 0 if the shaft
        carries flux too.
    """

    tooth: FloatArray
    yoke: FloatArray
    core_permeability: FloatArray
    core_ratio: FloatArray

    @classmethod
    def perfect(cls, rows: int) -> Iron:
        """Infinitely permeable iron for `rows` designs."""
        zero = np.zeros(rows)
        return cls(zero, zero, np.full(rows, np.inf), zero)

    def core_admittance(self, recoil_permeability: float, orders: IntArray) -> FloatArray:
        """Core admittance of `evaluators.analytic.rotor.response`, (n, v) for orders (v,).

        Core between no-flux at its inner radius and the magnets: mu_r/mu_core coth(n ln(Ro/Ri)).
        """
        order = np.abs(orders)
        with np.errstate(divide="ignore"):
            depth = order * -np.log(self.core_ratio)[:, None]
        return np.asarray(recoil_permeability / self.core_permeability[:, None] / np.tanh(depth))

    def stator_admittance(self, bore: FloatArray, slots: int, orders: IntArray) -> FloatArray:
        """mu0 H_theta over A at the bore, as a layer in series with the gap, (n, v), 1/m.

        The teeth count for orders that pass through whole teeth only, below half the slots.
        """
        order = np.abs(orders)
        through = np.where(2 * order < slots, order, 0)
        tooth = through**2 * (self.tooth / bore**2)[:, None]
        return np.asarray(tooth + self.yoke[:, None])


@dataclass(frozen=True)
class GapField:
    """Harmonics of the gap field, orders grouped in classes n = class + k Q.

    Attributes
    ----------
    orders : array (c, w) of int
        Spatial orders, one row per class; 0 marks an entry without field.
    rising, falling : arrays (n, c, w), Wb/m
        A = sum (rising (r/bore)^|n| + falling (r/bore)^-|n|) exp(j n theta).
    slot : array (n, c), Wb/m
        Fourier coefficient of the mean of A over the slot mouths: a_j = slot exp(j 2 pi c j / Q).
    """

    orders: IntArray
    rising: ComplexArray
    falling: ComplexArray
    slot: ComplexArray


class SlottedGap:
    """The slotted gap of n designs, ready to answer sources in given classes of orders.

    Parameters
    ----------
    radii : RotorRadii
    opening : array (n,)
        Slot opening angle at the bore, rad.
    mouth : SlotMouth
    slots : int
    iron : Iron
    classes : array (c,) of int
        Residues (magnet orders or current residues) that will be asked for.
    reach : int
        Orders run from class - reach Q to class + reach Q.
    """

    def __init__(
        self,
        radii: RotorRadii,
        opening: FloatArray,
        mouth: SlotMouth,
        slots: int,
        iron: Iron,
        classes: IntArray,
        reach: int,
    ) -> None:
        self.radii, self.slots, self.mouth = radii, slots, mouth
        self.half = 0.5 * opening
        self.classes = np.asarray(classes, dtype=np.int64)
        self.orders = self.classes[:, None] + slots * np.arange(-reach, reach + 1)[None, :]
        flat = np.where(self.orders == 0, 1, self.orders).ravel()
        rows, shape = opening.size, self.orders.shape
        alone = response(radii, flat, iron.core_admittance(radii.recoil_permeability, flat))
        self._stator = iron.stator_admittance(radii.bore, slots, flat)
        self._series = 1.0 / (1.0 - alone * self._stator)
        nonzero = (self.orders != 0).ravel()
        self._response = np.where(nonzero, alone * self._series, 0.0).reshape(rows, *shape)
        self._series = np.where(nonzero, self._series, 0.0).reshape(rows, *shape)
        self._stator = self._stator.reshape(rows, *shape)
        self._modes = _mode_integrals(self.half, self.orders, mouth.current_share.shape[1])
        weighted = self._modes[..., 1:] * (self._response * slots / (2.0 * np.pi))[..., None]
        turned = np.swapaxes(self._modes, 2, 3)
        driven = turned[:, :, 1:, :] @ weighted
        scale = self.half**2 * radii.bore
        self._matrix = scale[:, None, None, None] * mouth.compliance[:, None] - driven
        self._uniform = np.sum(
            weighted * self._modes[..., :1], axis=2
        )  # response of the modes to a uniform mouth field, (n, c, K)

    def _field(self, smooth: ComplexArray | float, mouth_field: ComplexArray) -> GapField:
        """Gap harmonics from the smooth-bore potential and mouth fields mu0 h (n, c, K+1)."""
        shift = np.exp(-1j * np.pi * self.orders / self.slots)
        driven = np.einsum("ncwk,nck->ncw", self._modes, mouth_field)
        driven = driven * (self.slots / (2.0 * np.pi)) * shift
        potential = smooth * self._series + self._response * driven
        tangential = driven + self._stator * potential
        order = np.where(self.orders == 0, 1, np.abs(self.orders))
        swing = self.radii.bore[:, None, None] / order * tangential
        mean = np.einsum("ncw,cw,ncw->nc", potential, 1.0 / shift, self._modes[..., 0])
        return GapField(
            orders=self.orders,
            rising=0.5 * (potential - swing),
            falling=0.5 * (potential + swing),
            slot=mean / (2.0 * self.half[:, None]),
        )

    def of_magnets(self, smooth: ComplexArray) -> GapField:
        """Field of magnet harmonics, one per class.

        Parameters
        ----------
        smooth : array (n, c)
            A_n at a smooth bore (`evaluators.analytic.rotor.source`) of the order equal to the
            class itself.
        """
        own = self.orders == self.classes[:, None]
        wide = np.where(own, smooth[:, :, None], 0.0)
        shift = np.exp(1j * np.pi * self.orders / self.slots)
        load = np.einsum("ncw,cw,ncwk->nck", wide * self._series, shift, self._modes[..., 1:])
        answer = np.linalg.solve(self._matrix, load[..., None])[..., 0]
        uniform = np.zeros((*load.shape[:2], 1))
        return self._field(wide, np.concatenate([uniform, answer], axis=2))

    def of_currents(self, current: ComplexArray) -> GapField:
        """Field of slot currents.

        Parameters
        ----------
        current : array (c,) or (n, c), A
            Fourier coefficient of the slot currents: I_j = current exp(j 2 pi c j / Q).
        """
        bore = self.radii.bore[:, None]
        current = np.broadcast_to(current, (bore.shape[0], self.classes.size))
        uniform = -MU_0 * current / (2.0 * self.half[:, None] * bore)
        share = self.half[:, None] * self.mouth.current_share
        load = self._uniform * uniform[..., None] - MU_0 * share[:, None, :] * current[..., None]
        answer = np.linalg.solve(self._matrix, load[..., None])[..., 0]
        return self._field(0.0, np.concatenate([uniform[..., None], answer], axis=2))


def _mode_integrals(half: FloatArray, orders: IntArray, modes: int) -> FloatArray:
    """Integral of mode k times exp(-j n x) over the mouth, real part convention, (n, c, w, K+1).

    Even modes: cos(k pi x / opening), their integral is real; odd modes: sin, their integral is
    -j times the number returned. The factor -j is absorbed in the odd unknowns.
    """
    wave = 0.5 * np.arange(modes + 1)  # times pi, per half-angle
    swing = (half[:, None, None] * orders / np.pi)[..., None]
    minus, plus = np.sinc(wave - swing), np.sinc(wave + swing)
    even = np.arange(modes + 1) % 2 == 0
    scale = half[:, None, None, None]
    return np.asarray(scale * np.where(even, minus + plus, minus - plus))
