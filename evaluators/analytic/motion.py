"""Torque and force while the rotor turns, with every tooth saturated as it is at each position."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic import network, stress
from evaluators.analytic.gap import GapField
from evaluators.analytic.network import CircuitState, StatorCircuit
from evaluators.analytic.rotation import Rotation
from evaluators.analytic.rotor import MU_0
from evaluators.analytic.slots import SlotMouth
from evaluators.analytic.waves import Waves
from evaluators.machine.field import Excitation
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.materials.magnetization import MagnetizationCurve
from evaluators.machine.winding.winding import Connection

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]


@dataclass(frozen=True)
class Motion:
    """Torque (N m/m) and force (N/m) over one sector of the turn, (n, positions).

    `direct` and `mirrored` are the force per ampere-turn on the suspension phasor i and on its
    conjugate; `rest` is the force without suspension current. `tooth_flux` and `yoke_flux` (n,)
    are the largest of any tooth and any piece of yoke, Wb/m, without suspension current; `linkage`
    (n,) is the phasor of the flux linkage of phase one per turn, magnets and torque current, Wb/m.
    """

    rotation: Rotation
    positions: FloatArray
    torque: FloatArray
    cogging: FloatArray
    rest: ComplexArray
    direct: ComplexArray
    mirrored: ComplexArray
    tooth_flux: FloatArray
    yoke_flux: FloatArray
    linkage: ComplexArray

    def whole_turn(self) -> tuple[ComplexArray, ComplexArray, ComplexArray]:
        """Force parts (rest, direct, mirrored) over the whole turn, (n, sectors * positions)."""
        sectors = self.rotation.sectors
        turn = 2.0 * np.pi / sectors * np.arange(sectors)
        parts = (self.rest, self.direct, self.mirrored)
        whole = [
            (part[:, None, :] * np.exp(1j * exponent * turn)[None, :, None]).reshape(
                part.shape[0], -1
            )
            for part, exponent in zip(parts, self.rotation.force_exponents, strict=True)
        ]
        return whole[0], whole[1], whole[2]

    @property
    def _commands(self) -> ComplexArray:
        """The part of the force that has a mean: on the phasor for ps = p + 1, else mirrored."""
        family = self.rotation.winding.family
        return self.direct if family.suspension_pole_pairs > family.pole_pairs else self.mirrored

    @property
    def force_per_ampere_turn(self) -> FloatArray:
        """Magnitude of the mean force per ampere-turn, (n,) N/m/A."""
        return np.asarray(np.abs(self._commands.mean(axis=1)))

    def command(self, direction: float) -> ComplexArray:
        """Suspension phasor of one ampere-turn that makes the mean force point to `direction`."""
        mean = self._commands.mean(axis=1)
        if self._commands is self.direct:
            return np.asarray(np.exp(1j * direction) * np.conj(mean) / np.abs(mean))
        return np.asarray(np.exp(-1j * direction) * mean / np.abs(mean))

    def force_waves(self, exciting: Excitation) -> ComplexArray:
        """Force over the whole turn, commanded along x and along y, (n, 2, positions), N/m."""
        rest, direct, mirrored = self.whole_turn()
        commanded = []
        for direction in (0.0, 0.5 * np.pi):
            phasor = (exciting.suspension * self.command(direction))[:, None]
            commanded.append(rest + direct * phasor + mirrored * np.conj(phasor))
        return np.stack(commanded, axis=1)


def move(
    rotation: Rotation,
    curve: MagnetizationCurve,
    sections: CrossSections,
    waves: Waves,
    positions: FloatArray,
) -> Motion:
    """Torque and force of n designs at rotor `positions` (k,), rad."""
    perfect, bore = waves.perfect, sections.bore_radius
    # A voltage lost around a slot weakens the leakage across it as a current would.
    leakage = np.reshape(waves.slot.yoke_permeance, (-1, 1, 1)) * np.eye(rotation.slots)
    answer = network.circulant(np.real(perfect.reaction.slot)) + leakage
    state = _saturate(rotation, curve, sections, waves, answer, positions)

    turning = np.exp(1j * rotation.magnet_exponents[:, None] * positions)
    pair = np.exp(1j * rotation.pole_pairs * np.array([-1.0, 1.0])[:, None] * positions)
    reaction = rotation.by_order(perfect.reaction)

    def iron(lost: FloatArray) -> tuple[ComplexArray, ComplexArray]:
        """Field of the voltage that the iron takes, a current against it."""
        orders = np.arange(1, rotation.highest_order + 1)
        spectrum = np.fft.fft(lost, axis=2)[:, :, orders % rotation.slots] / -rotation.slots
        wave = np.swapaxes(spectrum, 1, 2)
        return reaction[0][:, :, None] * wave, reaction[1][:, :, None] * wave

    rising, falling = (
        magnets @ turning + current @ pair + taken
        for magnets, current, taken in zip(
            rotation.dense(perfect.magnets),
            rotation.pair(perfect.current),
            iron(state.lost),
            strict=True,
        )
    )

    control = rotation.pair(perfect.suspension)
    phasors = (1.0, 1.0j)
    own = [
        _slot_currents(rotation, "suspension", positions, np.full(bore.size, i)) for i in phasors
    ]
    small = [
        _potentials(rotation, perfect.suspension, positions, i)
        + _scaled(waves.slot.yoke_permeance, c)
        for i, c in zip(phasors, own, strict=True)
    ]
    lost = network.small_lost(
        state, answer, np.stack(small, 3), np.stack([_late(waves.slot, c) for c in own], 3)
    )
    forces = []
    for number, phasor in enumerate(phasors):
        # The column of exp(-j p angle) goes with the conjugate of the phasor, the other with it.
        moving = np.array([np.conj(phasor), phasor])[:, None] * pair
        up, down = (part @ moving for part in control)
        iron_up, iron_down = iron(lost[..., number])
        forces.append(
            stress.force(rising, down + iron_down, bore) + stress.force(up + iron_up, falling, bore)
        )
    still = [part @ turning for part in rotation.dense(waves.magnets)]
    return Motion(
        rotation=rotation,
        positions=positions,
        torque=stress.torque(rising, falling),
        cogging=stress.torque(still[0], still[1]),
        rest=stress.force(rising, falling, bore),
        direct=0.5 * (forces[0] - 1j * forces[1]),
        mirrored=0.5 * (forces[0] + 1j * forces[1]),
        tooth_flux=np.abs(state.tooth_flux).max(axis=(1, 2)),
        yoke_flux=np.abs(state.potential).max(axis=(1, 2)),
        linkage=_linkage(rotation, state, waves.slot, positions),
    )


def _saturate(
    rotation: Rotation,
    curve: MagnetizationCurve,
    sections: CrossSections,
    waves: Waves,
    answer: FloatArray,
    positions: FloatArray,
) -> CircuitState:
    """Slot potentials of magnets and torque current; only one period of the slots is solved."""
    period, sign = rotation.slot_period
    own = _slot_currents(rotation, "torque", positions, waves.phasor)
    leakage = _scaled(waves.slot.yoke_permeance, own)[:, :, :period]

    def potentials(magnets: GapField, current: GapField) -> FloatArray:
        turning = np.exp(-1j * rotation.magnet_orders[:, None] * positions)
        around = np.exp(2j * np.pi * magnets.classes[:, None] * np.arange(period) / rotation.slots)
        wave = np.swapaxes(magnets.slot[:, :, None] * turning, 1, 2) @ around
        driven = _potentials(rotation, current, positions, 1.0)[:, :, :period]
        return np.asarray(2.0 * np.real(wave) + driven + leakage)

    state = network.solve(
        StatorCircuit.of(sections, curve),
        network.fold(answer, period, sign),
        potentials(waves.perfect.magnets, waves.perfect.current),
        potentials(waves.magnets, waves.current),
        sign,
        _late(waves.slot, own)[:, :, :period],
    )
    return network.unfold(state, rotation.slots, sign)


def _slot_currents(
    rotation: Rotation, connection: Connection, positions: FloatArray, phasor: ComplexArray
) -> FloatArray:
    """Currents of the slots for phasors (n,) of ampere-turns, (n, k, Q) A."""
    turning = phasor[:, None] * np.exp(1j * rotation.pole_pairs * positions)
    return np.real(turning[:, :, None] * rotation.winding.slot_mmf(connection))


def _scaled(permeance: FloatArray | float, current: FloatArray) -> FloatArray:
    """Leakage flux mu0 P I of the slots, (n, k, Q) Wb/m, for P (n,)."""
    return MU_0 * np.reshape(permeance, (-1, 1, 1)) * current


def _late(slot: SlotMouth, current: FloatArray) -> FloatArray:
    """Leakage that the tooth before each slot carries at its root but not in the mean."""
    flux = _scaled(np.subtract(slot.yoke_permeance, slot.tooth_permeance), current)
    return flux - np.roll(flux, 1, axis=2)


def _linkage(
    rotation: Rotation, state: CircuitState, slot: SlotMouth, positions: FloatArray
) -> ComplexArray:
    """Linkage phasor of phase one, (n,) Wb/m; the flux of phase one is Re(phasor exp(j p angle)).

    The three phases together turned back by the rotor's angle (Park, Trans. AIEE 48, 1929), whose
    mean over a sector holds the fundamental alone. Its part in phase with the current leaves out
    that the slot's own leakage links the winding less than it fills the slot bottom. The voltage of
    the teeth weakens the leakage that they carry in the mean, by reciprocity.
    """
    late = np.subtract(slot.yoke_permeance, slot.tooth_permeance)
    linked = state.potential + np.reshape(late, (-1, 1, 1)) * state.lost_in_teeth
    phases = linked @ np.conj(rotation.winding.torque_slot_mmf)
    turned = phases * np.exp(-1j * rotation.pole_pairs * positions)
    return np.asarray(2.0 / 3.0 * turned.mean(axis=1))


def _potentials(
    rotation: Rotation, field: GapField, positions: FloatArray, phasor: complex
) -> FloatArray:
    """Slot potentials of a current field times `phasor`, (n, k, Q) Wb/m."""
    around = np.exp(
        2j * np.pi * field.classes[:, None] * np.arange(rotation.slots) / rotation.slots
    )
    turning = np.conj(phasor) * np.exp(-1j * rotation.pole_pairs * positions)
    return np.asarray(2.0 * np.real((field.slot @ around)[:, None, :] * turning[None, :, None]))
