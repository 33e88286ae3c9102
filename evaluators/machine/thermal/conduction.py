"""Conduction: cylinders, slabs, ribs and the mixture of strands and resin in a slot."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.losses.eddy import block_length_factor
from evaluators.machine.quantity import FloatArray, floats


def cylinder_resistance(
    inner_radius: ArrayLike, outer_radius: ArrayLike, conductivity: ArrayLike, length: ArrayLike
) -> FloatArray:
    """Return the radial resistance ln(Ro/Ri) / (2 pi k L) of a hollow cylinder in K/W.

    Fourier's law; radii and length in m, conductivity in W/(m K).
    """
    ratio = np.log(floats(outer_radius) / floats(inner_radius))
    return np.asarray(ratio / (2.0 * np.pi * floats(conductivity) * floats(length)))


def heated_bar_mean_rise(
    source: ArrayLike, width: ArrayLike, height: ArrayLike, conductivity: ArrayLike
) -> FloatArray:
    """Return the mean rise of a uniformly heated rectangular bar over its cold walls in K.

    Poisson's equation on a rectangle, as in the torsion of a bar (`block_length_factor`): q b²/12k
    for a thin slab with two cold faces. Source in W/m3, sides in m, conductivity in W/(m K).
    """
    b = floats(width)
    slab = floats(source) * b * b / (12.0 * floats(conductivity))
    return np.asarray(slab * block_length_factor(floats(height) / b))


def heated_bar_peak_rise(
    source: ArrayLike, width: ArrayLike, height: ArrayLike, conductivity: ArrayLike
) -> FloatArray:
    """Return the rise of the middle of a uniformly heated rectangular bar in K.

    q b²/8k [1 - 32/pi³ sum (-1)^k / ((2k+1)³ cosh((2k+1) pi h / 2b))], b the short side.
    Timoshenko, Goodier, *Theory of Elasticity*, membrane analogy. Arguments as
    `heated_bar_mean_rise`.
    """
    first, second = floats(width), floats(height)
    short, long = np.minimum(first, second), np.maximum(first, second)
    total = np.zeros(np.broadcast_shapes(short.shape, long.shape))
    for k in range(4):
        n = 2 * k + 1
        # The argument is held so that cosh cannot overflow; its inverse is zero there anyway.
        argument = np.minimum(0.5 * n * np.pi * long / short, 300.0)
        total = total + (-1.0) ** k / n**3 / np.cosh(argument)
    slab = floats(source) * short**2 / (8.0 * floats(conductivity))
    return np.asarray(slab * (1.0 - 32.0 / np.pi**3 * total))


def mixture_conductivity(
    fill: ArrayLike, conductor_conductivity: ArrayLike, matrix_conductivity: ArrayLike
) -> FloatArray:
    """Return the conductivity across parallel strands in resin, W/(m K).

    k_m [(1 + v) k_c + (1 - v) k_m] / [(1 - v) k_c + (1 + v) k_m] for the share v of conductor:
    Rayleigh, *Phil. Mag.* 34, 1892, first order for round rods; the lower bound of Hashin, J.
    Mech. Phys. Solids 13, 1965. `matrix_conductivity` stands for resin, enamel and voids together.
    """
    v, k_c, k_m = floats(fill), floats(conductor_conductivity), floats(matrix_conductivity)
    return np.asarray(
        k_m * ((1.0 + v) * k_c + (1.0 - v) * k_m) / ((1.0 - v) * k_c + (1.0 + v) * k_m)
    )


def rib_efficiency(
    coefficient: ArrayLike,
    conductivity: ArrayLike,
    thickness: ArrayLike,
    height: ArrayLike,
    width: ArrayLike = np.inf,
) -> FloatArray:
    """Return the efficiency tanh(mL)/(mL) of a straight rib, m² = 2 h (1/t + 1/w)/k.

    Adiabatic tip; Incropera et al., *Fundamentals of Heat and Mass Transfer*, extended surfaces
    (from memory). Coefficient in W/(m2 K), conductivity in W/(m K), lengths in m; `width` is that
    along the frame, infinite by default.
    """
    around = 1.0 / floats(thickness) + 1.0 / floats(width)
    m = np.sqrt(2.0 * floats(coefficient) * around / floats(conductivity))
    x = m * floats(height)
    small = x < 1e-4
    y = np.where(small, 1.0, x)
    return np.asarray(np.where(small, 1.0 - x * x / 3.0, np.tanh(y) / y))
