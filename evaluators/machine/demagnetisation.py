"""Whether the magnets keep their magnetisation: armature reaction, fault current, knee."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.checks import require, require_choice
from evaluators.machine.quantity import MU_0, FloatArray, floats
from evaluators.machine.winding.winding import Winding

POSITIONS = 6  # rotor positions over 60 electrical degrees, after which currents repeat
POINTS = 12  # looked at on each pole
REACH = 2  # orders up to this many times the slots; higher ones hardly reach the magnets


@dataclass(frozen=True)
class Fault:
    """The fault the magnets must survive.

    Attributes
    ----------
    kind : str
        ``short circuit`` of all three phases at the duty, or ``current``, a stated one.
    current_ratio : float
        For ``current``: peak of the current that opposes the magnets over the peak torque current
        of the duty.
    """

    kind: Literal["short circuit", "current"] = "short circuit"
    current_ratio: float = 2.0

    def __post_init__(self) -> None:
        require_choice("fault", "kind", self.kind, ("short circuit", "current"))
        require("fault", "current_ratio", self.current_ratio, 0.0, 20.0)


def short_circuit_peak(
    emf: ArrayLike,
    current: ArrayLike,
    resistance: ArrayLike,
    reactance: ArrayLike,
) -> FloatArray:
    """Return the largest current along the negative magnet axis after a three-phase short circuit.

    In the frame of the rotor the current moves from its start i0 (in phase with the EMF) to its
    steady value i1 as i1 + (i0 - i1) exp(-(R/X + j) w t), a shrinking circle; the result is the
    exact extreme of that curve. Constant speed and inductance, no saliency, no damping by the
    rotor. Krause et al., *Analysis of Electric Machinery*, for the equations (from memory).

    Parameters
    ----------
    emf, current, resistance, reactance
        Peak phase EMF in V, peak torque current in A, resistance and reactance in ohm, all of one
        phase, or all per turn; shape (n,).

    Returns
    -------
    array (n,)
        Peak in A (or ampere-turns), positive.
    """
    e, i0, r, x = (floats(value) for value in (emf, current, resistance, reactance))
    # Complex current, real part along the magnet axis, imaginary part with the EMF.
    steady = -1j * e / (r + 1j * x)
    start = 1j * i0 - steady
    # exp(-j w t) turns the radius clockwise until it points along the negative axis; shrinking
    # brings the extreme forward by the angle whose tangent is R/X.
    decay = r / x
    lead = np.arctan(decay)
    turned = np.mod(np.angle(start) - np.pi - lead, 2.0 * np.pi)
    return np.asarray(-steady.real + np.abs(start) * np.cos(lead) * np.exp(-decay * turned))


@dataclass(frozen=True)
class ArmatureReaction:
    """Field of a winding's torque current against the magnets, for all designs of one family.

    Current sheets at the slot openings between a smooth bore and the rotor core, both infinitely
    permeable, magnets as air: Zhu, Howe, "Instantaneous magnetic field distribution in brushless
    permanent magnet DC motors, Part II: armature-reaction field", *IEEE Trans. Magn.* 29(1), 1993.
    Saturation lowers it, so a margin from it is on the safe side.

    Attributes
    ----------
    orders : array (h,)
        Spatial orders that the winding makes.
    pattern : array (h, k)
        Opposing density of each order at k points of poles and positions, per amplitude of the
        order.
    """

    orders: FloatArray
    pattern: FloatArray

    @classmethod
    def of(cls, winding: Winding) -> ArmatureReaction:
        """Prepare the field of a winding."""
        family = winding.family
        slots, p = family.slots, family.pole_pairs
        orders = np.arange(1, REACH * slots + 1)
        mmf = winding.slot_mmf("torque")
        place = np.exp(-2j * np.pi / slots * orders[:, None] * (np.arange(slots) + 0.5))
        ahead, back = place @ mmf, place @ np.conj(mmf)
        # The phasor whose fundamental stands against the magnet: j conj(u) back_p = -|back_p|.
        phasor = np.conj(1j * np.abs(back[p - 1]) / back[p - 1])
        turn = np.pi / (3.0 * p) * np.arange(POSITIONS) / POSITIONS
        share = (np.arange(POINTS) + 0.5) / POINTS - 0.5
        pole = np.arange(2 * p)
        angle = np.pi / p * (pole[:, None] + share)
        opposed = -np.where(pole % 2 == 0, 1.0, -1.0)[:, None]
        waves = 0.5 * (
            phasor * ahead[:, None] * np.exp(1j * p * turn)
            + np.conj(phasor) * back[:, None] * np.exp(-1j * p * turn)
        )
        theta = turn[:, None, None] + angle
        field = 1j * waves[:, :, None, None] * np.exp(1j * orders[:, None, None, None] * theta)
        pattern = 2.0 * np.real(field) * opposed
        present = np.abs(waves).max(axis=1) > 1e-9 * np.abs(waves).max()
        return cls(orders[present].astype(np.float64), pattern[present].reshape(present.sum(), -1))

    def per_ampere_turn(
        self,
        core_radius: FloatArray,
        magnet_radius: FloatArray,
        bore_radius: FloatArray,
        slot_opening_angle: FloatArray,
    ) -> FloatArray:
        """Return the largest opposing radial density on the magnets per peak ampere-turn, (n,) T/A.

        Of the current along the negative magnet axis, over all poles and rotor positions, at the
        outer surface of the magnets. Radii in m, angle in rad, shape (n,).
        """
        n = self.orders
        bore, surface = bore_radius[:, None], magnet_radius[:, None]
        core = (core_radius[:, None] / bore) ** (2.0 * n)
        out = (surface / bore) ** n
        radial = (bore / surface) * (out + core / out) / (1.0 - core)
        sheet = np.sinc(n * slot_opening_angle[:, None] / (2.0 * np.pi)) / (2.0 * np.pi * bore)
        return np.asarray((MU_0 * sheet * radial @ self.pattern).max(axis=1))
