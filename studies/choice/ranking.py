"""Scores of designs by several criteria; plain arrays, everything minimised."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from optimizer.fronts import non_dominated

FloatArray = NDArray[np.float64]

AUGMENTATION = 1e-3
"""Weight of the sum beside the maximum: small, only to prefer the better of two designs that are
equal in their worst criterion."""


@dataclass(frozen=True)
class Scale:
    """Range of each criterion over the designs that no other beats, arrays (c,)."""

    ideal: FloatArray
    nadir: FloatArray

    @property
    def span(self) -> FloatArray:
        """Width of the range, 1 where there is none."""
        width = self.nadir - self.ideal
        return np.where(width > 0.0, width, 1.0)


def scale_of(values: FloatArray) -> Scale:
    """Scale of minimised values (n, c), n at least 1."""
    front = values[non_dominated(values)]
    return Scale(front.min(axis=0), front.max(axis=0))


def achievement(
    values: FloatArray, aspiration: FloatArray, weights: FloatArray, scale: Scale
) -> FloatArray:
    """Augmented achievement scalarising function, (n,); the smallest is the best.

    max_i w_i (z_i - a_i) / r_i + rho sum_i w_i (z_i - a_i) / r_i with the aspiration levels a and
    the ranges r. Negative where every aspiration is surpassed. Whatever a is, the smallest is
    Pareto-optimal. Wierzbicki, "The use of reference objectives in multiobjective optimization",
    *Lecture Notes in Economics and Mathematical Systems* 177, 1980; with all a at the ideal it is
    the weighted Chebyshev distance.

    Parameters
    ----------
    values : array (n, c)
        Minimised.
    aspiration, weights : array (c,)
    scale : Scale
    """
    terms = weights * (values - aspiration) / scale.span
    return np.asarray(terms.max(axis=1) + AUGMENTATION * terms.sum(axis=1))


def weighted_sum(values: FloatArray, weights: FloatArray, scale: Scale) -> FloatArray:
    """Weighted sum of the criteria, each from 0 at its ideal to 1 at its nadir, (n,).

    Zadeh, "Optimality and non-scalar-valued performance criteria", *IEEE Trans. Automatic
    Control* 8, 1963. It never finds designs in a dent of the front; `achievement` does.
    """
    return np.asarray(((values - scale.ideal) / scale.span) @ weights)
