"""Yield of scattered machines and what it is lost to; plain arrays."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

Z95 = 1.959963984540054  # normal quantile of 97.5 %


@dataclass(frozen=True)
class Yield:
    """Share of machines that pass, with its 95 % confidence interval."""

    share: float
    low: float
    high: float
    machines: int


def yield_of(passed: BoolArray, lot: NDArray[np.int64]) -> Yield:
    """Yield of n machines in lots.

    The interval is Wilson's (*J. Amer. Statist. Assoc.* 22, 1927) with the number of machines
    reduced where lots differ more than chance would have it: then machines of one lot tell less
    than independent ones (effective sample size of cluster sampling, Kish, *Survey Sampling*,
    1965; from memory).
    """
    count = len(passed)
    share = float(np.mean(passed))
    effective = float(count)
    lots = np.unique(lot)
    if len(lots) > 1 and 0.0 < share < 1.0:
        by_lot = np.array([np.mean(passed[lot == item]) for item in lots])
        between = float(np.var(by_lot, ddof=1)) / len(lots)
        if between > 0.0:
            effective = min(effective, share * (1.0 - share) / between)
    spread = Z95**2 / effective
    centre = (share + 0.5 * spread) / (1.0 + spread)
    half = (
        Z95
        / (1.0 + spread)
        * np.sqrt(share * (1.0 - share) / effective + 0.25 * spread / effective)
    )
    low, high = max(0.0, float(centre - half)), min(1.0, float(centre + half))
    return Yield(share, low, high, count)


@dataclass(frozen=True)
class Contributions:
    """Variance of one quantity by source.

    Attributes
    ----------
    shares : array (k,)
        Share of the variance that each source explains linearly.
    slopes : array (k,)
        Change of the quantity per unit of each source.
    explained : float
        R^2 of the linear model; what is missing is curvature and interaction.
    mean, deviation : float
    """

    shares: FloatArray
    slopes: FloatArray
    explained: float
    mean: float
    deviation: float


def contributions(deviations: FloatArray, sigma: FloatArray, values: FloatArray) -> Contributions:
    """Squared standardised regression coefficients of independent sources.

    Saltelli et al., *Global Sensitivity Analysis: The Primer*, 2008, section 1.2.5 (from memory).

    Parameters
    ----------
    deviations : array (n, k)
    sigma : array (k,)
        Standard deviation of each source.
    values : array (n,)
        Without NaN.
    """
    variance = float(np.var(values))
    flat = variance <= (1e-12 * max(1.0, float(np.abs(values).max()))) ** 2
    centred = np.column_stack([np.ones(len(values)), deviations / sigma])
    solution, *_ = np.linalg.lstsq(centred, values, rcond=None)
    residual = values - centred @ solution
    scaled = solution[1:]
    return Contributions(
        shares=np.zeros(len(sigma)) if flat else np.asarray(scaled**2 / variance),
        slopes=np.asarray(scaled / sigma),
        explained=1.0 if flat else float(1.0 - np.var(residual) / variance),
        mean=float(np.mean(values)),
        deviation=0.0 if flat else float(np.sqrt(variance)),
    )
