"""Exact eddy-current loss of a closed conducting ring on infinitely permeable iron.

The two-dimensional field with skin effect, by Bessel functions. It is the yardstick for
`evaluators.machine.losses.eddy.rotor_eddy_loss` and for field solvers.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import jv, jvp, yv, yvp

from evaluators.machine.quantity import MU_0, ComplexArray, FloatArray, floats


def ring_field_ratio(
    order: ArrayLike,
    frequency: ArrayLike,
    inner_radius: ArrayLike,
    outer_radius: ArrayLike,
    resistivity: ArrayLike,
    relative_permeability: ArrayLike = 1.0,
) -> ComplexArray:
    """Return q = mu0 H_tangential R / A at the outer surface of a ring, dimensionless.

    A = a J(k r) + b Y(k r) of order nu with k² = -j w mu / rho and no tangential field at the
    inner radius. Smythe, *Static and Dynamic Electricity*, chapter 10 (from memory).

    Parameters
    ----------
    order
        Spatial order nu >= 1 per revolution.
    frequency
        Hz, above zero.
    inner_radius, outer_radius
        m, above zero.
    resistivity
        ohm m.

    Returns
    -------
    ComplexArray
        NaN where the inner radius exceeds ten skin depths: the functions then cancel.
    """
    nu = floats(order)
    omega = 2.0 * math.pi * floats(frequency)
    mu_r = floats(relative_permeability)
    a = floats(inner_radius)
    b = floats(outer_radius)
    k = (1.0 - 1.0j) * np.sqrt(omega * MU_0 * mu_r / (2.0 * floats(resistivity)))
    beyond = np.abs(k * a) > 10.0 * math.sqrt(2.0)
    k = np.where(beyond, 1.0 / a, k)
    weight_j, weight_y = yvp(nu, k * a), -jvp(nu, k * a)
    potential = weight_j * jv(nu, k * b) + weight_y * yv(nu, k * b)
    slope = k * (weight_j * jvp(nu, k * b) + weight_y * yvp(nu, k * b))
    return np.asarray(np.where(beyond, np.nan, b * slope / (mu_r * potential)))


def ring_loss(
    order: ArrayLike,
    frequency: ArrayLike,
    flux_density: ArrayLike,
    inner_radius: ArrayLike,
    outer_radius: ArrayLike,
    resistivity: ArrayLike,
    relative_permeability: ArrayLike = 1.0,
) -> FloatArray:
    """Return the loss per length in W/m from the radial field that stands at the outer surface.

    Poynting's theorem with `ring_field_ratio`.

    Parameters
    ----------
    flux_density
        Peak radial flux density at `outer_radius` in T, eddy currents included.
    """
    q = ring_field_ratio(
        order, frequency, inner_radius, outer_radius, resistivity, relative_permeability
    )
    potential = floats(flux_density) * floats(outer_radius) / floats(order)
    omega = 2.0 * math.pi * floats(frequency)
    return np.asarray(math.pi * omega * potential**2 * q.imag / MU_0)


def sheet_flux_density(
    order: ArrayLike,
    sheet_current: ArrayLike,
    bore_radius: ArrayLike,
    outer_radius: ArrayLike,
    field_ratio: ArrayLike,
) -> FloatArray:
    """Return the radial flux density a current sheet on an iron bore makes at the ring, T peak.

    Parameters
    ----------
    order
        Spatial order nu >= 1 of the sheet.
    sheet_current
        Peak current per length of circumference in A/m.
    bore_radius, outer_radius
        Radius of the sheet and of the ring in m.
    field_ratio
        q of the ring, from `ring_field_ratio`, or `static_field_ratio` without currents.
    """
    nu = floats(order)
    bore, outer = floats(bore_radius), floats(outer_radius)
    stretch = (bore / outer) ** nu
    q = np.asarray(field_ratio) / nu
    rise = 0.5 * ((1.0 + q) * stretch - (1.0 - q) / stretch)
    return np.asarray(np.abs(MU_0 * floats(sheet_current) * bore / (outer * rise)))


def static_field_ratio(
    order: ArrayLike,
    inner_radius: ArrayLike,
    outer_radius: ArrayLike,
    relative_permeability: ArrayLike = 1.0,
) -> FloatArray:
    """Return q of `ring_field_ratio` for a ring without currents."""
    nu = floats(order)
    base = (floats(inner_radius) / floats(outer_radius)) ** (2.0 * nu)
    return np.asarray(nu * (1.0 - base) / (1.0 + base) / floats(relative_permeability))
