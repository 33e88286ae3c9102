"""Saturation: how much magnetic voltage teeth, yoke and rotor core take at the duty.

The iron is brought into the linear gap model by its secant permeability, one number each for
teeth, yoke and core, found where the flux that the iron lets through equals the flux it was
computed for. The wave of each part is taken as sinusoidal with the peak that the slotted field
has, and the fundamental of its magnetic voltage counts (describing function; the lumped circuit
with iron drop of Pyrhonen, Jokinen, Hrabovcova, Design of Rotating Electrical Machines, 2014,
ch. 3). A small field on top, the suspension's, sees the mean differential permeability instead.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic.gap import Iron
from evaluators.analytic.network import YokePath
from evaluators.analytic.rotor import (
    MU_0,
    MagnetSource,
    RotorRadii,
    core_share,
    response,
    source,
)
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.materials.magnetization import MagnetizationCurve

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

ROUNDS = 10  # of regula falsi for the flux share; 6 leave less than 1e-7
# Gauss-Legendre points of a quarter period: the integrand is smooth but for the knee.
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(8)
_QUARTER = 0.25 * np.pi * (1.0 + _NODES)
_SINE = np.sin(_QUARTER)
_WEIGHT = _WEIGHTS * 0.5


def secant_reluctivity(curve: MagnetizationCurve, peak: FloatArray) -> FloatArray:
    """Fundamental of H over B for B = peak sin(t), (n,), m/H."""
    wave = np.maximum(peak, 1e-6)[:, None] * _SINE
    return np.asarray(
        2.0 * np.sum(_WEIGHT * curve.field(wave) * _SINE, axis=1) / np.maximum(peak, 1e-6)
    )


def mean_differential_reluctivity(curve: MagnetizationCurve, peak: FloatArray) -> FloatArray:
    """Mean of dH/dB over B = peak sin(t), (n,), m/H."""
    wave = peak[:, None] * _SINE
    return np.asarray(np.sum(_WEIGHT * curve.differential_reluctivity(wave), axis=1))


@dataclass(frozen=True)
class Paths:
    """Flux paths of n designs with perfect iron at the duty.

    Attributes
    ----------
    magnet, current : arrays (n,), complex, Wb/m
        Slot potential of the fundamental by the magnets and by the torque current.
    reaction : array (n,)
        Slot potential of the class of p by mu0 I_j = exp(j 2 pi p j / Q).
    tooth_peak, yoke_peak, core_peak : arrays (n,), T
        Largest mean flux densities.
    """

    magnet: ComplexArray
    current: ComplexArray
    reaction: FloatArray
    tooth_peak: FloatArray
    yoke_peak: FloatArray
    core_peak: FloatArray


@dataclass(frozen=True)
class Steels:
    """Magnetisation curves of both stacks, and whether the shaft carries flux too."""

    stator: MagnetizationCurve
    rotor: MagnetizationCurve
    shaft_magnetic: bool


@dataclass(frozen=True)
class SaturatedIron:
    """Iron for the main field and for a small field on top of it, and what share of flux is left.

    `share` (n,) is the fundamental flux over that with perfect iron.
    """

    main: Iron
    small: Iron
    share: FloatArray


def saturate(
    sections: CrossSections,
    radii: RotorRadii,
    magnetisation: tuple[FloatArray, FloatArray],
    paths: Paths,
    steels: Steels,
) -> SaturatedIron:
    """Find the iron that fits the flux it lets through.

    Parameters
    ----------
    magnetisation : pair of arrays (n, 1), T
        Of the fundamental, from `evaluators.analytic.rotor.magnetisation`.
    paths : Paths
        With perfect iron.
    """
    order = np.array([sections.family.pole_pairs])
    perfect = np.abs(paths.magnet + paths.current)
    slots = sections.family.slots
    tooth_shape = (sections.slot_radius - sections.bore_radius) / sections.tooth_width
    behind = YokePath.of(sections)
    smooth_source = source(radii, *magnetisation, order, np.zeros_like(magnetisation[0])).bore[:, 0]
    smooth_response = response(radii, order, np.zeros_like(magnetisation[0]))[:, 0]
    zero = np.zeros_like(perfect)
    hole = zero if steels.shaft_magnetic else sections.shaft_radius / sections.core_radius

    def iron(share: FloatArray, small: bool) -> Iron:
        reluctivity = mean_differential_reluctivity if small else secant_reluctivity
        tooth = reluctivity(steels.stator, share * paths.tooth_peak)
        yoke = reluctivity(steels.stator, share * paths.yoke_peak)
        root = reluctivity(steels.stator, share * behind.spread * paths.yoke_peak)
        core = reluctivity(steels.rotor, share * paths.core_peak)
        return Iron(
            tooth=MU_0 * tooth * tooth_shape,
            yoke=MU_0
            * (yoke * behind.slot + root * behind.spread * behind.root)
            / sections.yoke_thickness,
            core_permeability=1.0 / (MU_0 * core),
            core_ratio=hole,
        )

    def passed(share: FloatArray) -> FloatArray:
        """Share of flux that iron saturated by `share` lets through; falls as `share` grows."""
        state = iron(share, small=False)
        core = state.core_admittance(radii.recoil_permeability, order)
        # The core weakens the magnets as a smooth gap's, and currents as the rotor's response.
        weaker = response(radii, order, core)[:, 0] / smooth_response
        driven = source(radii, *magnetisation, order, core).bore[:, 0] / smooth_source
        stator = state.stator_voltage(slots, order)[:, 0] * paths.reaction * weaker
        flux = (paths.magnet * driven + paths.current * weaker) / (1.0 + stator)
        return np.asarray(np.abs(flux) / perfect)

    share = _fixed_point(passed, np.ones_like(perfect))
    return SaturatedIron(main=iron(share, small=False), small=iron(share, small=True), share=share)


def _fixed_point(passed: Callable[[FloatArray], FloatArray], high: FloatArray) -> FloatArray:
    """Where a falling function equals its argument, (n,), between 0 and `high`.

    Regula falsi that halves the value kept at an end which stays twice, the Illinois variant
    (Dowell and Jarratt, BIT 11 (1971) 168-174). Each row takes the same fixed number of rounds.
    """
    low = np.zeros_like(high)
    above, below = passed(low) - low, passed(high) - high
    share = high
    kept = np.zeros(high.shape)  # 1 if the lower end stayed last time, -1 if the upper
    for _ in range(ROUNDS):
        apart = above - below
        share = low + (high - low) * above / np.where(apart > 0.0, apart, 1.0)
        left = passed(share) - share
        more = left > 0.0
        low, high = np.where(more, share, low), np.where(more, high, share)
        above = np.where(more, left, np.where(kept > 0.0, 0.5 * above, above))
        below = np.where(more, np.where(kept < 0.0, 0.5 * below, below), left)
        kept = np.where(more, -1.0, 1.0)
    return share


def core_peak(sections: CrossSections, at_core: ComplexArray, steels: Steels) -> FloatArray:
    """Density that the core's permeability is taken at from the fundamental of A there, (n,) T.

    Mean of that over the thickness that carries flux (the shaft too, if magnetic) and of that at
    the surface of a core of uniform permeability, n coth(n ln(Ro/Ri)) / Ro per potential.
    """
    outer = sections.core_radius
    inner = np.zeros_like(outer) if steels.shaft_magnetic else sections.shaft_radius
    flux = 2.0 * np.abs(at_core)
    order = sections.family.pole_pairs
    with np.errstate(divide="ignore"):
        surface = order / np.tanh(order * np.log(outer / inner)) / outer
    return np.asarray(0.5 * (flux / (outer - inner) + flux * surface))


def at_core(
    radii: RotorRadii,
    orders: NDArray[np.int64],
    magnets: ComplexArray,
    smooth: MagnetSource,
    current: ComplexArray,
    core: FloatArray,
) -> ComplexArray:
    """A at the core that stands still in the rotor, by magnet order, (n, v).

    Parameters
    ----------
    orders : array (v,)
    magnets : array (n, v)
        Slotted field at the bore.
    smooth : MagnetSource
        Of the same orders.
    current : array (n,)
        Fundamental of the torque current at the bore.
    core : array (n, v)
        Core admittance.
    """
    slotted = magnets - smooth.bore
    slotted[:, 0] += current
    return np.asarray(smooth.core + core_share(radii, orders, core) * slotted)
