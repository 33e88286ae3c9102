"""State of the rotor in the field: pull when displaced, and what the magnets must bear."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic.gap import GapField
from evaluators.analytic.rotor import MU_0
from evaluators.machine.geometry.cross_sections import CrossSections

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]

# Points over one magnet; the last fiftieth at its edges is left out, because the series of
# harmonics rings there.
_SHARE = np.linspace(-0.98, 0.98, 25)


def at_order(
    field: GapField, order: int, column: int | None = None, part: str = "potential"
) -> ComplexArray:
    """Coefficient of one order at the bore, (n,) Wb/m.

    Summed over classes unless `column` names one; `part` is ``rising``, ``falling`` or, for their
    sum, ``potential``.
    """
    rows = slice(None) if column is None else slice(column, column + 1)
    here = field.orders[rows] == order
    rising = np.sum(np.where(here, field.rising[:, rows], 0.0), axis=(1, 2))
    falling = np.sum(np.where(here, field.falling[:, rows], 0.0), axis=(1, 2))
    if part == "potential":
        return np.asarray(rising + falling)
    return np.asarray(rising if part == "rising" else falling)


def displacement_stiffness(
    core_radius: FloatArray, bore_radius: FloatArray, orders: IntArray, density: FloatArray
) -> FloatArray:
    """Pull per eccentricity of magnets that make `density` at the bore, (n,) N/m per m.

    Exact for concentric smooth cylinders and recoil permeability one, every magnet harmonic on
    its own: pi B^2/(4 mu0) ((n+1)(coth((n+1)x) + 1) + (n-1)(coth((n-1)x) - 1)) with
    x = ln(bore/core) (own derivation; thin-gap limit by Covo, AIEE Trans. 73, 1954). In a plane
    field n = 1 has no homopolar path and keeps the first term only.

    Parameters
    ----------
    core_radius, bore_radius : array (n,), m
    orders : array (v,)
    density : array (n, v), T
        Peak radial flux density at the bore by order.
    """
    gap = np.log(bore_radius / core_radius)[:, None]
    order = orders.astype(np.float64)
    above = (order + 1.0) * (1.0 / np.tanh((order + 1.0) * gap) + 1.0)
    lower = np.where(order > 1.0, order - 1.0, 1.0)
    below = np.where(order > 1.0, lower * (1.0 / np.tanh(lower * gap) - 1.0), 0.0)
    return np.asarray(np.sum(np.pi * density**2 / (4.0 * MU_0) * (above + below), axis=1))


def stiffness_of(sections: CrossSections, magnets: GapField, orders: IntArray) -> FloatArray:
    """`displacement_stiffness` of the magnets' field, slotted and saturated, (n,) N/m per m."""
    density = [
        2.0 * n * np.abs(at_order(magnets, int(n), column)) / sections.bore_radius
        for column, n in enumerate(orders)
    ]
    return displacement_stiffness(
        sections.core_radius, sections.bore_radius, orders, np.stack(density, axis=1)
    )


def lowest_magnet_density(
    sections: CrossSections,
    magnets: GapField,
    current: GapField,
    orders: IntArray,
    recoil_permeability: float,
    parallel_remanence: float | None,
) -> FloatArray:
    """Smallest flux density along the magnetisation over the magnets' outer surface, (n,) T.

    Of the waves that stand still in the rotor: magnet harmonics and torque fundamental. B_r passes
    the surface unchanged; B_theta inside is mu_r times that outside plus the tangential remanence.

    Parameters
    ----------
    parallel_remanence : float or None
        Remanence of parallel magnetised magnets, T; None for radial ones.
    """
    radius = sections.magnet_radius[:, None]
    ratio = (radius / sections.bore_radius[:, None]) ** orders
    rising = np.stack([at_order(magnets, int(n), k, "rising") for k, n in enumerate(orders)], 1)
    falling = np.stack([at_order(magnets, int(n), k, "falling") for k, n in enumerate(orders)], 1)
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
