"""First bending speeds of the rotor as a stepped beam: a first estimate for choosing designs.

It replaces no rotor-dynamic analysis: no gyroscopic effect, no controller, no shrink-fit or
lamination test, no impeller blades, no foundation. Before a rotor is built, its modes must be
computed by somebody licensed to do so and measured hanging free.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.quantity import FloatArray, floats

TIMOSHENKO_SHEAR = 0.9  # shear coefficient of a solid round section; 6(1+nu)/(7+6nu), Cowper 1966


def beam_matrices(
    lengths: FloatArray,
    bending: FloatArray,
    shear: FloatArray,
    mass: FloatArray,
    inertia: FloatArray,
) -> tuple[FloatArray, FloatArray]:
    """Return stiffness and mass matrix of free stepped beams, (n, 2k+2, 2k+2) each.

    Two-node Timoshenko elements with cubic shapes and consistent mass; unknowns are deflection and
    slope of the k+1 stations. Przemieniecki, *Theory of Matrix Structural Analysis*, 1968 (from
    memory). Without shear (`shear` infinite) and `inertia` zero they are Euler-Bernoulli beams.

    Parameters
    ----------
    lengths : array (n, k)
        Of the elements, m.
    bending : array (n, k)
        E I, N m2.
    shear : array (n, k)
        kappa G A, N.
    mass : array (n, k)
        Per length, kg/m.
    inertia : array (n, k)
        Of rotation of the section, rho I, kg m.
    """
    rows, count = lengths.shape
    size = 2 * count + 2
    stiffness, masses = np.zeros((rows, size, size)), np.zeros((rows, size, size))
    el = lengths
    phi = 12.0 * bending / (shear * el**2)
    unit = np.ones_like(el)
    k = bending / ((1.0 + phi) * el**3)
    element = _symmetric(
        (12.0 * unit, 6.0 * el, -12.0 * unit, 6.0 * el),
        ((4.0 + phi) * el**2, -6.0 * el, (2.0 - phi) * el**2),
        (12.0 * unit, -6.0 * el),
        ((4.0 + phi) * el**2,),
    )
    element = element * k[..., None, None]
    # Consistent mass of translation with the shapes of the deflection including shear.
    m1 = 13.0 / 35.0 + 7.0 * phi / 10.0 + phi**2 / 3.0
    m2 = (11.0 / 210.0 + 11.0 * phi / 120.0 + phi**2 / 24.0) * el
    m3 = 9.0 / 70.0 + 3.0 * phi / 10.0 + phi**2 / 6.0
    m4 = -(13.0 / 420.0 + 3.0 * phi / 40.0 + phi**2 / 24.0) * el
    m5 = (1.0 / 105.0 + phi / 60.0 + phi**2 / 120.0) * el**2
    m6 = -(1.0 / 140.0 + phi / 60.0 + phi**2 / 120.0) * el**2
    moving = _symmetric((m1, m2, m3, m4), (m5, -m4, m6), (m1, -m2), (m5,))
    r1 = 6.0 / 5.0 * unit
    r2 = (1.0 / 10.0 - phi / 2.0) * el
    r3 = (2.0 / 15.0 + phi / 6.0 + phi**2 / 3.0) * el**2
    r4 = (-1.0 / 30.0 - phi / 6.0 + phi**2 / 6.0) * el**2
    turning = _symmetric((r1, r2, -r1, r2), (r3, -r2, r4), (r1, -r2), (r3,))
    square = ((1.0 + phi) ** 2)[..., None, None]
    weights = moving * (mass * el)[..., None, None] + turning * (inertia / el)[..., None, None]
    for e in range(count):
        part = slice(2 * e, 2 * e + 4)
        stiffness[:, part, part] += element[:, e]
        masses[:, part, part] += (weights / square)[:, e]
    return stiffness, masses


def natural_speeds(stiffness: FloatArray, masses: FloatArray) -> FloatArray:
    """Return all natural angular frequencies in rad/s, rising, (..., n, size).

    By definition the roots of the eigenvalues of K x = w² M x.

    Parameters
    ----------
    stiffness : array (..., n, size, size)
        Symmetric. Rigid modes come out as zero up to rounding.
    masses : array (n, size, size)
        Symmetric and positive definite.
    """
    values = np.linalg.eigvalsh(_scaled(stiffness, np.linalg.inv(np.linalg.cholesky(masses))))
    return np.asarray(np.sqrt(np.maximum(values, 0.0)))


def supported_modes(
    free: FloatArray, supported: FloatArray, masses: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Return natural frequencies of supported beams, and how much of each mode is bending.

    Natural frequencies as in `natural_speeds`; the share is one of energies, by definition.

    Parameters
    ----------
    free, supported : array (n, size, size)
        Stiffness without and with the supports, symmetric.
    masses : array (n, size, size)
        Symmetric and positive definite.

    Returns
    -------
    speeds : array (n, size)
        rad/s, rising.
    bending : array (n, size)
        Share of the elastic energy of each mode that the beam holds; the supports hold the rest.
        Near zero for a stiff rotor moving on soft supports, near one for a bending mode.
    """
    lower = np.linalg.inv(np.linalg.cholesky(masses))
    values, shapes = np.linalg.eigh(_scaled(supported, lower))
    beam = np.einsum("nim,nim->nm", shapes, _scaled(free, lower) @ shapes)
    # Of modes that next to nothing holds, both energies are rounding errors.
    positive = values > 1e-10 * values[:, -1:]
    share = np.where(positive, beam / np.where(positive, values, 1.0), 0.0)
    return np.sqrt(np.maximum(values, 0.0)), np.asarray(share)


def _scaled(stiffness: FloatArray, lower: FloatArray) -> FloatArray:
    """Symmetric matrix with the squared frequencies as eigenvalues; `lower` inverts Cholesky's."""
    scaled = lower @ stiffness @ np.swapaxes(lower, -1, -2)
    return np.asarray(0.5 * (scaled + np.swapaxes(scaled, -1, -2)))


def amplification_factor(damping_ratio: ArrayLike) -> FloatArray:
    """Return the amplification factor 1/(2 zeta) of a lightly damped mode.

    API RP 684 (from memory).
    """
    return np.asarray(0.5 / floats(damping_ratio))


def required_margin(factor: ArrayLike, *, above: bool) -> FloatArray:
    """Return the share of the speed by which a critical speed must stay away from the range.

    API 617 and API RP 684 (from memory): none below an amplification factor of 2.5 for critical
    speeds below the range; 17 (1 - 1/(AF - 1.5)) percent, at most 16, below it, and 10 percent
    more, at most 26, above it.

    Parameters
    ----------
    factor
        Amplification factor.
    above
        Whether the critical speed lies above the speed range.
    """
    af = floats(factor)
    damped = af < 2.5
    share = 0.17 * (1.0 - 1.0 / (np.where(damped, 2.5, af) - 1.5))
    if above:
        return np.asarray(np.where(damped, 0.0, np.minimum(0.10 + share, 0.26)))
    return np.asarray(np.where(damped, 0.0, np.minimum(share, 0.16)))


def separation_margin(
    critical: ArrayLike, lowest: ArrayLike, highest: ArrayLike, factor: ArrayLike
) -> FloatArray:
    """Return by how much a critical speed is farther away than required, as a share of speed.

    Negative if it is too near or inside the range, by what is missing on the nearer side.

    Parameters
    ----------
    critical, lowest, highest
        Critical speed and ends of the range of continuous speeds, in one unit.
    factor
        Amplification factor, for `required_margin`.
    """
    n, low, high = floats(critical), floats(lowest), floats(highest)
    over = n / high - 1.0 - required_margin(factor, above=True)
    under = 1.0 - n / np.where(low > 0.0, low, 1.0) - required_margin(factor, above=False)
    return np.asarray(np.maximum(over, np.where(low > 0.0, under, -np.inf)))


def _symmetric(*rows: tuple[FloatArray, ...]) -> FloatArray:
    """Symmetric matrices (..., 4, 4) from the rows of their upper triangles."""
    full = np.empty((*rows[0][0].shape, 4, 4))
    for i, row in enumerate(rows):
        for offset, value in enumerate(row):
            full[..., i, i + offset] = value
            full[..., i + offset, i] = value
    return full
