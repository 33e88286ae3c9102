"""Iron loss: hysteresis, classical eddy currents and excess loss."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike
from scipy.optimize import least_squares, nnls

from evaluators.machine.quantity import FloatArray, floats

MEAN_COS_1_5 = math.gamma(1.25) / (math.sqrt(math.pi) * math.gamma(1.75))
"""Mean over a period of |cos|^1.5, which ties the excess loss of a sine to that of a waveform."""


@dataclass(frozen=True)
class IronLossCoefficients:
    """Coefficients of the three-term law p = k_h f B^(n + s B) + k_c (f B)² + k_e (f B)^1.5.

    Bertotti, "General properties of power losses in soft ferromagnetic materials", *IEEE Trans.
    Magn.* 24(1), 1988, for the separation; the exponent growing with B is a common refinement for
    sheets near saturation. B is the peak value in T, f in Hz, p in W/kg.

    Parameters
    ----------
    hysteresis
        k_h in W/kg at 1 Hz and 1 T.
    exponent
        n, dimensionless.
    classical
        k_c in W/kg at 1 Hz and 1 T; see `classical_coefficient`.
    excess
        k_e in W/kg at 1 Hz and 1 T.
    exponent_slope
        s in 1/T.

    Raises
    ------
    ValueError
        If a coefficient is negative or the exponent is not within 0.5 to 4.
    """

    hysteresis: float
    exponent: float
    classical: float
    excess: float
    exponent_slope: float = 0.0

    def __post_init__(self) -> None:
        for name in ("hysteresis", "classical", "excess", "exponent_slope"):
            value = getattr(self, name)
            if not (math.isfinite(value) and value >= 0.0):
                msg = f"{name} = {value} is negative or not finite; the limit is 0"
                raise ValueError(msg)
        if not 0.5 <= self.exponent <= 4.0:
            msg = f"exponent = {self.exponent} is outside the range 0.5 to 4"
            raise ValueError(msg)


class IronLoss(NamedTuple):
    """Parts of the iron loss in W/kg."""

    hysteresis: FloatArray
    classical: FloatArray
    excess: FloatArray

    @property
    def total(self) -> FloatArray:
        """Sum of the three parts in W/kg."""
        return self.hysteresis + self.classical + self.excess


def classical_coefficient(thickness: float, resistivity: float, density: float) -> float:
    """Return k_c in W/kg at 1 Hz and 1 T: pi² d² / (6 rho_e density).

    Thin sheet without skin effect; thickness in m, resistivity in ohm m, density in kg/m3.
    Bozorth, *Ferromagnetism*, 1951 (from memory).
    """
    return math.pi**2 * thickness**2 / (6.0 * resistivity * density)


def iron_loss_sine(
    coefficients: IronLossCoefficients, flux_density: ArrayLike, frequency: ArrayLike
) -> IronLoss:
    """Return the loss in W/kg at sinusoidal B of peak `flux_density` (T) and `frequency` (Hz)."""
    b = np.abs(floats(flux_density))
    f = np.abs(floats(frequency))
    fb = f * b
    return IronLoss(
        hysteresis=np.asarray(_hysteresis_energy(coefficients, b) * f),
        classical=np.asarray(coefficients.classical * fb * fb),
        excess=np.asarray(coefficients.excess * fb * np.sqrt(fb)),
    )


def iron_loss_from_waveform(
    coefficients: IronLossCoefficients,
    flux_density: ArrayLike,
    frequency: ArrayLike,
    second_component: ArrayLike | None = None,
    minor_loops: bool = False,
    smooth: bool = False,
) -> IronLoss:
    """Return the loss in W/kg of a periodic waveform.

    Classical loss from the mean of (dB/dt)², excess from that of |dB/dt|^1.5 (Bertotti 1988),
    hysteresis from half the excursion of B. The derivative is that of the polygon through the
    samples: exact for a triangle, low by (pi/t)²/3 for a sine of t samples per period.

    Parameters
    ----------
    flux_density
        One period at equal steps without the repeated end point, T, shape (..., t).
    frequency
        Fundamental frequency of that period in Hz, shape (...).
    second_component
        The flux density at right angles to the first, same shape. Hysteresis then is that of
        both components, as for an elliptic locus (common practice); the others follow from the
        length of the derivative vector.
    minor_loops
        Scale the hysteresis by the path of B over that of a single loop. This is the improved
        generalised Steinmetz law with alpha = 1 without splitting the loops (Venkatachalam,
        Sullivan, Abdallah, Tacca, COMPEL 2002), an upper estimate, because every minor loop is
        charged at the excursion of the main loop.
    smooth
        Take the derivative halfway between two samples from four of them, exact for a cubic,
        instead of from two: low by 3/320 (2 pi/t)⁴ in the classical loss of a sine.

    Returns
    -------
    IronLoss
        Each part of shape (...).
    """
    f = floats(frequency)
    components = [floats(flux_density)]
    if second_component is not None:
        components.append(floats(second_component))
    samples = components[0].shape[-1]
    hysteresis = np.zeros(np.broadcast_shapes(components[0].shape[:-1], f.shape))
    speed_squared = np.zeros_like(components[0])
    for b in components:
        step = np.roll(b, -1, axis=-1) - b
        peak = 0.5 * (b.max(axis=-1) - b.min(axis=-1))
        energy = _hysteresis_energy(coefficients, peak)
        if minor_loops:
            path = np.abs(step).sum(axis=-1)
            energy = energy * np.where(
                peak > 0.0, path / np.where(peak > 0.0, 4.0 * peak, 1.0), 1.0
            )
        hysteresis = hysteresis + energy * f
        if smooth:
            step = (26.0 * step - np.roll(step, 1, axis=-1) - np.roll(step, -1, axis=-1)) / 24.0
        speed_squared = speed_squared + (step * samples) ** 2
    # speed_squared is (dB/dt)² in units of f², hence the powers of f below.
    classical = speed_squared.mean(axis=-1) * f**2 / (2.0 * math.pi**2)
    excess = (speed_squared**0.75).mean(axis=-1) * f**1.5 / excess_constant()
    return IronLoss(
        hysteresis=np.asarray(hysteresis),
        classical=np.asarray(coefficients.classical * classical),
        excess=np.asarray(coefficients.excess * excess),
    )


def excess_constant() -> float:
    """Return the mean of |dB/dt|^1.5 over (f B)^1.5 for a sine, 8.763 (Bertotti 1988)."""
    return float((2.0 * math.pi) ** 1.5 * MEAN_COS_1_5)


def fit_iron_loss(
    frequency: ArrayLike,
    flux_density: ArrayLike,
    loss: ArrayLike,
    classical: float | None = None,
    exponent_slope: bool = True,
) -> IronLossCoefficients:
    """Fit the coefficients to a loss table by least squares of the relative error.

    With `classical` held fixed this separates the mechanisms as Bertotti 1988 does: classical loss
    from thickness and resistivity, what is left by its growth with frequency. What the law cannot
    follow, 2 % of a point at most over the shipped tables, belongs to no mechanism.

    Parameters
    ----------
    frequency, flux_density, loss
        The measured points in Hz, T (peak) and W/kg, shape (k,).
    classical
        k_c to hold fixed (see `classical_coefficient`); left out, it is fitted too.
    exponent_slope
        Whether the exponent may grow with B.

    Raises
    ------
    ValueError
        If there are fewer points than coefficients, or a point is not positive.
    """
    f, b, p = (floats(a).ravel() for a in (frequency, flux_density, loss))
    if not (f.size == b.size == p.size and f.size >= 6):
        sizes = f"{f.size}, {b.size} and {p.size}"
        msg = f"a loss fit needs three equally long lists of at least 6 points, got {sizes}"
        raise ValueError(msg)
    if not (np.all(f > 0.0) and np.all(b > 0.0) and np.all(p > 0.0)):
        msg = "frequency, flux density and loss of a loss table must be positive"
        raise ValueError(msg)

    def linear(shape: FloatArray) -> tuple[FloatArray, FloatArray]:
        slope = shape[1] if exponent_slope else 0.0
        terms = [f * b ** (shape[0] + slope * b), (f * b) ** 1.5]
        target = np.ones_like(p)
        if classical is None:
            terms.append((f * b) ** 2)
        else:
            target = target - classical * (f * b) ** 2 / p
        matrix = np.stack([term / p for term in terms], axis=1)
        scale = np.linalg.norm(matrix, axis=0)
        solution, _ = nnls(matrix / scale, target)
        return solution / scale, matrix @ (solution / scale) - target

    def residual(shape: FloatArray) -> FloatArray:
        return linear(shape)[1]

    start, lower, upper = [1.7, 0.2], [0.5, 0.0], [4.0, 3.0]
    free = 2 if exponent_slope else 1
    shape = least_squares(
        residual,
        start[:free],
        bounds=(lower[:free], upper[:free]),
        xtol=1e-14,
        ftol=1e-14,
        gtol=1e-14,
    ).x
    k = linear(shape)[0]
    return IronLossCoefficients(
        hysteresis=float(k[0]),
        exponent=float(shape[0]),
        classical=float(k[2]) if classical is None else classical,
        excess=float(k[1]),
        exponent_slope=float(shape[1]) if exponent_slope else 0.0,
    )


def _hysteresis_energy(coefficients: IronLossCoefficients, peak: FloatArray) -> FloatArray:
    """Energy per cycle in J/kg at 0 or more T."""
    positive = peak > 0.0
    b = np.where(positive, peak, 1.0)
    power = b ** (coefficients.exponent + coefficients.exponent_slope * b)
    return np.asarray(coefficients.hysteresis * np.where(positive, power, 0.0))
