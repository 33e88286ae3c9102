"""Copper: direct-current resistance and its increase with frequency."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import jve

from evaluators.machine.quantity import MU_0, ComplexArray, FloatArray, floats


def skin_depth(
    frequency: ArrayLike, resistivity: ArrayLike, relative_permeability: ArrayLike = 1.0
) -> FloatArray:
    """Return the skin depth in m, sqrt(rho / (pi f mu)); infinite at zero frequency.

    Landau, Lifshitz, *Electrodynamics of Continuous Media*, section 59 (from memory).

    Parameters
    ----------
    frequency
        Hz.
    resistivity
        ohm m.
    """
    f = np.abs(floats(frequency))
    rho = floats(resistivity)
    mu = MU_0 * floats(relative_permeability)
    depth = np.sqrt(rho / (math.pi * mu * np.where(f > 0.0, f, 1.0)))
    return np.asarray(np.where(f > 0.0, depth, np.inf))


def winding_resistance(
    turns: ArrayLike,
    turn_length: ArrayLike,
    copper_area: ArrayLike,
    resistivity: ArrayLike,
) -> FloatArray:
    """Return the direct-current resistance of a coil in ohm, rho l/A by definition.

    Parameters
    ----------
    turns
        Turns in series of one coil.
    turn_length
        Mean length of a turn in m, end turns included.
    copper_area
        Copper cross-section of all turns of one coil side together in m2, so that a wire has
        the cross-section ``copper_area / turns``.
    resistivity
        ohm m at winding temperature, as `Quantity.at` of a `Conductor` returns it.
    """
    n = floats(turns)
    return floats(resistivity) * n * n * floats(turn_length) / floats(copper_area)


def slot_loss(
    ampere_turns: ArrayLike, turn_length: ArrayLike, copper_area: ArrayLike, resistivity: ArrayLike
) -> FloatArray:
    """Return the direct-current loss of coils in W, whatever their number of turns.

    R I² with `winding_resistance`.

    Parameters
    ----------
    ampere_turns
        Root-mean-square ampere-turns of one coil in A.
    turn_length
        Mean length of a turn in m, end turns included.
    copper_area
        Copper cross-section of one coil side in m2.
    resistivity
        ohm m at winding temperature.
    """
    return np.asarray(
        floats(ampere_turns) ** 2 * winding_resistance(1.0, turn_length, copper_area, resistivity)
    )


def transverse_field_loss(
    diameter: ArrayLike, flux_density: ArrayLike, frequency: ArrayLike, resistivity: ArrayLike
) -> FloatArray:
    """Return the loss per length in W/m of a round wire in an alternating field across it.

    Half the loss in a rotating field, pi a Re[j w A conj(A'/mu0)] with A = 2 B J1(k r)/(k J0(k a));
    pi w² B² d⁴ / (128 rho) where the skin depth exceeds the wire. Landau, Lifshitz,
    *Electrodynamics of Continuous Media*, section 59, problem 2 (from memory).

    Parameters
    ----------
    diameter
        m.
    flux_density
        Peak flux density far from the wire in T.
    frequency
        Hz.
    resistivity
        ohm m.
    """
    b = floats(flux_density)
    return np.asarray(0.5 * rotating_field_loss(diameter, frequency, resistivity) * b * b)


def rotating_field_loss(
    diameter: ArrayLike, frequency: ArrayLike, resistivity: ArrayLike
) -> FloatArray:
    """Return the loss per length and squared field, W/(m T2), of a cylinder in a rotating field.

    Non-magnetic conductor; source and arguments as for `transverse_field_loss`.
    """
    a = 0.5 * floats(diameter)
    omega = 2.0 * math.pi * np.abs(floats(frequency))
    rho = floats(resistivity)
    x = _wire_argument(diameter, frequency, resistivity)
    small = np.abs(x) < 0.05
    y = np.where(small, 1.0, x)
    ratio = jve(1, y) / jve(0, y)
    # With A(a) = 2 J1/(k J0) and A'(a) = 2 - A(a)/a per tesla.
    potential = 2.0 * a / y * ratio
    slope = 2.0 - potential / np.where(a > 0.0, a, 1.0)
    exact = math.pi * a * np.real(-1j * omega * potential * np.conj(-slope)) / MU_0
    limit = math.pi * omega**2 * a**4 / (4.0 * rho)
    return np.asarray(np.where(small, limit, exact))


def slot_bar_factors(height_to_skin_depth: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Return phi and psi of a bar of reduced height xi in a slot.

    phi = xi (sinh 2xi + sin 2xi)/(cosh 2xi - cos 2xi), the factor of a single layer, and
    psi = 2 xi (sinh xi - sin xi)/(cosh xi + cos xi), the share of the field of other layers.
    Field, "Eddy currents in large slot-wound conductors", *Trans. AIEE* 24, 1905; Emde 1908;
    Dowell, "Effects of eddy currents in transformer windings", *Proc. IEE* 113(8), 1966.
    """
    xi = floats(height_to_skin_depth)
    small = xi < 0.02
    x = np.clip(np.where(small, 1.0, xi), None, 300.0)
    phi = (np.sinh(2 * x) + np.sin(2 * x)) / (np.cosh(2 * x) - np.cos(2 * x))
    psi = 2.0 * (np.sinh(x) - np.sin(x)) / (np.cosh(x) + np.cos(x))
    phi = np.where(small, 1.0 + 4.0 / 45.0 * xi**4, phi * xi)
    psi = np.where(small, xi**4 / 3.0, psi * xi)
    return np.asarray(phi), np.asarray(psi)


def slot_bar_factor(height_to_skin_depth: ArrayLike, layers: ArrayLike) -> FloatArray:
    """Return the resistance factor of equal layers in series, phi + (m² - 1)/3 psi.

    Sources as for `slot_bar_factors`; `layers` is the number m of conductors above each other.
    """
    phi, psi = slot_bar_factors(height_to_skin_depth)
    m = floats(layers)
    return np.asarray(phi + (m * m - 1.0) / 3.0 * psi)


def strand_factor(
    strand_diameter: ArrayLike,
    strands: ArrayLike,
    slot_width: ArrayLike,
    slot_depth: ArrayLike,
    frequency: ArrayLike,
    resistivity: ArrayLike,
) -> FloatArray:
    """Return the resistance factor of the slot part of a winding of round strands.

    Dowell's replacement: strands lie in a square grid over slot width and depth, each round is a
    square of equal area, and a layer is a sheet whose conductivity is lowered by the share of
    the slot width that is copper. Strands in parallel are taken as perfectly transposed.
    Sources as for `slot_bar_factors`.

    Parameters
    ----------
    strand_diameter
        Bare diameter in m.
    strands
        Strands in the slot: turns times parallel strands, of both coil sides.
    slot_width, slot_depth
        Mean width and depth of the wound part of the slot in m.
    frequency
        Hz.
    resistivity
        ohm m at winding temperature.
    """
    side = 0.5 * math.sqrt(math.pi) * floats(strand_diameter)
    width = floats(slot_width)
    layers = np.maximum(np.sqrt(floats(strands) * floats(slot_depth) / width), 1.0)
    share = np.minimum(floats(strands) / layers * side / width, 1.0)
    xi = side * np.sqrt(share) / skin_depth(frequency, resistivity)
    return slot_bar_factor(xi, layers)


def _wire_argument(
    diameter: ArrayLike, frequency: ArrayLike, resistivity: ArrayLike
) -> ComplexArray:
    """k a of a non-magnetic wire, (1 - j) a / delta."""
    a = 0.5 * floats(diameter)
    return np.asarray((1.0 - 1.0j) * (a / skin_depth(frequency, resistivity)))
