"""Torque and force from the Fourier coefficients on the bore, per metre.

Maxwell stress on the bore circle, gap side. With u = B_r + j B_phi the force is F_x + j F_y =
R/(2 mu0) * integral of u^2 exp(j phi), so that orders n and -1-n pull together (complex form of
Chiba et al., Magnetic Bearings and Bearingless Drives, 2005, ch. 6; own derivation). Products of
such a pair do not depend on the radius, so the field's singularities at the tooth tips do no harm.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]

MU_0 = 4e-7 * np.pi


def torque(orders: IntArray, potential: ComplexArray, tangential: ComplexArray) -> FloatArray:
    """Torque on the rotor, (t, n), N m/m, from coefficients (t, m, n) of positive orders."""
    weighted = orders[:, None] * np.imag(potential * np.conj(tangential))
    return np.asarray(4.0 * np.pi * weighted.sum(axis=1))


def spread(
    orders: IntArray, values: ComplexArray, highest: int, negative: ComplexArray | None = None
) -> ComplexArray:
    """Lay coefficients out over the orders -highest..highest, (t, 2 highest + 1, n).

    Without `negative` the field is real.
    """
    result = np.zeros((values.shape[0], 2 * highest + 1, values.shape[2]), dtype=np.complex128)
    kept = orders <= highest
    result[:, highest + orders[kept]] = values[:, kept]
    result[:, highest - orders[kept]] = (np.conj(values) if negative is None else negative)[:, kept]
    return result


def rotating(potential: ComplexArray, tangential: ComplexArray, radius: FloatArray) -> ComplexArray:
    """Coefficients of u = B_r + j B_phi for orders -highest..highest, (t, 2 highest + 1, n)."""
    highest = potential.shape[1] // 2
    order = np.arange(-highest, highest + 1)[:, None]
    return np.asarray(1j * (order * potential - MU_0 * tangential) / radius)


def pair(first: ComplexArray, second: ComplexArray, radius: FloatArray) -> ComplexArray:
    """Sum over all n of first_n second_(-1-n) times pi R/mu0, (t, n), N/m.

    The force of one field u is pair(u, u); the change of the force by a small field v is
    2 pair(u, v).
    """
    # Orders -highest..highest; -1-n runs from highest-1 down to -highest-1: leave the ends out.
    total = np.einsum("tmn,tmn->tn", first[:, :-1], second[:, -2::-1])
    return np.asarray(np.pi * radius / MU_0 * total)
