"""Eddy currents in magnets and sleeve, fast enough for every harmonic of every design.

A field harmonic of order nu that turns against the rotor has the vector potential A = B r/nu per
unit of radial flux density. It drives J = -(A' - mean of A' over the segment)/resistivity along
the axis, A' being the time derivative, because the current of an insulated segment sums to zero.
All losses follow from that mean square; see `segment_share` and `rotor_eddy_loss`.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.quantity import MU_0, FloatArray, floats


class RotorEddyLoss(NamedTuple):
    """Loss per metre of active length in W/m, shape (n, h), one column per harmonic."""

    magnet: FloatArray
    sleeve: FloatArray


def segment_share(order: ArrayLike, segment_angle: ArrayLike) -> FloatArray:
    """Return the loss of a segmented ring over that of an unsegmented one, 1 - sinc².

    The mean of exp(j nu theta) over a segment of angle alpha is sinc(nu alpha / 2), so zero net
    current leaves 1 - sinc² of the mean square. For narrow segments this is
    (nu alpha)² / 12, the resistance-limited strip; for a closed ring and whole orders it is 1.
    The same factor is the share of the current wave that acts back on its own order.

    Parameters
    ----------
    order
        Spatial order nu per revolution.
    segment_angle
        Angle between the edges of a segment in rad.
    """
    x = 0.5 * floats(order) * floats(segment_angle)
    small = np.abs(x) < 1e-3
    y = np.where(small, 1.0, x)
    return np.asarray(np.where(small, x * x / 3.0, 1.0 - (np.sin(y) / y) ** 2))


def block_length_factor(length_to_width: ArrayLike) -> FloatArray:
    """Return the loss of a rectangular block over that of an endless strip of the same width.

    Field normal to the face, resistance-limited: the equation is that of the torsion of a bar,
    and the factor is its torsion constant over that of a thin strip. Timoshenko, Goodier,
    *Theory of Elasticity*, torsion of a rectangular bar.
    """
    ratio = floats(length_to_width)
    # The torsion constant is symmetric in its sides; the series is fast for a ratio above one.
    aspect = np.maximum(ratio, 1.0 / ratio)
    total = np.full(aspect.shape, 31.0 / 32.0 * 1.0369277551433699)  # sum of 1/n^5, n odd
    for n in (1, 3, 5, 7):
        total = total - (1.0 - np.tanh(0.5 * n * math.pi * aspect)) / n**5
    factor = 1.0 - 192.0 / math.pi**5 / aspect * total
    return np.asarray(np.where(ratio >= 1.0, factor, factor * ratio * ratio))


def block_loss(
    width: ArrayLike,
    length: ArrayLike,
    flux_density: ArrayLike,
    frequency: ArrayLike,
    resistivity: ArrayLike,
) -> FloatArray:
    """Return the resistance-limited loss per thickness in W/m of a block in a uniform field.

    w² B² width³ length / (24 rho) times `block_length_factor`.

    Parameters
    ----------
    width, length
        Sides of the face normal to the field in m.
    flux_density
        Peak alternating flux density in T.
    frequency
        Hz.
    resistivity
        ohm m.
    """
    w, b = floats(width), floats(length)
    rate = 2.0 * math.pi * floats(frequency) * floats(flux_density)
    strip = rate**2 * w**3 * b / (24.0 * floats(resistivity))
    return np.asarray(strip * block_length_factor(b / w))


def ring_length_factor(order: ArrayLike, length: ArrayLike, radius: ArrayLike) -> FloatArray:
    """Return the loss of a tube of finite length over that of an endless one.

    1 - tanh(x)/x with x = nu length / (2 radius): the currents close within the tube. Russell,
    Norsworthy, "Eddy currents and wall losses in screened-rotor induction motors", *Proc. IEE*
    105A, 1958 (from memory).
    """
    x = 0.5 * floats(order) * floats(length) / floats(radius)
    small = x < 1e-2
    y = np.where(small, 1.0, x)
    return np.asarray(np.where(small, x * x / 3.0, 1.0 - np.tanh(y) / y))


def rotor_eddy_loss(
    order: ArrayLike,
    frequency: ArrayLike,
    flux_density: ArrayLike,
    *,
    iron_radius: ArrayLike,
    magnet_radius: ArrayLike,
    rotor_radius: ArrayLike,
    bore_radius: ArrayLike,
    length: ArrayLike,
    magnet_resistivity: ArrayLike,
    magnet_segment_angle: ArrayLike = 2.0 * math.pi,
    magnet_segment_length: ArrayLike = math.inf,
    magnet_coverage: ArrayLike = 1.0,
    recoil_permeability: ArrayLike = 1.0,
    sleeve_resistivity: ArrayLike = math.inf,
) -> RotorEddyLoss:
    """Return the loss of field harmonics in the magnets and the sleeve around them.

    Each harmonic acts alone. Its static field between iron rotor and iron bore sets the currents
    (`segment_share`), and these weaken it by 1/(1 + x²), where x is the field of the currents
    over the field that drives them, for a wave whose source is a current sheet at the bore.
    This holds while magnet and sleeve are each thinner than their skin depth. Against the exact
    solution of a closed ring (`evaluators.machine.losses.ring`) it errs on the high side, by
    3 % for a thickness of a fifth of the skin depth and by 1 % (order 1) to 22 % (order 4) for
    two thirds of it. Harmonics of equal frequency and different order are taken as uncorrelated
    over the segments; `evaluators.analytic.mixing` adds what they have in common. Short segments
    shorten their eddies: the factor is `block_length_factor` of a block whose width gives the same
    loss in a uniform field. The sleeve follows `ring_length_factor`.

    Parameters
    ----------
    order
        Spatial order nu >= 1 per revolution, shape (h,) or (n, h).
    frequency
        Frequency seen by the rotor in Hz, shape (h,) or (n, h).
    flux_density
        Peak radial flux density at `rotor_radius` without eddy currents, T, shape (n, h).
    iron_radius, magnet_radius, rotor_radius, bore_radius
        Radii in m, shape (n,): rotor iron (0 for none), outside of magnets, outside of sleeve
        (equal to `magnet_radius` without one), stator bore.
    length
        Active length in m, shape (n,).
    magnet_resistivity, sleeve_resistivity
        ohm m, shape (n,); infinite for an insulator.
    magnet_segment_angle, magnet_segment_length
        Angle (rad) and axial length (m) of one insulated piece, shape (n,). The length is
        limited to `length`.
    magnet_coverage
        Share of the circumference that is magnet, shape (n,).
    recoil_permeability
        Relative permeability of the magnets, shape (n,).

    Returns
    -------
    RotorEddyLoss
        W/m, shape (n, h).
    """
    nu = floats(order)
    omega = 2.0 * math.pi * np.abs(floats(frequency))
    r_iron, r_magnet, r_rotor, r_bore, axial = (
        _column(a) for a in (iron_radius, magnet_radius, rotor_radius, bore_radius, length)
    )
    angle = _column(magnet_segment_angle)
    share = segment_share(nu, angle)
    piece = np.minimum(_column(magnet_segment_length), axial)
    equivalent_width = np.sqrt(12.0 * share) * r_magnet / nu
    share = share * _column(magnet_coverage) * block_length_factor(piece / equivalent_width)
    closed = ring_length_factor(nu, axial, r_rotor)

    base = (r_iron / r_rotor) ** (2.0 * nu)
    scale = (r_rotor / (1.0 + base)) ** 2
    # Conductance seen by the wave: integral of A² r dr over resistivity, A = 1 at the surface.
    magnet = scale * _profile_integral(nu, base, r_iron / r_rotor, r_magnet / r_rotor)
    sleeve = scale * _profile_integral(nu, base, r_magnet / r_rotor, np.ones_like(r_rotor))
    magnet = magnet * share / _column(magnet_resistivity)
    sleeve = sleeve * closed / _column(sleeve_resistivity)

    inner = (1.0 - base) / (1.0 + base) / _column(recoil_permeability)
    far = (r_rotor / r_bore) ** (2.0 * nu)
    outer = (1.0 - far) / (1.0 + far)
    reaction = omega * MU_0 * (magnet + sleeve) / (nu * (inner + outer))
    potential = floats(flux_density) * r_rotor / nu
    density = math.pi * (omega * potential) ** 2 / (1.0 + reaction**2)
    return RotorEddyLoss(magnet=np.asarray(density * magnet), sleeve=np.asarray(density * sleeve))


def _column(values: ArrayLike) -> FloatArray:
    """Give values per design a trailing axis for the harmonics."""
    return floats(values)[..., np.newaxis]


def _profile_integral(
    nu: FloatArray, base: FloatArray, low: FloatArray, high: FloatArray
) -> FloatArray:
    """Integral of t (t^nu + base t^-nu)² dt from `low` to `high`."""
    first = (high ** (2.0 * nu + 2.0) - low ** (2.0 * nu + 2.0)) / (2.0 * nu + 2.0)
    second = base * (high**2 - low**2)
    # base t^-2nu stays below one for t above the iron, whereas t^-2nu alone may overflow.
    unit = np.abs(nu - 1.0) < 1e-9
    safe_low = np.where(low > 0.0, low, 1.0)
    power = 2.0 - 2.0 * np.where(unit, 2.0, nu)
    at_low = np.where(low > 0.0, base * safe_low**power, 0.0)
    general = base * (base * high**power - at_low) / power
    logarithm = base**2 * np.log(high / safe_low)
    return np.asarray(first + second + np.where(unit, logarithm, general))
