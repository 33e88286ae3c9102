"""Torque and force of the gap field by Maxwell's stress, summed over harmonics.

With A = sum (a_n (r/R)^n + b_n (r/R)^-n) exp(j n theta) over n > 0 plus the conjugate, the stress
on a circle in the gap gives per metre, at any radius,

    T = 8 pi / mu0 * sum n^2 Im(b_n a_n*)
    F_x + j F_y = 8 pi / (mu0 R) * sum n (n - 1) a_n* b_(n-1)

(residues of the squared complex field B_x - j B_y; the second is the statement that only orders one
apart make a force, Chiba et al., Magnetic Bearings and Bearingless Drives, 2005).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic.rotor import MU_0

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]


def torque(rising: ComplexArray, falling: ComplexArray) -> FloatArray:
    """Torque on the rotor in N m/m; orders 1..N on axis 1 of (n, N, ...)."""
    order = np.arange(1, rising.shape[1] + 1, dtype=np.float64)
    density = np.imag(falling * np.conj(rising))
    return np.asarray(8.0 * np.pi / MU_0 * np.einsum("k,nk...->n...", order**2, density))


def force(rising: ComplexArray, falling: ComplexArray, bore: FloatArray) -> ComplexArray:
    """Force on the rotor F_x + j F_y in N/m, sesquilinear in the two fields.

    Parameters
    ----------
    rising : array (n, N, ...)
        Of one field.
    falling : array (n, N, ...)
        Of the same or another field.
    bore : array (n,)
    """
    order = np.arange(2, rising.shape[1] + 1, dtype=np.float64)
    product = np.conj(rising[:, 1:]) * falling[:, :-1]
    total = np.einsum("k,nk...->n...", order * (order - 1.0), product)
    scale = 8.0 * np.pi / (MU_0 * bore)
    return np.asarray(total * scale.reshape(-1, *(1,) * (total.ndim - 1)))
