"""Global indices over a box: Sobol indices from new samples, delta from what is stored.

The estimators are those of SALib (Iwanaga, Usher, Herman, *Socio-Environmental Systems Modelling*
4, 2022). Sobol indices: share of a metric's variance over the box that a variable causes alone
(first order) and with all its interactions (total) (Saltelli et al., *Comput. Phys. Commun.* 181,
2010). Delta: how much knowing the variable shifts the distribution of the metric (Borgonovo,
*Reliab. Eng. Syst. Saf.* 92, 2007; Plischke, Borgonovo, Smith, *Eur. J. Oper. Res.* 226, 2013).
"""

from __future__ import annotations

import warnings
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
Function = Callable[[FloatArray], tuple[Mapping[str, FloatArray], BoolArray]]

CONFIDENCE = 0.95
RESAMPLES = 100  # bootstrap resamples behind the confidence
# Delta estimates densities and is slow: its cost grows with rows, resamples, variables, metrics.
DELTA_ROWS = 500
DELTA_RESAMPLES = 10
ROUNDING = 1e-9  # relative spread that is rounding: a metric held constant by construction
FEWEST_BLOCKS = 8  # complete blocks (or tens of rows) below which an index means nothing


@dataclass(frozen=True)
class Indices:
    """Indices of several metrics for several variables, arrays (metrics, variables).

    Attributes
    ----------
    method : str
        ``sobol`` or ``delta``.
    variables, metrics : tuple of str
    first, first_confidence : array
        First-order Sobol index; half-width of the 95 % confidence interval.
    other, other_confidence : array
        Total Sobol index, or delta.
    evaluations, dropped : int
        Rows asked for, and rows left out because they failed or their block was incomplete.
    basis : str
        What was sampled, in words.
    """

    method: Literal["sobol", "delta"]
    variables: tuple[str, ...]
    metrics: tuple[str, ...]
    first: FloatArray
    first_confidence: FloatArray
    other: FloatArray
    other_confidence: FloatArray
    evaluations: int
    dropped: int
    basis: str

    @property
    def other_name(self) -> str:
        """Name of the second index."""
        return "total" if self.method == "sobol" else "delta"


class TooFewError(ValueError):
    """So many rows failed that no index can be given."""


def sobol_indices(
    function: Function,
    bounds: Mapping[str, tuple[float, float]],
    metrics: Sequence[str],
    base_samples: int,
    seed: int,
) -> Indices:
    """Sobol indices of `function` over a box, from base_samples * (variables + 2) evaluations.

    A row that fails takes its block of variables + 2 rows with it, because the estimator compares
    rows within a block; both are counted.

    Parameters
    ----------
    function : callable
        Takes designs (n, v) and returns metrics (n,) by name and a mask (n,) of usable rows.
    bounds : mapping of variable to (low, high)
        low below high.
    metrics : sequence of str
    base_samples : int
        A power of 2, as the Sobol sequence wants.
    seed : int

    Raises
    ------
    TooFewError
        If fewer than `FEWEST_BLOCKS` blocks are complete.
    """
    from SALib.analyze import sobol as analysis
    from SALib.sample import sobol as sampling

    problem = _problem(bounds)
    x = sampling.sample(problem, base_samples, calc_second_order=False, scramble=True, seed=seed)
    values, usable = function(np.asarray(x, dtype=np.float64))
    block = len(bounds) + 2
    complete: BoolArray = np.asarray(usable.reshape(-1, block).all(axis=1))
    kept = np.repeat(complete, block)
    if np.count_nonzero(complete) < FEWEST_BLOCKS:
        msg = (
            f"only {np.count_nonzero(complete)} of {len(complete)} blocks of samples could be "
            f"evaluated, at least {FEWEST_BLOCKS} are needed; raise --samples or narrow the bounds"
        )
        raise TooFewError(msg)
    found: list[tuple[FloatArray, ...]] = []
    for name in metrics:
        y = values[name][kept]
        if _constant(y):  # there is no variance to share out
            found.append(tuple(np.zeros(len(bounds)) for _ in range(4)))
            continue
        result = analysis.analyze(
            problem,
            y,
            calc_second_order=False,
            num_resamples=RESAMPLES,
            conf_level=CONFIDENCE,
            seed=seed,
        )
        found.append(tuple(np.asarray(result[k]) for k in ("S1", "S1_conf", "ST", "ST_conf")))
    return _indices(
        "sobol",
        bounds,
        metrics,
        found,
        evaluations=len(x),
        dropped=int(np.count_nonzero(~kept)),
        basis=f"{base_samples} base samples of a scrambled Sobol sequence over the study's box",
    )


def delta_indices(
    x: FloatArray,
    values: Mapping[str, FloatArray],
    usable: BoolArray,
    bounds: Mapping[str, tuple[float, float]],
    seed: int,
    basis: str,
) -> Indices:
    """Delta and first-order indices from designs (n, v) that were evaluated already.

    Of more than `DELTA_ROWS` usable rows as many are taken, evenly spaced.

    Raises
    ------
    TooFewError
        If fewer than ten times `FEWEST_BLOCKS` rows are usable.
    """
    from SALib.analyze import delta as analysis

    if np.count_nonzero(usable) < 10 * FEWEST_BLOCKS:
        msg = (
            f"only {np.count_nonzero(usable)} stored designs are usable, at least "
            f"{10 * FEWEST_BLOCKS} are needed; sweep further or sample anew"
        )
        raise TooFewError(msg)
    rows = np.flatnonzero(usable)
    chosen = rows[np.linspace(0, len(rows) - 1, min(len(rows), DELTA_ROWS)).round().astype(int)]
    problem = _problem(bounds)
    names = ("S1", "S1_conf", "delta_balanced", "delta_balanced_conf")
    found: list[tuple[FloatArray, ...]] = []
    for column in values.values():
        y = column[chosen]
        if _constant(y):
            found.append(tuple(np.zeros(len(bounds)) for _ in range(4)))
            continue
        with _quiet():
            result = analysis.analyze(
                problem,
                x[chosen],
                y,
                num_resamples=DELTA_RESAMPLES,
                conf_level=CONFIDENCE,
                seed=seed,
            )
        # Older releases know one delta only.
        keys = [k if k in result else k.replace("delta_balanced", "delta") for k in names]
        found.append(tuple(np.asarray(result[k]) for k in keys))
    return _indices(
        "delta",
        bounds,
        tuple(values),
        found,
        evaluations=len(usable),
        dropped=int(np.count_nonzero(~usable)),
        basis=basis,
    )


@contextmanager
def _quiet() -> Iterator[None]:
    """Keep warnings of merged bins and uneven samples back, and undo what the library sets.

    That the samples are uneven stands in the basis of the indices.
    """
    layout = warnings.formatwarning
    try:
        with warnings.catch_warnings(record=True):
            yield
    finally:
        warnings.formatwarning = layout


def _constant(y: FloatArray) -> bool:
    """Whether y varies by rounding at most."""
    return bool(np.ptp(y) <= ROUNDING * np.abs(y).max())


def _problem(bounds: Mapping[str, tuple[float, float]]) -> dict[str, Any]:
    return {
        "num_vars": len(bounds),
        "names": list(bounds),
        "bounds": [list(pair) for pair in bounds.values()],
    }


def _indices(
    method: Literal["sobol", "delta"],
    bounds: Mapping[str, tuple[float, float]],
    metrics: Sequence[str],
    found: list[tuple[FloatArray, ...]],
    evaluations: int,
    dropped: int,
    basis: str,
) -> Indices:
    first, first_confidence, other, other_confidence = (
        np.array([item[k] for item in found]).reshape(len(metrics), len(bounds)) for k in range(4)
    )
    return Indices(
        method=method,
        variables=tuple(bounds),
        metrics=tuple(metrics),
        first=first,
        first_confidence=first_confidence,
        other=other,
        other_confidence=other_confidence,
        evaluations=evaluations,
        dropped=dropped,
        basis=basis,
    )
