"""State of the rotor in the field: pull when displaced, and what the magnets must bear."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic.gap import GapField, Iron, SlottedGap, with_stator
from evaluators.analytic.rotor import MU_0, response
from evaluators.machine.geometry.cross_sections import CrossSections

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]

# Points over one magnet; the last fiftieth at its edges is left out, because the series of
# harmonics rings there.
_SHARE = np.linspace(-0.98, 0.98, 25)

ANSWERED = 3  # magnet orders to whose displacement the slots answer
POLE_POINTS = 65


def at_order(
    field: GapField, order: int, column: int | None = None, part: str = "potential"
) -> ComplexArray:
    """Coefficient of one order at the bore, (n,) Wb/m.

    Summed over classes unless `column` names one; `part` is ``rising``, ``falling`` or, for their
    sum, ``potential``.
    """
    if column is None:
        here = field.orders == order
        rising, falling = field.rising[:, here].sum(axis=1), field.falling[:, here].sum(axis=1)
    else:
        here = field.orders[column] == order
        rising = field.rising[:, column, here].sum(axis=1)
        falling = field.falling[:, column, here].sum(axis=1)
    if part == "potential":
        return np.asarray(rising + falling)
    return np.asarray(rising if part == "rising" else falling)


def displacement_stiffness(
    bore_radius: FloatArray,
    orders: IntArray,
    rising: FloatArray,
    falling: FloatArray,
    rotor: tuple[FloatArray, FloatArray],
    bore: tuple[FloatArray, FloatArray],
) -> FloatArray:
    """Pull per eccentricity of a field that stands still in the rotor, (n,) N/m per m.

    A displaced order nu is a source of the orders nu - 1 and nu + 1, which the gap answers; with
    eta = tanh of a smooth gap, rho = 1 for a smooth bore,

        4 pi nu^2 / (mu0 R^2) ((nu - 1) |r|^2 (1 - eta) (rho/eta + 1 - rho)
                             + (nu + 1) |f|^2 (1 + eta) (rho/eta - 1 + rho)),

    each bracket at its order, every nu on its own (own derivation, first order in the
    displacement). For a smooth gap it is pi B^2 / (4 mu0) ((nu + 1) (coth + 1) + (nu - 1)
    (coth - 1)) (thin-gap limit by Covo, AIEE Trans. 73, 1954). In a plane field nu = 1 has no
    homopolar path and keeps the second term only.

    Parameters
    ----------
    bore_radius : array (n,), m
    orders : array (v,)
    rising, falling : arrays (n, v), Wb/m
        Sizes of the field's coefficients at the bore.
    rotor : pair of arrays (n, v)
        eta: -n A over R B_theta of the rotor, inverted, at the orders below and above.
    bore : pair of arrays (n, v)
        rho: potential at the bore over that under a smooth, perfect one, below and above.
    """
    nu = orders.astype(np.float64)
    below = rising**2 * (nu - 1.0) * (1.0 - rotor[0]) * (bore[0] / rotor[0] + 1.0 - bore[0])
    above = falling**2 * (nu + 1.0) * (1.0 + rotor[1]) * (bore[1] / rotor[1] - 1.0 + bore[1])
    scale = 4.0 * np.pi / (MU_0 * bore_radius**2)
    return np.asarray(scale * np.sum(nu**2 * (below + above), axis=1))


def beside(orders: IntArray) -> IntArray:
    """Orders beside the lowest magnet orders, which displacement makes; a plane field has no 0."""
    low = orders[:ANSWERED]
    return np.setdiff1d(np.concatenate([low - 1, low + 1]), [0])


def stiffness_of(gap: SlottedGap, magnets: GapField, orders: IntArray, iron: Iron) -> FloatArray:
    """`displacement_stiffness` of the magnets' field, slotted and saturated, (n,) N/m per m.

    `gap` holds the orders `beside` the lowest ones as classes, to whose displacement slots and iron
    of the stator answer; to the others the bore is smooth.
    """
    rising, falling = (
        np.stack([np.abs(at_order(magnets, int(n), k, part)) for k, n in enumerate(orders)], axis=1)
        for part in ("rising", "falling")
    )
    unit = np.ones((rising.shape[0], gap.classes.size), dtype=np.complex128)
    voltage = iron.stator_voltage(gap.slots, gap.classes)
    answered = with_stator(gap.of_magnets(unit), gap.reaction, voltage)
    rotor, bore = [], []
    for near in (orders - 1, orders + 1):
        known = np.where(near == 0, 1, near)
        core = iron.core_admittance(gap.radii.recoil_permeability, known)
        rotor.append(-gap.radii.bore[:, None] / (known * response(gap.radii, known, core)))
        share = np.ones_like(rising)
        for column, order in enumerate(gap.classes):
            found = np.real(at_order(answered, int(order), column))
            share[:, near == order] = found[:, None]
        bore.append(share)
    return displacement_stiffness(
        gap.radii.bore, orders, rising, falling, (rotor[0], rotor[1]), (bore[0], bore[1])
    )


def core_density(
    sections: CrossSections, orders: IntArray, at_core: ComplexArray, shaft_magnetic: bool
) -> FloatArray:
    """Largest density of the core over the pole, mean over the thickness with flux, (n,) T.

    `at_core` (n, v) are the coefficients of A at its surface that stand still in the rotor.
    """
    angle = np.linspace(0.0, np.pi, POLE_POINTS) / sections.family.pole_pairs
    wave = np.exp(1j * orders[:, None] * angle)
    flux = 2.0 * (at_core.real @ wave.real - at_core.imag @ wave.imag)
    inner = 0.0 if shaft_magnetic else sections.shaft_radius
    return np.asarray(np.abs(flux).max(axis=1) / (sections.core_radius - inner))


def lowest_magnet_density(
    sections: CrossSections,
    magnets: GapField,
    current: GapField,
    orders: IntArray,
    smooth: ComplexArray,
    recoil_permeability: float,
    parallel_remanence: float | None,
) -> FloatArray:
    """Smallest flux density along the magnetisation over the magnets' outer surface, (n,) T.

    Of the waves that stand still in the rotor: magnet harmonics and torque fundamental. B_r passes
    the surface unchanged; B_theta inside is mu_r times that outside plus the tangential remanence.
    The series rings at the edges of the magnets, so it counts how many orders are summed.

    Parameters
    ----------
    orders : array (v,)
        To sum; as many as `magnets` has classes, or fewer, come from it.
    smooth : array (n, v)
        A at a smooth bore, which is as good for the others: slots do not reach them.
    parallel_remanence : float or None
        Remanence of parallel magnetised magnets, T; None for radial ones.
    """
    radius = sections.magnet_radius[:, None]
    ratio = (radius / sections.bore_radius[:, None]) ** orders
    rising, falling = 0.5 * smooth, 0.5 * smooth
    for k, n in enumerate(orders[: magnets.classes.size]):
        rising[:, k] = at_order(magnets, int(n), k, "rising")
        falling[:, k] = at_order(magnets, int(n), k, "falling")
    rising[:, 0] += at_order(current, int(orders[0]), None, "rising")
    falling[:, 0] += at_order(current, int(orders[0]), None, "falling")
    half = 0.5 * np.pi * sections.magnet_arc_ratio / sections.family.pole_pairs
    angle = half[:, None] * _SHARE
    wave = np.exp(1j * angle[:, :, None] * orders)

    def over_magnet(coefficient: ComplexArray) -> FloatArray:
        return np.asarray(2.0 * np.real(np.einsum("nv,nsv->ns", coefficient, wave)))

    radial = over_magnet(1j * orders * (rising * ratio + falling / ratio) / radius)
    if parallel_remanence is None:
        return np.asarray(radial.min(axis=1))
    outside = over_magnet(-orders * (rising * ratio - falling / ratio) / radius)
    cosine, sine = np.cos(angle), np.sin(angle)
    tangential = recoil_permeability * outside - parallel_remanence * sine
    return np.asarray((radial * cosine - tangential * sine).min(axis=1))
