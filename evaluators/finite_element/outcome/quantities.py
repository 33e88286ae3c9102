"""From the solved fields of a batch to a `FieldSolution`."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.outcome import stress
from evaluators.finite_element.solution.batch import BatchField, Solution
from evaluators.finite_element.solution.lanes import LANES

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

FINE = 8
"""Points per rotor position at which waveforms are read off, by trigonometric interpolation."""


@dataclass(frozen=True)
class Force:
    """Force over the whole turn, F_x + j F_y per metre, complex (turn, LANES).

    Attributes
    ----------
    angles : array (turn,)
        Rotor positions, rad.
    rest : array
        Without suspension current, N/m.
    direct, mirrored : arrays
        Per ampere-turn of the suspension phasor and of its conjugate, N/(m A).
    """

    angles: FloatArray
    rest: ComplexArray
    direct: ComplexArray
    mirrored: ComplexArray

    def command(self, direction: float, forward: bool) -> ComplexArray:
        """Phasor of one ampere-turn whose mean force points to `direction` (rad), (LANES,)."""
        main = (self.direct if forward else self.mirrored).mean(axis=0)
        phasor = np.exp(1j * direction) * np.conj(main) / np.abs(main)
        return np.asarray(phasor if forward else np.conj(phasor))

    def at(self, phasor: ComplexArray) -> ComplexArray:
        """Force over the turn with the suspension phasor (LANES,), A."""
        return np.asarray(self.rest + self.direct * phasor + self.mirrored * np.conj(phasor))


def force_parts(
    batch: BatchField,
    solution: Solution,
    small: ComplexArray,
    added: tuple[ComplexArray, ComplexArray] | None = None,
) -> tuple[ComplexArray, ComplexArray, ComplexArray]:
    """Force at the positions of a torque field: rest, direct and mirrored as in `Force`.

    `small` (t, size, LANES) is the field of the complex slot currents `suspension_slot_mmf` of one
    ampere-turn on the sector of the suspension field. `added` (t, m, LANES) is what induced
    currents and separate magnets add to h of the lowest m orders of either sign.
    """
    model = batch.model
    radius = batch.sections.bore_radius
    highest = batch.highest_wave
    main = solution.waves
    turning = stress.rotating(
        stress.spread(main.orders, main.potential, highest),
        stress.spread(main.orders, main.tangential, highest),
        radius,
    )
    sector = model.symmetry.suspension
    orders = batch.gap.class_orders(sector)
    orders = orders[orders <= highest]
    plus, minus = batch.coefficients_both_sides(
        small, sector, model.suspension.lattice.bore, orders
    )
    static = batch.response[orders]
    tangential, tangential_minus = static * plus, static * minus
    if added is not None:
        count = added[0].shape[1]
        tangential[:, :count] += added[0]
        tangential_minus[:, :count] += added[1]

    def half_field(
        a: ComplexArray, h: ComplexArray, a_negative: ComplexArray, h_negative: ComplexArray
    ) -> ComplexArray:
        return 0.5 * stress.rotating(
            stress.spread(orders, a, highest, a_negative),
            stress.spread(orders, h, highest, h_negative),
            radius,
        )

    field = half_field(plus, tangential, minus, tangential_minus)
    mirror = half_field(
        np.conj(minus), np.conj(tangential_minus), np.conj(plus), np.conj(tangential)
    )
    phase = np.exp(1j * model.pole_pairs * main.angles)[:, None]
    rest = stress.pair(turning, turning, radius)
    direct = 2.0 * stress.pair(turning, field, radius) * phase
    mirrored = 2.0 * stress.pair(turning, mirror, radius)
    return rest, direct, np.asarray(mirrored * np.conj(phase))


def suspension_force(
    batch: BatchField,
    solution: Solution,
    small: ComplexArray,
    added: tuple[ComplexArray, ComplexArray] | None = None,
) -> tuple[Force, bool]:
    """Force over the whole turn, see `force_parts`.

    Also tells whether the mean force follows the phasor (True) or its conjugate.
    """
    force = whole_turn(batch, *force_parts(batch, solution, small, added))
    family = batch.model.task.winding.family
    return force, family.suspension_pole_pairs > family.pole_pairs


def whole_turn(
    batch: BatchField, rest: ComplexArray, direct: ComplexArray, mirrored: ComplexArray
) -> Force:
    """Continue 60 electrical degrees to the whole turn and interpolate.

    After m sixths the picture is turned by j slots, and the suspension currents with it up to a
    phase: C[s + j] = C[s] exp(j beta).
    """
    model = batch.model
    winding, symmetry = model.task.winding, model.symmetry
    currents = winding.suspension_slot_mmf
    used = int(np.argmax(np.abs(currents)))
    parts: list[list[ComplexArray]] = [[], [], []]
    for j in symmetry.shift:
        picture = np.exp(1j * model.pitch * j)
        beta = currents[(used + j) % model.slots] / currents[used]
        phase = beta * np.exp(1j * model.pole_pairs * model.pitch * j)
        parts[0].append(picture * rest)
        parts[1].append(picture * phase * direct)
        parts[2].append(picture * np.conj(phase) * mirrored)
    whole = [interpolate(np.concatenate(part)) for part in parts]
    count = whole[0].shape[0]
    return Force(2.0 * np.pi * np.arange(count) / count, whole[0], whole[1], whole[2])


def interpolate(samples: ComplexArray) -> ComplexArray:
    """Trigonometric interpolation of a period along the first axis to `FINE` times the points."""
    count = samples.shape[0]
    spectrum = np.fft.fft(samples, axis=0)
    wide = np.zeros((FINE * count, *samples.shape[1:]), dtype=np.complex128)
    half = (count - 1) // 2
    wide[: half + 1] = spectrum[: half + 1]
    wide[FINE * count - half :] = spectrum[count - half :]
    if count % 2 == 0:
        wide[half + 1] = 0.5 * spectrum[half + 1]
        wide[-half - 1] = 0.5 * spectrum[half + 1]
    return np.asarray(np.fft.ifft(wide, axis=0) * FINE)


def suspension_loads(batch: BatchField) -> tuple[FloatArray, FloatArray]:
    """Real and imaginary right-hand side of one ampere-turn of suspension, (size, LANES)."""
    topology = batch.model.suspension
    currents = batch.model.task.winding.suspension_slot_mmf[: topology.lattice.slots]
    loads = []
    for part in (currents.real, currents.imag):
        load = np.zeros((topology.size, LANES))
        batch.add_currents(load, topology, np.repeat(part[:, None], LANES, axis=1))
        loads.append(load)
    return loads[0], loads[1]


def fundamental_linkage(batch: BatchField, unloaded: Solution) -> ComplexArray:
    """Phasor (LANES,) of the magnets' flux linkage of one phase, one turn per coil, Wb/m.

    All slots see the same potential at other times, so its Fourier component over slots and over
    one cogging period together is the exact fundamental in time. The space vector is
    2/3 sum over slots of conj(C) A, C being the torque currents.
    """
    model = batch.model
    mean = _slot_fundamental(batch, unloaded)
    slot = np.arange(model.slots)
    currents = model.task.winding.torque_slot_mmf
    weight = np.sum(np.conj(currents) * np.exp(-1j * model.pole_pairs * model.pitch * slot))
    return np.asarray(2.0 / 3.0 * weight * mean)


def _slot_fundamental(batch: BatchField, solution: Solution) -> ComplexArray:
    model = batch.model
    slot = np.arange(model.symmetry.torque.slots)
    space = np.exp(1j * model.pole_pairs * model.pitch * slot)
    time = np.exp(-1j * model.pole_pairs * solution.waves.angles)
    return np.asarray(
        np.einsum("t,s,tsl->l", time, space, solution.linkage) / (slot.size * time.size)
    )


def loaded_inductance(batch: BatchField, loaded: Solution, ampere_turns: FloatArray) -> FloatArray:
    """Flux linkage in phase with the torque current over that current, (LANES,), H/m.

    The magnets' flux is a quarter period behind the current and drops out.
    """
    model = batch.model
    sector = model.symmetry.torque
    currents = model.task.winding.torque_slot_mmf[: sector.slots]
    vector = 2.0 / 3.0 * sector.count * np.einsum("s,tsl->tl", np.conj(currents), loaded.linkage)
    phase = model.pole_pairs * loaded.waves.angles + model.symmetry.torque_phase
    along = np.real(vector * np.exp(-1j * phase)[:, None]).mean(axis=0)
    return np.asarray(along / ampere_turns)


def suspension_inductance(batch: BatchField, small: ComplexArray) -> FloatArray:
    """Flux linkage per suspension current at the duty's saturation, (LANES,), H/m.

    The part that turns with the current; the field being the real part of `small` times the
    current phasor, half of the space vector of `small` belongs to it.
    """
    model = batch.model
    sector = model.symmetry.suspension
    currents = model.task.winding.suspension_slot_mmf[: sector.slots]
    means = batch.slot_means(model.suspension, small)
    vector = 1.0 / 3.0 * sector.count * np.einsum("s,tsl->tl", np.conj(currents), means)
    return np.asarray(vector.real.mean(axis=0))
