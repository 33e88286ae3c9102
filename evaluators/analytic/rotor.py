"""The rotor seen from the bore: magnet source and response, one number per spatial order.

Rotor: core of finite permeability, a magnet ring of recoil permeability mu_r (the spaces between
the magnets taken as magnet without magnetisation), then sleeve and clearance as air. The vector
potential is A(r, theta) = sum_n A_n(r) exp(j n theta), one-metre slice, A along +z, so that
B_r = dA/(r dtheta) and B_theta = -dA/dr.

Source: the boundary-value problem of Zhu, Howe and Chan, IEEE Trans. Magn. 38(1), 2002, 229-238,
solved here for the vector potential and for a core that takes some magnetic voltage.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.geometry.cross_sections import CrossSections

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

MU_0 = 4e-7 * np.pi


@dataclass(frozen=True)
class RotorRadii:
    """Radii that the field of the gap depends on, (n,) m, and the recoil permeability."""

    core: FloatArray
    magnet: FloatArray
    bore: FloatArray
    recoil_permeability: float

    @classmethod
    def of(cls, sections: CrossSections, recoil_permeability: float) -> RotorRadii:
        """Radii of the given cross-sections."""
        return cls(
            sections.core_radius, sections.magnet_radius, sections.bore_radius, recoil_permeability
        )


def magnetisation(
    arc_ratio: FloatArray,
    remanence: float,
    pole_pairs: int,
    orders: NDArray[np.int64],
    direction: str,
) -> tuple[FloatArray, FloatArray]:
    """Cosine and sine amplitudes of mu0 M_r and mu0 M_theta with a magnet's axis at theta = 0.

    Parameters
    ----------
    arc_ratio : array (n,)
        Magnet arc over pole pitch.
    orders : array (v,)
        Odd multiples of `pole_pairs`, positive.
    direction : str
        ``radial`` or ``parallel``.

    Returns
    -------
    radial, tangential : array (n, v), T
        mu0 M_r = sum radial cos(nu theta), mu0 M_theta = sum tangential sin(nu theta).
    """
    arc = arc_ratio[:, None]
    half = 0.5 * arc * np.pi / pole_pairs  # half the arc of one magnet, rad
    if direction == "radial":
        radial = 2.0 * remanence * arc * np.sinc(half * orders / np.pi)
        return radial, np.zeros_like(radial)
    plus = np.sinc(half * (orders + 1) / np.pi)
    minus = np.sinc(half * (orders - 1) / np.pi)
    return remanence * arc * (plus + minus), remanence * arc * (plus - minus)


def _ring_ratio(radii: RotorRadii, order: FloatArray, core: FloatArray) -> FloatArray:
    """-r B_theta / (n A) just outside the magnet ring, (n, v), for core admittance `core`."""
    ring = np.tanh(order * np.log(radii.magnet / radii.core)[:, None])
    inside = (ring + core) / (1.0 + core * ring)
    return np.asarray(inside / radii.recoil_permeability)


def response(radii: RotorRadii, orders: NDArray[np.int64], core: FloatArray) -> FloatArray:
    """A_n over B_theta,n at the bore of the rotor without magnetisation, in m (negative).

    Parameters
    ----------
    orders : array (v,) or (n, v)
        Spatial orders of either sign, none zero.
    core : array (n, v)
        Core admittance: -mu_r r B_theta / (mu_r n A) seen from the magnet ring's inner radius,
        0 for a perfect core.
    """
    order = np.abs(np.asarray(orders, dtype=np.float64))
    ratio = _ring_ratio(radii, order, core)
    reflected = (1.0 - ratio) / (1.0 + ratio)
    shrink = np.exp(2.0 * order * np.log(radii.magnet / radii.bore)[:, None])
    bore = radii.bore[:, None]
    return np.asarray(-bore / order * (1.0 + reflected * shrink) / (1.0 - reflected * shrink))


def core_share(radii: RotorRadii, orders: NDArray[np.int64], core: FloatArray) -> FloatArray:
    """A_n at the core's surface over A_n at the bore, rotor without magnetisation, (n, v)."""
    order = np.abs(np.asarray(orders, dtype=np.float64))
    ratio = _ring_ratio(radii, order, core)
    reflected = (1.0 - ratio) / (1.0 + ratio)
    ring = (radii.core / radii.magnet)[:, None] ** order
    gap = (radii.magnet / radii.bore)[:, None] ** order
    mirrored = ring**2 * (1.0 - core) / (1.0 + core)
    through_ring = 2.0 * ring / ((1.0 + core) * (1.0 + mirrored))
    return np.asarray(through_ring * (1.0 + reflected) * gap / (1.0 + reflected * gap**2))


@dataclass(frozen=True)
class MagnetSource:
    """Two-sided coefficients A_n, (n, v), of the magnets under a smooth, perfect stator, Wb/m."""

    bore: ComplexArray
    core: ComplexArray


def source(
    radii: RotorRadii,
    radial: FloatArray,
    tangential: FloatArray,
    orders: NDArray[np.int64],
    core: FloatArray,
) -> MagnetSource:
    """Field of the magnets under a smooth, infinitely permeable bore, positive orders.

    Parameters
    ----------
    radial, tangential : array (n, v), T
        From `magnetisation`.
    orders : array (v,)
        Positive orders.
    core : array (n, v)
        Core admittance, see `response`.

    Returns
    -------
    MagnetSource
        Coefficients of exp(+j n theta) at the bore and at the core; those of the negative order
        are their conjugates.
    """
    n = np.asarray(orders, dtype=np.float64)
    inner, outer, bore = radii.core[:, None], radii.magnet[:, None], radii.bore[:, None]
    mu = radii.recoil_permeability
    # Coefficients of exp(j n theta): cos -> 1/2, sin -> 1/(2j). The particular solution of
    # A'' + A'/r - n^2 A/r^2 = -(M_theta - j n M_r)/r is kappa r, for n = 1 kappa r ln(r/outer).
    along = 0.5 * radial
    across = tangential / 2.0j
    curl = across - 1j * n * along
    one = n == 1.0
    kappa = np.where(one, -0.5 * curl, curl / np.where(one, 1.0, n * n - 1.0))
    log_inner = np.log(inner / outer)
    value_inner = np.where(one, kappa * inner * log_inner, kappa * inner)
    slope_inner = np.where(one, kappa * (log_inner + 1.0), kappa)
    value_outer = np.where(one, 0.0, kappa * outer)
    slope_outer = kappa
    shrink_ring = (inner / outer) ** n
    shrink_gap = (outer / bore) ** n
    core_term = core * value_inner - inner / n * (slope_inner + across)
    mirrored = shrink_ring**2 * (1.0 - core) / (1.0 + core)
    offset = shrink_ring * core_term / (1.0 + core)
    jump = outer / n * (slope_outer + across)
    side = (1.0 - mirrored) / (1.0 + mirrored)
    numerator = (value_outer - offset) * side - offset - jump
    denominator = (1.0 + shrink_gap**2) * side + mu * (1.0 - shrink_gap**2)
    edge = numerator / denominator
    rising = (edge * (1.0 + shrink_gap**2) + offset - value_outer) / (1.0 + mirrored)
    falling = (rising * shrink_ring * (1.0 - core) - core_term) / (1.0 + core)
    return MagnetSource(
        bore=np.asarray(2.0 * shrink_gap * edge),
        core=np.asarray(rising * shrink_ring + falling + value_inner),
    )
