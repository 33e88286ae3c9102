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
from evaluators.analytic.tips import PLACES, WEIGHTS
from evaluators.analytic.waves import Waves
from evaluators.machine.field import Excitation
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.materials.magnetization import MagnetizationCurve
from evaluators.machine.winding.winding import Connection

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]


PHASORS = (1.0, 1.0j)  # of the suspension current, as far as forces are linear in it


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
    state = _saturate(rotation, curve, sections, waves, positions)

    turning = np.exp(1j * rotation.magnet_exponents[:, None] * positions)
    pair = np.exp(1j * rotation.pole_pairs * np.array([-1.0, 1.0])[:, None] * positions)
    reaction = tuple(part[:, :, None] for part in rotation.by_order(perfect.reaction))
    orders = np.arange(1, rotation.highest_order + 1)
    behind = tuple(part[:, :, None] for part in rotation.by_order(perfect.tip))
    # The mirror image: the slot's axis lies half a pitch from the angle zero.
    mirror = np.exp(-2j * np.pi * orders / rotation.slots)[:, None]
    before = tuple(np.conj(part) * mirror for part in behind)

    def iron(lost: FloatArray, tips_lost: FloatArray) -> tuple[ComplexArray, ComplexArray]:
        """Field of the voltages that the iron takes, a current against them."""
        current = lost + tips_lost.sum(axis=3)
        terms = [
            np.swapaxes(np.fft.fft(part, axis=2)[:, :, orders % rotation.slots], 1, 2)
            for part in (current, tips_lost[..., 0], tips_lost[..., 1])
        ]
        rising, falling = (
            (terms[1] * ahead + terms[2] * after - terms[0] * own) / rotation.slots
            for own, ahead, after in zip(reaction, before, behind, strict=True)
        )
        return rising, falling

    rising, falling = (
        magnets @ turning + current @ pair + taken
        for magnets, current, taken in zip(
            rotation.dense(perfect.magnets),
            rotation.pair(perfect.current),
            iron(state.lost, state.tips_lost),
            strict=True,
        )
    )

    control = rotation.pair(perfect.suspension)
    lost, tips_lost = _small(rotation, waves, state, positions)
    forces = []
    for number, phasor in enumerate(PHASORS):
        # The column of exp(-j p angle) goes with the conjugate of the phasor, the other with it.
        moving = np.array([np.conj(phasor), phasor])[:, None] * pair
        up, down = (part @ moving for part in control)
        iron_up, iron_down = iron(lost[..., number], tips_lost[..., number])
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
    positions: FloatArray,
) -> CircuitState:
    """Slot potentials of magnets and torque current; only one period of the slots is solved."""
    period, sign = rotation.slot_period
    perfect, tips = waves.perfect, waves.tips
    own = _slot_currents(rotation, "torque", positions, waves.phasor, period)
    slots, seen = (
        magnets + current
        for magnets, current in zip(
            _standing(rotation, perfect.magnets, positions, period),
            _turning(rotation, perfect.current, positions, 1.0, period),
            strict=True,
        )
    )
    leakage = _scaled(waves.slot.yoke_permeance, own)
    across = _scaled(1.0, own)[..., None, None] * waves.slot.wall_permeance[:, None, None, None, :]
    # One permeability for teeth and yoke each makes the first guess.
    start = (
        _standing(rotation, waves.magnets, positions, period)[0]
        + _turning(rotation, waves.current, positions, 1.0, period)[0]
        + leakage
    )
    width = (PLACES[-1] - PLACES[0]) * tips.angle * sections.bore_radius
    state = network.solve(
        StatorCircuit.of(sections, tips, perfect.answers.profile, curve),
        perfect.answers.fold(period, sign),
        network.Sources(
            slots=slots + leakage,
            tips=seen[..., :-1] + across,
            faces=seen[..., -1] / width[:, None, None, None],
            late=_late(waves.slot, own, sign),
        ),
        start,
        sign,
    )
    return network.unfold(state, rotation.slots, sign)


def _small(
    rotation: Rotation, waves: Waves, state: CircuitState, positions: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Voltages that one ampere-turn of either suspension phasor loses.

    Around all slots (n, k, Q, 2) and along their flanges (n, k, Q, 2, 2).
    """
    period, sign = rotation.suspension_period
    slots, tips, late = [], [], []
    for phasor in PHASORS:
        turned = np.full(waves.phasor.shape, phasor)
        own = _slot_currents(rotation, "suspension", positions, turned, period)
        potential, seen = _turning(rotation, waves.perfect.suspension, positions, phasor, period)
        leak = _scaled(waves.slot.wall_permeance @ WEIGHTS, own)
        slots.append(potential + _scaled(waves.slot.yoke_permeance, own))
        tips.append(seen[..., :-1] @ WEIGHTS + leak[..., None])
        late.append(_late(waves.slot, own, sign))
    lost, tips_lost = network.small_lost(
        state,
        waves.perfect.answers.fold(period, sign),
        np.stack(slots, axis=-1),
        np.stack(tips, axis=-1),
        np.stack(late, axis=-1),
        sign,
    )
    repeats = rotation.slots // period
    signs = np.repeat(float(sign) ** np.arange(repeats), period)[:, None]
    return (
        np.tile(lost, (1, 1, repeats, 1)) * signs,
        np.tile(tips_lost, (1, 1, repeats, 1, 1)) * signs[:, None],
    )


def _slot_currents(
    rotation: Rotation,
    connection: Connection,
    positions: FloatArray,
    phasor: ComplexArray,
    count: int,
) -> FloatArray:
    """Currents of the first slots for phasors (n,) of ampere-turns, (n, k, count) A."""
    turning = phasor[:, None] * np.exp(1j * rotation.pole_pairs * positions)
    return np.real(turning[:, :, None] * rotation.winding.slot_mmf(connection)[:count])


def _scaled(permeance: FloatArray | float, current: FloatArray) -> FloatArray:
    """Leakage flux mu0 P I of the slots, (n, k, Q) Wb/m, for P (n,)."""
    return MU_0 * np.reshape(permeance, (-1, 1, 1)) * current


def _late(slot: SlotMouth, current: FloatArray, sign: int) -> FloatArray:
    """Leakage that the tooth before each slot carries at its root but not in the mean.

    Of currents (n, k, q) that repeat with `sign` after q slots.
    """
    flux = _scaled(np.subtract(slot.yoke_permeance, slot.tooth_permeance), current)
    before = np.roll(flux, 1, axis=2)
    before[:, :, 0] *= sign
    return np.asarray(flux - before)


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


def _standing(
    rotation: Rotation, magnets: GapField, positions: FloatArray, count: int
) -> tuple[FloatArray, FloatArray]:
    """What the first slots and their flanges see of the magnets, (n, k, count) and (.., 2, 5)."""
    slot = np.arange(count)
    wave = np.exp(
        1j
        * (
            2.0 * np.pi / rotation.slots * magnets.classes[:, None, None] * slot
            - rotation.magnet_orders[:, None, None] * positions[:, None]
        )
    )
    return _seen(magnets, wave)


def _turning(
    rotation: Rotation, field: GapField, positions: FloatArray, phasor: complex, count: int
) -> tuple[FloatArray, FloatArray]:
    """The same of a current field times `phasor`."""
    around = np.exp(2j * np.pi / rotation.slots * field.classes[:, None] * np.arange(count))
    turning = np.conj(phasor) * np.exp(-1j * rotation.pole_pairs * positions)
    return _seen(field, around[:, None, :] * turning[:, None])


def _seen(field: GapField, wave: ComplexArray) -> tuple[FloatArray, FloatArray]:
    """Twice the real part of slots and tips (n, c, ..) times wave (c, k, q)."""
    rows, classes = field.slot.shape
    both = np.concatenate([field.slot[..., None], field.tips.reshape(rows, classes, -1)], axis=2)
    parts = np.concatenate([both.real, -both.imag], axis=1).swapaxes(1, 2)
    flat = np.concatenate([wave.real, wave.imag]).reshape(2 * classes, -1)
    seen = (2.0 * (parts @ flat)).reshape(rows, -1, *wave.shape[1:])
    tips = np.moveaxis(seen[:, 1:].reshape(rows, 2, -1, *wave.shape[1:]), (1, 2), (3, 4))
    return np.asarray(seen[:, 0]), np.asarray(tips)
