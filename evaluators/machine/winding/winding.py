"""The winding of one family: where every coil side lies, and the fields and voltages it makes.

A double-layer three-phase winding of Q coils is split, per phase, into two equal groups a and b.
Torque current flows through both in the same sense, suspension current through b reversed, so
that the same copper makes a p-pole-pair and a ps = p +- 1 pole-pair field (Chiba et al.,
*Magnetic Bearings and Bearingless Drives*, 2005; Severson et al., IEEE Trans. Ind. Appl. 53(5),
2017; both from memory).

Conventions: tooth j is centred at 2 pi j / Q, slot j at 2 pi (j + 1/2) / Q. Coil i of pitch y has
its return side (-z) in slot i - 1 and its go side (+z) in slot i - 1 + y, so its axis lies at
2 pi (i + (y - 1)/2) / Q and a positive current drives flux outwards, from rotor to stator. Flux
linkage per metre and turn is A_z(go) - A_z(return). Phase k carries
Re(I exp(j (omega t - sequence 2 pi k / 3))).
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from evaluators.machine.winding import spectrum as winding_spectrum
from evaluators.machine.winding.spectrum import MmfSpectrum
from evaluators.machine.winding.star import (
    PHASES,
    ComplexArray,
    IntArray,
    WindingError,
    phase_sequence,
    unit_phasors,
)

FloatArray = NDArray[np.float64]
Connection = Literal["torque", "suspension"]

ROUNDING = 1e-12
"""Winding factors below this are sums of unit phasors that cancel but for rounding."""


@dataclass(frozen=True)
class Family:
    """One choice of slots, torque and suspension pole pairs and coil pitch (in slots).

    Raises
    ------
    WindingError
        If a number is out of its range, with name, value and limit.
    """

    slots: int
    pole_pairs: int
    suspension_pole_pairs: int
    coil_pitch: int

    def __post_init__(self) -> None:
        for name in ("slots", "pole_pairs", "suspension_pole_pairs", "coil_pitch"):
            value = getattr(self, name)
            if isinstance(value, bool) or not isinstance(value, int) or value < 1:
                msg = f"{name} = {value!r} must be a whole number of at least 1"
                raise WindingError(msg, "whole numbers")
        if abs(self.suspension_pole_pairs - self.pole_pairs) != 1:
            msg = (
                f"suspension_pole_pairs = {self.suspension_pole_pairs} must differ from "
                f"pole_pairs = {self.pole_pairs} by exactly 1: only such field pairs make a force"
            )
            raise WindingError(msg, "suspension pole pairs")
        if self.coil_pitch > self.slots // 2:
            msg = (
                f"coil_pitch = {self.coil_pitch} must not exceed half the slots, "
                f"{self.slots // 2}: a longer coil is a shorter one turned round"
            )
            raise WindingError(msg, "coil pitch")

    @property
    def id(self) -> str:
        """Short name of slots and pole pairs, such as "Q12p4s5"; the pitch is not part of it."""
        return f"Q{self.slots}p{self.pole_pairs}s{self.suspension_pole_pairs}"

    @property
    def poles(self) -> int:
        """Number of magnet poles, 2p."""
        return 2 * self.pole_pairs

    @property
    def cogging_periods(self) -> int:
        """Cogging periods per revolution, lcm(Q, 2p)."""
        return math.lcm(self.slots, self.poles)

    @property
    def no_load_force_order(self) -> int:
        """Lowest order of the no-load radial force, gcd(Q, 2p); 1 is a built-in one-sided pull."""
        return math.gcd(self.slots, self.poles)

    def electrical_frequency(self, speed: float) -> float:
        """Electrical frequency in Hz at a mechanical speed in rad/s."""
        return self.pole_pairs * speed / (2.0 * math.pi)


class CoilSide(NamedTuple):
    """One coil side; directions are +1 for current along +z at positive phase current."""

    slot: int
    layer: int
    """1 holds the return sides, 2 the go sides."""
    coil: int
    phase: int
    group: int
    sense: int
    torque_direction: int
    suspension_direction: int


class CoilString(NamedTuple):
    """The coils of one phase and group in series, in the order in which they are joined.

    All ends are on the side of the machine that -z points to. Positive current enters coil
    `coils[n]` at its side in slot `starts[n]`, runs along +z there, and leaves it in
    `finishes[n]`. For suspension the two ends of each string of group b are exchanged.
    """

    phase: int
    group: int
    coils: tuple[int, ...]
    starts: tuple[int, ...]
    finishes: tuple[int, ...]


def _read_only(array: NDArray[np.generic]) -> None:
    array.setflags(write=False)


@dataclass(frozen=True, eq=False)
class Winding:
    """The layout of one family; `families.design_winding` makes it, this class describes it.

    Parameters
    ----------
    family : Family
    phase, group, sense : (Q,) integer arrays
        Per coil: phase 0 to 2, group 0 (a) or 1 (b), +1 if wound as stated above, -1 if reversed.
        Copied and made read-only.

    Raises
    ------
    ValueError
        If an array has the wrong shape or a value outside its set.
    """

    family: Family
    phase: IntArray
    group: IntArray
    sense: IntArray

    def __post_init__(self) -> None:
        allowed = {"phase": (0, 1, 2), "group": (0, 1), "sense": (-1, 1)}
        for name, values in allowed.items():
            array = np.array(getattr(self, name), dtype=np.int64)
            if array.shape != (self.family.slots,):
                msg = f"{name} has shape {array.shape} but must have ({self.family.slots},)"
                raise ValueError(msg)
            if not np.isin(array, values).all():
                msg = f"{name} = {array.tolist()} must hold only {values}"
                raise ValueError(msg)
            _read_only(array)
            object.__setattr__(self, name, array)

    def __reduce__(self) -> tuple[object, ...]:
        # Rebuilding keeps the arrays read-only in worker processes.
        return Winding, (self.family, self.phase, self.group, self.sense)

    @cached_property
    def coil_slots(self) -> IntArray:
        """Slots of each coil's return and go side, (Q, 2)."""
        slots, pitch = self.family.slots, self.family.coil_pitch
        first = np.arange(slots, dtype=np.int64) - 1
        array = np.stack([first, first + pitch], axis=1) % slots
        _read_only(array)
        return array

    @cached_property
    def coil_axes(self) -> FloatArray:
        """Angle of each coil's axis in mechanical radians, (Q,)."""
        slots, pitch = self.family.slots, self.family.coil_pitch
        array = 2.0 * np.pi * (np.arange(slots) + 0.5 * (pitch - 1)) / slots
        _read_only(array)
        return array

    def coil_weights(self, connection: Connection) -> IntArray:
        """+1 or -1 per coil, (Q,): sense, for suspension times -1 in group b."""
        if connection == "torque":
            return self.sense
        return self.sense * (1 - 2 * self.group)

    @cached_property
    def torque_sequence(self) -> int:
        """+1 or -1, such that torque current turns the field of order p counter-clockwise.

        Raises WindingError if the phases are not balanced at p.
        """
        return phase_sequence(self.phase_phasors("torque", self.family.pole_pairs)[:, 0])

    @cached_property
    def suspension_sequence(self) -> int:
        """+1 or -1, such that suspension current turns the field of order ps counter-clockwise.

        Raises WindingError if the phases are not balanced at ps.
        """
        order = self.family.suspension_pole_pairs
        return phase_sequence(self.phase_phasors("suspension", order)[:, 0])

    def _slot_mmf(self, connection: Connection) -> ComplexArray:
        sequence = self.torque_sequence if connection == "torque" else self.suspension_sequence
        current = unit_phasors(-sequence * self.phase, PHASES)
        array = self._in_slots(current * self.coil_weights(connection))
        _read_only(array)
        return array

    def _in_slots(self, current: ComplexArray) -> ComplexArray:
        """Sum of coil currents (Q,) in each slot, (Q,)."""
        array = np.zeros(self.family.slots, dtype=np.complex128)
        np.add.at(array, self.coil_slots[:, 0], -current)
        np.add.at(array, self.coil_slots[:, 1], current)
        return array

    def phase_conductors(self, connection: Connection) -> FloatArray:
        """Net conductors of phase one along +z in each slot for one turn per coil, (Q,)."""
        first = self.coil_weights(connection) * (self.phase == 0)
        return self._in_slots(first.astype(np.complex128)).real

    @cached_property
    def torque_slot_mmf(self) -> ComplexArray:
        """Complex slot currents per turn and unit current phasor, torque connection, (Q,).

        Both layers summed: slot s carries N Re(I torque_slot_mmf[s] exp(j omega t)) along +z.
        """
        return self._slot_mmf("torque")

    @cached_property
    def suspension_slot_mmf(self) -> ComplexArray:
        """As `torque_slot_mmf`, for the suspension connection, (Q,)."""
        return self._slot_mmf("suspension")

    def phase_phasors(self, connection: Connection, orders: ArrayLike) -> ComplexArray:
        """Complex winding factor of each phase, (3, n_orders).

        Sum over the phase's coils of weight (exp(j n theta_go) - exp(j n theta_return)) / (2 Q/3);
        the modulus is the winding factor, the argument the electrical position. Orders count per
        revolution and may be negative.
        """
        order = np.atleast_1d(np.asarray(orders, dtype=np.int64))
        slots = self.family.slots
        half_slots = 2 * self.coil_slots + 1  # side angles in units of pi / Q
        sides = unit_phasors(order[:, None, None] * half_slots, 2 * slots)
        coils = (sides[:, :, 1] - sides[:, :, 0]) * self.coil_weights(connection)
        member = self.phase == np.arange(PHASES)[:, None]
        return np.asarray(member @ coils.T / (2.0 * slots / PHASES), dtype=np.complex128)

    def winding_factors(self, orders: ArrayLike) -> tuple[FloatArray, FloatArray]:
        """Winding factors of one phase for torque and suspension current, (n_orders,) each.

        The largest modulus of the three phases, which are equal in a balanced winding.
        """
        torque = np.abs(self.phase_phasors("torque", orders)).max(axis=0)
        suspension = np.abs(self.phase_phasors("suspension", orders)).max(axis=0)
        return torque, suspension

    @cached_property
    def torque_winding_factor(self) -> float:
        """Winding factor of torque current at order p."""
        return float(self.winding_factors(self.family.pole_pairs)[0][0])

    @cached_property
    def suspension_winding_factor(self) -> float:
        """Winding factor of suspension current at order ps."""
        return float(self.winding_factors(self.family.suspension_pole_pairs)[1][0])

    def slot_mmf(self, connection: Connection) -> ComplexArray:
        """`torque_slot_mmf` or `suspension_slot_mmf`, by name."""
        return self.torque_slot_mmf if connection == "torque" else self.suspension_slot_mmf

    def rotating_factors(
        self, connection: Connection, orders: ArrayLike
    ) -> tuple[FloatArray, FloatArray]:
        """Winding factors of the counter-clockwise and clockwise waves, (n_orders,) each."""
        return winding_spectrum.rotating_factors(self.slot_mmf(connection), orders)

    def mmf_spectrum(self, connection: Connection, max_order: int) -> MmfSpectrum:
        """Spectrum of the magnetomotive force per turn and ampere peak, up to `max_order`."""
        return winding_spectrum.mmf_spectrum(self.slot_mmf(connection), max_order)

    def differential_leakage(self, connection: Connection) -> float:
        """Harmonic leakage factor sigma_d referred to order p or ps."""
        family = self.family
        order = family.pole_pairs if connection == "torque" else family.suspension_pole_pairs
        return winding_spectrum.differential_leakage(self.slot_mmf(connection), order)

    @cached_property
    def residual_voltage(self) -> float:
        """Magnet voltage at the suspension terminals over that at the torque terminals.

        The largest, over phases and magnet orders p n (n = 1, 3, 5, ...), of
        |E_a - E_b| at p n over |E_a + E_b| at p, for flux density harmonics that fall as 1/n as
        those of a rectangular wave do. Winding factors repeat with n after 2Q, so that no order
        beyond can exceed those looked at. Rounding is returned as zero.
        """
        multiples = np.arange(1, 2 * self.family.slots, 2, dtype=np.int64)
        difference = self.phase_phasors("suspension", self.family.pole_pairs * multiples)
        ratio = float(np.max(np.abs(difference) / multiples)) / self.torque_winding_factor
        return ratio if ratio > ROUNDING else 0.0

    @cached_property
    def coil_sides(self) -> tuple[CoilSide, ...]:
        """All 2Q coil sides, by slot and layer."""
        sides = []
        for coil in range(self.family.slots):
            phase, group, sense = (
                int(self.phase[coil]),
                int(self.group[coil]),
                int(self.sense[coil]),
            )
            for layer, direction in ((1, -sense), (2, sense)):
                slot = int(self.coil_slots[coil, layer - 1])
                reversal = 1 - 2 * group
                sides.append(
                    CoilSide(
                        slot, layer, coil, phase, group, sense, direction, direction * reversal
                    )
                )
        return tuple(sorted(sides))

    @cached_property
    def connections(self) -> tuple[CoilString, ...]:
        """The six coil strings, by phase and group.

        Coils follow one another counter-clockwise; the widest gap is left between last and first.
        """
        strings = []
        for phase in range(PHASES):
            for group in (0, 1):
                coils = np.flatnonzero((self.phase == phase) & (self.group == group))
                gaps = np.diff(coils, prepend=coils[-1:] - self.family.slots)
                coils = np.roll(coils, -int(np.argmax(gaps)))
                forward = self.sense[coils] > 0
                returns, goes = self.coil_slots[coils].T
                strings.append(
                    CoilString(
                        phase,
                        group,
                        tuple(coils.tolist()),
                        tuple(np.where(forward, goes, returns).tolist()),
                        tuple(np.where(forward, returns, goes).tolist()),
                    )
                )
        return tuple(strings)
