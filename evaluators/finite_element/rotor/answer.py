"""What currents induced in the rotor add to h on the bore, for all harmonics of a field.

Orders up to `COUPLED` times the number of slots mix among themselves (`conducting_magnets.py`),
those above answer one by one (`eddy.py`): a field of such an order hardly reaches the magnets.
A harmonic of negative frequency is the conjugate of one of opposite order and positive frequency.
In a real field it mixes with those of positive frequency; in a complex one, which stands for two
real fields a quarter period apart, the two signs are strangers to each other.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.rotor.conducting_magnets import Answer, ConductingMagnets, Spaces
from evaluators.finite_element.rotor.eddy import LAYERS, Conductors, EddyLoss, EddyRotor
from evaluators.finite_element.rotor.harmonics import Harmonics
from evaluators.finite_element.rotor.separate_magnets import (
    Ring,
    SeparateMagnets,
    ring_of,
    ring_reluctivity,
)
from evaluators.finite_element.rotor.uniform import NU_0
from evaluators.finite_element.solution.batch import BatchField

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]

COUPLED = 2
"""Highest order that mixes with others, over the number of slots."""


@dataclass(frozen=True)
class _Group:
    """Harmonics that may mix: where they are, and the answer to them.

    Attributes
    ----------
    row, column : arrays (e,)
        Of the harmonics' arrays.
    frequency, order : arrays (e,)
        Place of each in the answer.
    mirrored : array (e,)
        Which frequencies are negative.
    answer : Answer
    change : array (f, n, m, m)
        Response less that at standstill, of these harmonics alone.
    relaxation : array (f, n, m, m)
        See `RotorAnswer.relaxed`.
    """

    row: IntArray
    column: IntArray
    frequency: IntArray
    order: IntArray
    mirrored: BoolArray
    answer: Answer
    change: ComplexArray
    relaxation: ComplexArray

    def gather(self, values: ComplexArray) -> ComplexArray:
        """From values (t, m, n) of all harmonics to the group's, (f, n, m)."""
        f, n, m = self.change.shape[:3]
        result = np.zeros((f, n, m), dtype=np.complex128)
        part = values[self.row, self.column]
        result[self.frequency, :, self.order] = self._turned(part)
        return result

    def scatter(self, values: ComplexArray, result: ComplexArray) -> None:
        """Inverse of `gather`, into `result`."""
        result[self.row, self.column] = self._turned(values[self.frequency, :, self.order])

    def _turned(self, part: ComplexArray) -> ComplexArray:
        return np.where(self.mirrored[:, None], np.conj(part), part)


class RotorAnswer:
    """Answer of the rotor of n designs to the harmonics of a field, beyond the static one.

    Parameters
    ----------
    harmonics : Harmonics
    eddy : EddyRotor
    ring : Ring
        Its spaces may differ from the magnets; their static effect is not in here.
    segments : int
        Of a pole.
    slots : int
    static : array (m, n)
        h over a of the harmonics' orders at standstill.
    """

    def __init__(
        self,
        harmonics: Harmonics,
        eddy: EddyRotor,
        ring: Ring,
        segments: int,
        slots: int,
        static: FloatArray,
    ) -> None:
        self.harmonics, self.eddy, self.ring = harmonics, eddy, ring
        self._segments, self._static = segments, static
        orders, speed = harmonics.orders, harmonics.speed
        moving = speed != 0.0
        coupled = moving & (np.abs(orders) <= COUPLED * slots)
        apart = [coupled] if harmonics.real else [coupled & (speed > 0.0), coupled & (speed < 0.0)]
        self._groups = [group for chosen in apart for group in self._grouped(chosen, static)]
        self._alone = np.nonzero(moving & ~coupled)
        row, column = self._alone
        response = eddy.response(orders[column], speed[row, column])
        self._change = response - static[column]
        self._relaxation = 1.0 / (1.0 + self._change / static[column])

    def _grouped(self, chosen: BoolArray, static: FloatArray) -> list[_Group]:
        harmonics, pairs = self.harmonics, self.ring.pole_pairs
        row, column = np.nonzero(chosen)
        mirrored = harmonics.speed[row, column] < 0.0
        signed = harmonics.orders[column] * np.where(mirrored, -1, 1)
        speed = np.abs(harmonics.speed[row, column])
        magnet = NU_0 / self.eddy.rotor.magnet_permeability
        groups = []
        for residue in np.unique(signed % (2 * pairs)):
            here = signed % (2 * pairs) == residue
            orders, order = np.unique(signed[here], return_inverse=True)
            # Standstill comes first.
            speeds, frequency = np.unique(np.append(0.0, speed[here]), return_inverse=True)
            frequency = frequency[1:]
            spaces = None
            if self.ring.filler_permeability != self.eddy.rotor.magnet_permeability:
                along, across = ring_reluctivity(self.ring, orders, magnet)
                own = magnet * np.eye(orders.size)
                spaces = Spaces(along - own, across - own)
            magnets = ConductingMagnets(self.eddy, pairs, self._segments, orders, spaces)
            answer = magnets.answer(speeds)
            change = answer.response - answer.response[:1]
            present = np.zeros((speeds.size, orders.size), dtype=np.bool_)
            present[frequency, order] = True
            change *= (present[:, :, None] & present[:, None, :])[:, None]
            still = np.empty((orders.size, static.shape[1]))
            still[order] = static[column[here]]
            answered = np.eye(orders.size) + change / still.T[:, None, :]
            relaxation = np.asarray(np.linalg.inv(answered), dtype=np.complex128)
            groups.append(
                _Group(
                    row[here],
                    column[here],
                    frequency,
                    order,
                    mirrored[here],
                    answer,
                    change,
                    relaxation,
                )
            )
        return groups

    def change(self, amplitudes: ComplexArray) -> ComplexArray:
        """What the currents add to h, (t, m, n), for amplitudes (t, m, n) of the potential."""
        result = np.zeros_like(amplitudes)
        for group in self._groups:
            part = (group.change @ group.gather(amplitudes)[..., None])[..., 0]
            group.scatter(part, result)
        result[self._alone] = self._change * amplitudes[self._alone]
        return result

    def relaxed(self, missing: ComplexArray) -> ComplexArray:
        """Change of h that would make up for what is missing if all answered as the rotor does."""
        result = missing.copy()
        for group in self._groups:
            part = (group.relaxation @ group.gather(missing)[..., None])[..., 0]
            group.scatter(part, result)
        result[self._alone] = self._relaxation * missing[self._alone]
        return result

    def weakened(self, amplitudes: ComplexArray) -> ComplexArray:
        """What the rotor's currents leave of static `amplitudes` (t, m, n) of the potential.

        For a field that a current sheet on a bore of perfect iron makes, which keeps its h.
        """
        return np.asarray(self.relaxed(self._static * amplitudes) / self._static)

    def loss(self, amplitudes: ComplexArray) -> EddyLoss:
        """Loss (n,) of the field whose two-sided coefficients have `amplitudes` (t, m, n), W/m.

        Each harmonic stands for itself and its conjugate.
        """
        row, column = self._alone
        orders, speed = self.harmonics.orders[column], self.harmonics.speed[row, column]
        parts = [self.eddy.loss(orders, speed, amplitudes[self._alone])]
        parts += [group.answer.loss(group.gather(amplitudes)) for group in self._groups]
        return EddyLoss(
            shaft=np.asarray(np.sum([part.shaft.sum(axis=0) for part in parts], axis=0)),
            magnet=np.asarray(np.sum([part.magnet.sum(axis=0) for part in parts], axis=0)),
            sleeve=np.asarray(np.sum([part.sleeve.sum(axis=0) for part in parts], axis=0)),
        )


def eddy_rotor(batch: BatchField, torque: FloatArray, layers: int = LAYERS) -> EddyRotor:
    """Conducting rotor of a batch whose stack is as long as `torque` (LANES,) per metre asks."""
    model = batch.model
    length = model.task.duty.shaft_torque / np.abs(torque)
    conductors = Conductors.of(model.task, batch.sections.magnet_arc_ratio, length)
    rings = model.discretisation.iron_rings
    return EddyRotor(batch.rotor, batch.reluctivity, rings, conductors, layers)


def rotor_answer(
    batch: BatchField,
    rotor: EddyRotor,
    harmonics: Harmonics,
    separate: SeparateMagnets | None = None,
) -> RotorAnswer:
    """Answer of a batch's rotor to the harmonics of its torque or suspension field."""
    model = batch.model
    filler = model.recoil if separate is None else separate.filler_permeability
    return RotorAnswer(
        harmonics,
        rotor,
        ring_of(batch, filler),
        model.task.construction.magnet_segments,
        model.slots,
        batch.response[np.abs(harmonics.orders)],
    )
