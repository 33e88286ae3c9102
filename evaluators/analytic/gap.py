"""The field of the slotted gap, solved exactly for all slots of a family at once.

The bore is tooth face (tangential field zero) or slot mouth. In each mouth the tangential field is
a sum of the slot's modes, in the gap a sum of exp(j n theta); both must give the same vector
potential across the mouth (Galerkin mode matching; subdomain models of slotted machines, e.g.
Dubas and Espanet, IEEE Trans. Magn. 45(5), 2009, and Lubin, Mezani, Rezzoug, IEEE Trans. Magn.
47(2), 2011, solve one system for all slots). All slots are alike, so a discrete Fourier transform
over the slots splits the problem: an order n meets only orders n + kQ, and each residue class of
orders is a system of only K unknowns, K modes of one mouth.

Sources: a magnet harmonic of order nu, standing still in the rotor, varies as exp(-j nu angle) in
the stator and belongs to the class of nu; a slot current of Fourier residue s drives the class of
s. Both are linear, so a rotating machine is a sum of such answers and no position is solved twice.
"""

from __future__ import annotations

from copy import copy
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic.rotor import MU_0, RotorRadii, response
from evaluators.analytic.slots import SlotMouth
from evaluators.analytic.tips import PLACES, ToothTips

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]

SMALL = 1e-9  # rad; of a smaller angle the sine is the angle, to rounding


@dataclass(frozen=True)
class Iron:
    """How much magnetic voltage the iron takes, per design (n,); all zero for perfect iron.

    Attributes
    ----------
    tooth, yoke : arrays (n,)
        mu0 times voltage over flux per metre, of one tooth and of one slot pitch of the stator
        yoke.
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

    def stator_voltage(self, slots: int, classes: IntArray) -> FloatArray:
        """mu0 times the voltage lost around a slot over its potential a, (n, c).

        Tooth j carries a_j - a_(j-1) and the yoke behind slot j carries a_j, so the path around
        slot j loses (2 a_j - a_(j-1) - a_(j+1)) and a_j times their reluctances.
        """
        turn = 4.0 * np.sin(np.pi * classes / slots) ** 2
        return np.asarray(turn * self.tooth[:, None] + self.yoke[:, None])


@dataclass(frozen=True)
class GapField:
    """Harmonics of the gap field, orders grouped in classes n = class + k Q.

    Attributes
    ----------
    classes : array (c,) of int
    orders : array (c, w) of int
        Spatial orders, one row per class; 0 marks an entry without field.
    rising, falling : arrays (n, c, w), Wb/m
        A = sum (rising (r/bore)^|n| + falling (r/bore)^-|n|) exp(j n theta).
    slot : array (n, c), Wb/m
        Fourier coefficient of the mean of A over the windings of the slots, less what the slot's
        own current adds on the way in from the mouth: a_j = slot exp(j 2 pi c j / Q).
    tips : array (n, c, 2, 5), Wb/m
        The same of the flux of the flanges before and behind each slot at four places, less the
        leakage of the slot's own current, and of what enters by the face between first and last.
    """

    classes: IntArray
    orders: IntArray
    rising: ComplexArray
    falling: ComplexArray
    slot: ComplexArray
    tips: ComplexArray

    def of(self, rows: IntArray) -> GapField:
        """The classes in the given rows only."""
        return GapField(
            classes=self.classes[rows],
            orders=self.orders[rows],
            rising=self.rising[:, rows],
            falling=self.falling[:, rows],
            slot=self.slot[:, rows],
            tips=self.tips[:, rows],
        )

    def times(self, factor: ComplexArray) -> GapField:
        """The field times `factor`, (c,) or (n, c)."""
        return GapField(
            classes=self.classes,
            orders=self.orders,
            rising=self.rising * factor[..., None],
            falling=self.falling * factor[..., None],
            slot=self.slot * factor,
            tips=self.tips * factor[..., None, None],
        )


class SlottedGap:
    """The slotted gap of n designs, ready to answer sources in given classes of orders.

    Iron of the stator acts as a current in the slots that is minus the voltage it takes (the law
    of the circuit around one slot), so the answer is that of perfect teeth plus a share of the
    answer to such a current.

    Parameters
    ----------
    radii : RotorRadii
    opening : array (n,)
        Slot opening angle at the bore, rad.
    mouth : SlotMouth
    slots : int
    classes : array (c,) of int
        Residues (magnet orders or current residues) that will be asked for.
    reach : int
        Orders are the `reach` smallest of either sign beside the smallest of all, the same for
        equal residues, so that fields of magnets and of currents are reciprocal.
    iron : Iron, optional
        Perfect if left out.
    tips : ToothTips, optional
        Flanges whose flux shall be told; left out, fields have none.
    """

    def __init__(
        self,
        radii: RotorRadii,
        opening: FloatArray,
        mouth: SlotMouth,
        slots: int,
        classes: IntArray,
        reach: int,
        iron: Iron | None = None,
        tips: ToothTips | None = None,
    ) -> None:
        self.radii, self.slots, self.mouth = radii, slots, mouth
        self.half = 0.5 * opening
        self.classes = np.asarray(classes, dtype=np.int64)
        self._lowest = (self.classes + slots // 2) % slots - slots // 2
        self.orders = self._lowest[:, None] + slots * np.arange(-reach, reach + 1)[None, :]
        self._share = self.half[:, None] * mouth.current_share
        self._modes = _mode_integrals(self.half, self.orders, mouth.current_share.shape[1])
        self._set_tips(tips)
        self._set_iron(iron or Iron.perfect(opening.size))

    def _set_tips(self, tips: ToothTips | None) -> None:
        """Waves exp(j n x) of the flange behind the mouth, x from the slot's axis, (n, c, w, 4).

        At four places; `sheet` (n, c, w) is their mean over flange and corner.
        """
        self.tips = tips
        self._face = np.zeros((self.half.size, *self.orders.shape, 0), dtype=np.complex128)
        self.sheet = self._face
        if tips is None:
            return
        wide = tips.angle[:, None] * PLACES
        ends = np.stack([np.zeros_like(self.half), tips.sheet], axis=1)
        place = self.half[:, None] + np.concatenate([wide, ends], axis=1)
        reach = self.orders.shape[1] // 2
        low = np.exp(1j * self._lowest[:, None] * place[:, None, :])
        step = np.exp(1j * self.slots * np.arange(-reach, reach + 1)[:, None] * place[:, None, :])
        wave = low[:, :, None, :] * step[:, None, :, :]
        order = np.where(self.orders == 0, 1, self.orders)
        mean = (wave[..., -1] - wave[..., -2]) / (1j * order * tips.sheet[:, None, None])
        self._face, self.sheet = wave[..., :-2], np.where(self.orders == 0, 1.0, mean)

    def with_iron(self, iron: Iron, tips: ToothTips | None = None) -> SlottedGap:
        """The same gap with other iron, and flanges whose flux shall be told."""
        other = copy(self)
        other._set_tips(tips)
        other._set_iron(iron)
        return other

    def _set_iron(self, iron: Iron) -> None:
        flat = np.where(self.orders == 0, 1, self.orders).ravel()
        admittance = iron.core_admittance(self.radii.recoil_permeability, flat)
        alone = response(self.radii, flat, admittance).reshape(-1, *self.orders.shape)
        self._response = np.where(self.orders != 0, alone, 0.0)
        weighted = self._modes[..., 1:] * (self._response * self.slots / (2.0 * np.pi))[..., None]
        driven = np.swapaxes(self._modes, 2, 3)[:, :, 1:, :] @ weighted
        scale = self.half**2 * self.radii.bore
        self._matrix = scale[:, None, None, None] * self.mouth.compliance[:, None] - driven
        # Response of the modes to a uniform mouth field, (n, c, K).
        self._uniform = np.sum(weighted * self._modes[..., :1], axis=2)
        self._stator = iron.stator_voltage(self.slots, self.classes)
        self._reaction: GapField | None = None

    @property
    def reaction(self) -> GapField:
        """Field of mu0 I_j = exp(j 2 pi c j / Q) with perfect teeth and yoke, Wb/m over Wb/m."""
        if self._reaction is None:
            self._reaction = self._currents_alone(
                np.full(self.classes.shape, 1.0 / MU_0, dtype=np.complex128)
            )
        return self._reaction

    def tip_reaction(self) -> GapField:
        """Field of mu0 times a voltage exp(j 2 pi c j / Q) lost along the flange behind each slot.

        Only that of its sheet of current on the face; in the mouth the same voltage is missing,
        which is minus `reaction`. That of the flanges before the slots is the mirror image.
        """
        sheet = -np.conj(self.sheet) / self.radii.bore[:, None, None]
        smooth = self._response * (self.slots / (2.0 * np.pi)) * sheet
        # The modes' system is real: real and imaginary part are two loads.
        load = np.swapaxes(self._modes[..., 1:], 2, 3) @ np.stack([smooth.real, smooth.imag], 3)
        both = np.linalg.solve(self._matrix, load)
        answer: ComplexArray = np.asarray(both[..., 0] + 1j * both[..., 1])
        uniform = np.zeros((*answer.shape[:2], 1))
        mouth_field: ComplexArray = np.concatenate([uniform, answer], axis=2)
        return self._field(0.0, mouth_field, np.asarray(sheet, dtype=np.complex128))

    def _tip_flux(
        self, local: ComplexArray, slot: ComplexArray, mouth_field: ComplexArray
    ) -> ComplexArray:
        """`GapField.tips` from the gap's potential (n, c, w) seen from the slot's axis."""
        if self.tips is None:
            return np.zeros((*slot.shape, 2, 0), dtype=np.complex128)
        behind = (local[:, :, None, :] @ self._face)[:, :, 0]
        before = (local[:, :, None, :] @ np.conj(self._face))[:, :, 0]
        face = np.stack([before, behind], axis=2)
        flux = slot[:, :, None, None] + self._walls(mouth_field) - face
        return np.concatenate([flux, face[..., :1] - face[..., -1:]], axis=3)

    def _walls(self, mouth_field: ComplexArray) -> ComplexArray:
        """Potential of the slot's walls over that of its winding, before and behind, (n, c, 2, 4).

        At the depth of the flange's underside at four places, without the slot's own leakage.
        """
        even = np.arange(1, mouth_field.shape[2] + 1) % 2 == 0
        scale = -self.half * self.radii.bore
        left = np.swapaxes(self.mouth.wall * scale[:, None, None], 1, 2)
        alike = mouth_field[..., even] @ left[:, even]
        # Odd unknowns have absorbed a factor -j, see `_mode_integrals`.
        opposite = 1j * (mouth_field[..., ~even] @ left[:, ~even])
        return np.stack([alike - opposite, alike + opposite], axis=2)

    def _field(
        self,
        smooth: ComplexArray | float,
        mouth_field: ComplexArray,
        sheet: ComplexArray | float = 0.0,
    ) -> GapField:
        """Gap harmonics from the smooth-bore potential and mouth fields mu0 h (n, c, K+1).

        `sheet` is the integral of mu0 h exp(-j n x) over the tooth faces around one slot.
        """
        shift = np.exp(-1j * np.pi * self.orders / self.slots)
        driven = (self._modes @ mouth_field[..., None])[..., 0]
        driven = (driven + sheet) * (self.slots / (2.0 * np.pi)) * shift
        potential = smooth + self._response * driven
        order = np.where(self.orders == 0, 1, np.abs(self.orders))
        swing = self.radii.bore[:, None, None] / order * driven
        local = potential / shift
        mean = np.sum(local * self._modes[..., 0], axis=2)
        # What the mouth's modes add on the way to the winding, by reciprocity.
        inside = self.radii.bore[:, None] * np.einsum(
            "nk,nck->nc", self._share, mouth_field[..., 1:]
        )
        slot = mean / (2.0 * self.half[:, None]) + inside
        return GapField(
            classes=self.classes,
            orders=self.orders,
            rising=0.5 * (potential - swing),
            falling=0.5 * (potential + swing),
            slot=slot,
            tips=self._tip_flux(local, slot, mouth_field[..., 1:]),
        )

    def _with_stator(self, field: GapField) -> GapField:
        """Add what the stator's iron does to the field of perfect teeth and yoke."""
        if not np.any(self._stator):
            return field
        return with_stator(field, self.reaction, self._stator)

    def of_magnets(self, smooth: ComplexArray) -> GapField:
        """Field of magnet harmonics, one per class.

        Parameters
        ----------
        smooth : array (n, c)
            A_n at a smooth bore (`evaluators.analytic.rotor.source`) of the order equal to the
            class itself.

        Raises
        ------
        IndexError
            If an order lies beyond `reach`.
        """
        own = self.orders == self.classes[:, None]
        wide = np.where(own, smooth[:, :, None], 0.0)
        number = np.arange(self.classes.size)
        place = self.orders.shape[1] // 2 + (self.classes - self._lowest) // self.slots
        shift = np.exp(1j * np.pi * self.classes / self.slots)
        load = (smooth * shift)[..., None] * self._modes[:, number, place, 1:]
        answer = np.linalg.solve(self._matrix, load[..., None])[..., 0]
        uniform = np.zeros((*load.shape[:2], 1))
        return self._with_stator(self._field(wide, np.concatenate([uniform, answer], axis=2)))

    def of_currents(self, current: ComplexArray) -> GapField:
        """Field of slot currents.

        Parameters
        ----------
        current : array (c,) or (n, c), A
            Fourier coefficient of the slot currents: I_j = current exp(j 2 pi c j / Q).
        """
        return self._with_stator(self._currents_alone(current))

    def _currents_alone(self, current: ComplexArray) -> GapField:
        bore = self.radii.bore[:, None]
        current = np.broadcast_to(current, (bore.shape[0], self.classes.size))
        uniform = -MU_0 * current / (2.0 * self.half[:, None] * bore)
        load = self._uniform * uniform[..., None]
        load = load - MU_0 * self._share[:, None, :] * current[..., None]
        answer = np.linalg.solve(self._matrix, load[..., None])[..., 0]
        return self._field(0.0, np.concatenate([uniform[..., None], answer], axis=2))


def with_stator(field: GapField, reaction: GapField, voltage: FloatArray) -> GapField:
    """The field under perfect teeth and yoke with iron that takes voltage.

    Parameters
    ----------
    field, reaction : GapField
        Of the same classes in the same order; the reaction as of `SlottedGap.reaction`.
    voltage : array (n, c)
        From `Iron.stator_voltage`.
    """
    lost = voltage * field.slot / (1.0 + voltage * reaction.slot)
    return GapField(
        classes=field.classes,
        orders=field.orders,
        rising=field.rising - lost[:, :, None] * reaction.rising,
        falling=field.falling - lost[:, :, None] * reaction.falling,
        slot=field.slot - lost * reaction.slot,
        tips=field.tips - lost[:, :, None, None] * reaction.tips,
    )


def _mode_integrals(half: FloatArray, orders: IntArray, modes: int) -> FloatArray:
    """Integral of mode k times exp(-j n x) over the mouth, real part convention, (n, c, w, K+1).

    Even modes: cos(k pi x / opening), their integral is real; odd modes: sin, their integral is
    -j times the number returned. The factor -j is absorbed in the odd unknowns.
    """
    wave = 0.5 * np.pi * np.arange(modes + 1)
    swing = half[:, None, None] * orders
    # sin(wave -+ swing) by the addition theorem: the sine of so many numbers takes long.
    along = np.multiply.outer(np.cos(swing), np.sin(wave))
    across = np.multiply.outer(np.sin(swing), np.cos(wave))
    minus, plus = (
        np.where(np.abs(argument) < SMALL, 1.0, sine / np.where(argument == 0.0, 1.0, argument))
        for argument, sine in (
            (wave - swing[..., None], along - across),
            (wave + swing[..., None], along + across),
        )
    )
    even = np.arange(modes + 1) % 2 == 0
    scale = half[:, None, None, None]
    return np.asarray(scale * np.where(even, minus + plus, minus - plus))
