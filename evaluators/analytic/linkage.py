"""Flux of phases, teeth and yoke from the vector potential of the slots.

The slots' potentials are a_j = sum over classes of slot exp(j 2 pi c j / Q) exp(-j nu angle) plus
its conjugate. A coil links the potential of its go slot minus that of its return slot; a tooth
carries that of the slot after it minus the one before; the yoke behind a slot carries that of the
slot, each with what the slot's own current adds on the way down to the bottom.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic.gap import GapField
from evaluators.analytic.rotation import Rotation
from evaluators.analytic.rotor import MU_0
from evaluators.analytic.slots import SlotMouth
from evaluators.machine.winding.winding import Connection, Winding

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]

SAMPLES = 96  # of one electrical period, in which peaks and losses of the iron are taken


class Linkage:
    """Flux linkages of one winding."""

    def __init__(self, winding: Winding) -> None:
        self.winding = winding
        self.slots = winding.family.slots
        self.phase: dict[Connection, FloatArray] = {
            "torque": winding.phase_conductors("torque"),
            "suspension": winding.phase_conductors("suspension"),
        }

    def _phase_factor(self, connection: Connection, classes: IntArray) -> ComplexArray:
        """Sum over slots of conductors times exp(j 2 pi c j / Q), (c,)."""
        slot = np.arange(self.slots)
        turn = np.exp(2j * np.pi * classes[:, None] * slot / self.slots)
        return np.asarray(turn @ self.phase[connection])

    def magnets(self, magnets: GapField, orders: IntArray) -> ComplexArray:
        """Fundamental flux linkage phasor of phase one per turn, (n,) Wb/m.

        linkage = Re(phasor exp(j p angle)).
        """
        return self.magnet_harmonics(magnets, orders)[:, 0]

    def magnet_harmonics(self, magnets: GapField, orders: IntArray) -> ComplexArray:
        """Flux linkage phasors of phase one per turn and magnet order, (n, v) Wb/m.

        linkage = sum Re(phasor exp(j nu angle)).
        """
        factor = self._phase_factor("torque", orders)
        return np.asarray(np.conj(2.0 * magnets.slot * factor))

    def inductance(
        self,
        connection: Connection,
        field: GapField,
        permeance: FloatArray,
        rotation: Rotation,
        phasor: ComplexArray | None,
    ) -> FloatArray:
        """Inductance of phase one per turn squared, (n,) H/m, gap and slot leakage.

        `field` is made by a current of `phasor` (n,) ampere-turns, of one where it is None.
        """
        residues, current = rotation.current_residues(connection)
        factor = self._phase_factor(connection, residues)
        gap = 2.0 * np.sum(field.slot * factor, axis=1)
        if phasor is not None:
            gap = gap / np.conj(phasor)
        leakage = 2.0 * np.sum(current * factor)
        return np.asarray(np.real(gap + MU_0 * permeance * leakage))

    def iron_coefficients(
        self, tooth_slot: ComplexArray, yoke_slot: ComplexArray, classes: IntArray
    ) -> tuple[ComplexArray, ComplexArray]:
        """Coefficients of tooth and yoke flux by class, (n, teeth, c) each, Wb/m.

        From the slots' potentials along the teeth and at the bottom, (n, c) each.
        """
        tooth = np.arange(self.distinct_teeth)
        after = np.exp(2j * np.pi * classes * tooth[:, None] / self.slots)
        before = np.exp(2j * np.pi * classes * (tooth[:, None] - 1) / self.slots)
        return (
            np.asarray(tooth_slot[:, None, :] * (after - before)),
            np.asarray(yoke_slot[:, None, :] * after),
        )

    @property
    def distinct_teeth(self) -> int:
        """Teeth that tell all others: a third of them, as the phases are alike."""
        return self.slots // 3

    def _of_current(
        self,
        connection: Connection,
        field: GapField,
        phasor: ComplexArray | float,
        slot: SlotMouth,
        rotation: Rotation,
    ) -> tuple[ComplexArray, ComplexArray]:
        """`iron_coefficients` of a current, the slots' own leakage included, summed over classes.

        `phasor` (n,) is the current's, in ampere-turns; the result (n, teeth) goes with
        exp(-j p angle).
        """
        residues, unit = rotation.current_residues(connection)
        current = MU_0 * np.conj(np.asarray(phasor)).reshape(-1, 1) * unit
        along, bottom = (
            field.slot + np.reshape(permeance, (-1, 1)) * current
            for permeance in (slot.tooth_permeance, slot.yoke_permeance)
        )
        teeth, yoke = self.iron_coefficients(along, bottom, residues)
        return teeth.sum(axis=2), yoke.sum(axis=2)

    def iron_flux(
        self,
        magnets: GapField,
        current: GapField,
        phasor: ComplexArray,
        slot: SlotMouth,
        rotation: Rotation,
    ) -> tuple[FloatArray, FloatArray]:
        """Flux of the distinct teeth and of the yoke behind them over one electrical period.

        Returns
        -------
        teeth, yoke : arrays (n, teeth, SAMPLES), Wb/m
        """
        phase = 2.0 * np.pi * np.arange(SAMPLES) / SAMPLES
        electrical = rotation.magnet_orders // rotation.pole_pairs
        turning = np.exp(-1j * electrical[:, None] * phase)
        result = []
        for magnet_part, current_part in zip(
            self.iron_coefficients(magnets.slot, magnets.slot, rotation.magnet_orders),
            self._of_current("torque", current, phasor, slot, rotation),
            strict=True,
        ):
            total = magnet_part.copy()
            total[:, :, 0] += current_part
            result.append(2.0 * np.real(total @ turning))
        return result[0], result[1]

    def suspension_flux(
        self, suspension: GapField, slot: SlotMouth, rotation: Rotation
    ) -> tuple[FloatArray, FloatArray]:
        """Peak flux of teeth and yoke per ampere-turn of suspension current, (n, teeth), Wb/m."""
        teeth, yoke = self._of_current("suspension", suspension, 1.0, slot, rotation)
        # Phasor and conjugate add up at some position of every turn: the waves differ in speed.
        return 2.0 * np.abs(teeth), 2.0 * np.abs(yoke)
