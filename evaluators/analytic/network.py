"""Teeth, yoke and tooth tips as a nonlinear circuit around the slots, at every rotor position.

Seen from the gap, iron that takes magnetic voltage is a current in each slot, minus the voltage
lost on the way around it (`evaluators.analytic.gap`). With a_j the potential at the bottom of slot
j, the yoke behind it carries a_j and tooth j carries a_j - a_(j-1), less the part d_j of the slots'
own leakage that enters it only towards its root, so

    a = alone - G V(a) - G_t F(y),
    y = seen - G_t' V(a) - B F(y),
    V_j = U(a_j - a_(j-1) - d_j) - U(a_(j+1) - a_j - d_(j+1)) + Y(a_j),

where `alone` and `seen` are the potentials and the fluxes y of the flanges beside each slot mouth
under perfect iron, U, Y and F the voltages of a tooth, of one slot pitch of yoke and of a flange by
the steel's curve, and G, G_t, B the answers of the gap (`evaluators.analytic.answers`). Newton's
method solves it for all designs and positions (`evaluators.analytic.newton`). A small current on
top, the suspension's, meets the differential reluctance that each part has at that position, so
saturation that travels with the rotor turns and modulates the force (magnetic circuits with one
branch per tooth: Ostovic, Dynamics of Saturated Electric Machines, 1989).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic import newton
from evaluators.analytic.answers import Answers
from evaluators.analytic.tips import PLACES, WEIGHTS, ToothTips
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.materials.magnetization import MagnetizationCurve

FloatArray = NDArray[np.float64]

ITERATIONS = 30
TOLERANCE = 1e-10  # of the largest potential of a design; Newton passes it in one step more
BULGE = 0.5 / np.pi
"""Where a tooth joins, yoke flux bulges into its root as a stream into a deep slit of its wall:
with dz/dt = (w/pi) sqrt(t^2 - 1)/t (Schwarz and Christoffel) the stream far away is that of a plane
wall and a dipole which adds the area w^2 / (2 pi) (own derivation), a thickness of w / (2 pi)."""


@dataclass(frozen=True)
class YokePath:
    """One slot pitch of yoke of n designs, at its middle radius; arrays (n,).

    Attributes
    ----------
    slot, root : m
        Lengths behind the slot and behind the tooth.
    spread : 1
        Density behind the tooth over that behind the slot, because the field bulges into the tooth.
    """

    slot: FloatArray
    root: FloatArray
    spread: FloatArray

    @classmethod
    def of(cls, sections: CrossSections) -> YokePath:
        """Yoke of the given cross-sections."""
        radius = 0.5 * (sections.slot_radius + sections.outer_radius)
        slot = sections.slot_angle(sections.slot_radius)
        thick = sections.yoke_thickness
        return cls(
            slot=radius * slot,
            root=radius * (2.0 * np.pi / sections.family.slots - slot),
            spread=thick / (thick + BULGE * sections.tooth_width),
        )


@dataclass(frozen=True)
class StatorCircuit:
    """Stator iron of n designs.

    Attributes
    ----------
    tooth_width, tooth_length : arrays (n,), m
    yoke_thickness : array (n,), m
    yoke : YokePath
    tips : ToothTips
    profile : array (n, 4)
        Change of a flange's flux at `PLACES` over the change of its mean.
    curve : MagnetizationCurve
    """

    tooth_width: FloatArray
    tooth_length: FloatArray
    yoke_thickness: FloatArray
    yoke: YokePath
    tips: ToothTips
    profile: FloatArray
    curve: MagnetizationCurve

    @classmethod
    def of(
        cls,
        sections: CrossSections,
        tips: ToothTips,
        profile: FloatArray,
        curve: MagnetizationCurve,
    ) -> StatorCircuit:
        """Circuit of the given cross-sections."""
        return cls(
            tooth_width=sections.tooth_width,
            tooth_length=sections.slot_radius - sections.bore_radius,
            yoke_thickness=sections.yoke_thickness,
            yoke=YokePath.of(sections),
            tips=tips,
            profile=profile,
            curve=curve,
        )

    @property
    def sizes(self) -> FloatArray:
        """The table of dimensions that the kernels read, (n, COLUMNS)."""
        table = np.empty((self.tooth_width.size, newton.COLUMNS))
        table[:, newton.TOOTH_WIDTH] = self.tooth_width
        table[:, newton.TOOTH_LENGTH] = self.tooth_length
        table[:, newton.YOKE_THICKNESS] = self.yoke_thickness
        table[:, newton.YOKE_LENGTH] = self.yoke.slot
        table[:, newton.ROOT_THICKNESS] = self.yoke_thickness / self.yoke.spread
        table[:, newton.ROOT_LENGTH] = self.yoke.root
        table[:, newton.TIP_SLOPE] = self.tips.steepness
        places = len(PLACES)
        table[:, newton.TIP_THICKNESS : newton.TIP_THICKNESS + places] = self.tips.thickness
        table[:, newton.TIP_LENGTH : newton.TIP_LENGTH + places] = self.tips.stretches
        table[:, newton.TIP_PROFILE : newton.TIP_PROFILE + places] = self.profile
        return table


@dataclass(frozen=True)
class Sources:
    """What drives the circuit under perfect iron, n designs, k positions, Q slots.

    Attributes
    ----------
    slots : array (n, k, Q), Wb/m
        Potentials at the bottom of the slots.
    tips : array (n, k, Q, 2, 4), Wb/m
        Flux of the flanges before and behind each slot at `PLACES`, positive against the angle.
    faces : array (n, k, Q, 2), T
        Density that enters by the flange's face, positive if it adds to that flux.
    late : array (n, k, Q), Wb/m
        Leakage d that enters the tooth before each slot only towards its root.
    """

    slots: FloatArray
    tips: FloatArray
    faces: FloatArray
    late: FloatArray


@dataclass(frozen=True)
class CircuitState:
    """Solution at every position.

    Attributes
    ----------
    potential : array (n, k, Q), Wb/m
        At the bottom of the slots.
    tooth_flux : array (n, k, Q), Wb/m
        Mean over the length of the tooth before each slot.
    lost, lost_in_teeth : array (n, k, Q), Wb/m
        mu0 times the voltage lost around each slot, and the part of it in the two teeth.
    tips_lost : array (n, k, Q, 2), Wb/m
        mu0 times the voltage of the flanges before and behind each slot.
    tooth_slope, yoke_slope : arrays (n, k, Q)
        mu0 times differential reluctance.
    tips_slope : array (n, k, Q, 2)
        The same of the flanges.
    """

    potential: FloatArray
    tooth_flux: FloatArray
    lost: FloatArray
    lost_in_teeth: FloatArray
    tips_lost: FloatArray
    tooth_slope: FloatArray
    yoke_slope: FloatArray
    tips_slope: FloatArray


def solve(
    circuit: StatorCircuit, answers: Answers, sources: Sources, start: FloatArray, sign: int
) -> CircuitState:
    """Slot potentials at every position.

    Parameters
    ----------
    answers : Answers
        Folded if the pattern repeats.
    sources : Sources
        Of one period of the pattern.
    start : array (n, k, q), Wb/m
        First guess.
    sign : int
        +1 or -1: the pattern repeats, or repeats reversed, after q slots.
    """
    mean = sources.tips @ WEIGHTS
    uneven = sources.tips - mean[..., None] * circuit.profile[:, None, None, None, :]
    potential, tooth_flux, tooth, lost, tooth_slope, yoke_slope, tips_lost, tips_slope = (
        newton.solve(
            np.ascontiguousarray(sources.slots),
            mean,
            uneven,
            np.ascontiguousarray(sources.faces),
            np.ascontiguousarray(sources.late),
            np.ascontiguousarray(start),
            TOLERANCE * np.abs(sources.slots).max(axis=(1, 2)),
            float(sign),
            circuit.sizes,
            *_pieces(circuit.curve),
            answers.slots,
            answers.to_tips,
            answers.own,
            ITERATIONS,
        )
    )
    after = np.roll(tooth, -1, axis=2)
    after[:, :, -1] *= sign
    return CircuitState(
        potential=potential,
        tooth_flux=tooth_flux,
        lost=lost,
        lost_in_teeth=tooth - after,
        tips_lost=tips_lost,
        tooth_slope=tooth_slope,
        yoke_slope=yoke_slope,
        tips_slope=tips_slope,
    )


def _pieces(curve: MagnetizationCurve) -> tuple[FloatArray, FloatArray]:
    """Flux densities where the cubic pieces of H(B) begin, and their coefficients (k, 4)."""
    b, h, s = curve.flux_density_points, curve.field_points, curve.slopes
    width, secant = np.diff(b), np.diff(h) / np.diff(b)
    cubic = np.zeros((b.size, 4))
    cubic[:, 0], cubic[:, 1] = h, s
    cubic[-1, 1] = 1.0 / newton.MU_0
    cubic[:-1, 2] = (3.0 * secant - 2.0 * s[:-1] - s[1:]) / width
    cubic[:-1, 3] = (s[:-1] + s[1:] - 2.0 * secant) / width**2
    cubic[0, 2] = 0.0  # the first piece is odd in B
    return np.ascontiguousarray(b), cubic


def unfold(state: CircuitState, slots: int, sign: int) -> CircuitState:
    """The state of `slots` slots from that of one period."""
    period = state.potential.shape[2]
    repeats = slots // period
    signs = np.repeat(float(sign) ** np.arange(repeats), period)

    def wide(values: FloatArray, turned: FloatArray) -> FloatArray:
        extra = (1,) * (values.ndim - 3)
        repeated = np.tile(values, (1, 1, repeats, *extra))
        return np.asarray(repeated * turned.reshape(-1, *extra))

    same = np.ones(slots)
    return CircuitState(
        potential=wide(state.potential, signs),
        tooth_flux=wide(state.tooth_flux, signs),
        lost=wide(state.lost, signs),
        lost_in_teeth=wide(state.lost_in_teeth, signs),
        tips_lost=wide(state.tips_lost, signs),
        tooth_slope=wide(state.tooth_slope, same),
        yoke_slope=wide(state.yoke_slope, same),
        tips_slope=wide(state.tips_slope, same),
    )


def small_lost(
    state: CircuitState,
    answers: Answers,
    slots: FloatArray,
    tips: FloatArray,
    late: FloatArray,
    sign: int,
) -> tuple[FloatArray, FloatArray]:
    """mu0 times the voltages that small additional sources lose.

    Parameters
    ----------
    state : CircuitState
        Of at least the q slots after which the small sources repeat with `sign`.
    answers : Answers
        Folded to q slots.
    slots, late : arrays (n, k, q, r), Wb/m
        Of r sources, see `Sources`.
    tips : array (n, k, q, 2, r), Wb/m
        Mean flux of the flanges.

    Returns
    -------
    lost, tips_lost : arrays (n, k, q, r) and (n, k, q, 2, r), Wb/m
    """
    period = slots.shape[2]
    lost, tips_lost = newton.small(
        np.ascontiguousarray(slots),
        np.ascontiguousarray(tips),
        np.ascontiguousarray(late),
        np.ascontiguousarray(state.tooth_slope[:, :, :period]),
        np.ascontiguousarray(state.yoke_slope[:, :, :period]),
        np.ascontiguousarray(state.tips_slope[:, :, :period]),
        float(sign),
        answers.slots,
        answers.to_tips,
        answers.own,
    )
    return lost, tips_lost
