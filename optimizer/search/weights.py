"""Weight vectors that split a multi-objective search into neighbouring single ones."""

from __future__ import annotations

from math import comb

import numpy as np

from optimizer.problem import FloatArray, IntArray

# A small population has more generations among as many evaluations. Four objectives and more
# need more weights to have one inside the simplex.
DEFAULT_POPULATION, DEFAULT_FOR_MANY, MANY = 40, 100, 4
# A component of zero would make an objective of no account for its weight.
SMALLEST_WEIGHT = 1e-6


def weight_vectors(objectives: int, population: int | None = None) -> FloatArray:
    """Weights (N, m) spread evenly over the unit simplex.

    Das and Dennis, SIAM J. Optim. 8 (1998) 631-657: all vectors whose components are
    multiples of 1/h and sum to 1. Their number is given by h, so N is the number nearest to
    the wanted one. From six objectives on, where such a set of about a hundred vectors has no
    inner point, a second layer at half size is added (Deb and Jain, IEEE Trans. Evol. Comput.
    18 (2014) 577-601). One objective needs one weight; it is repeated so that the population
    keeps its diversity by the neighbourhoods.

    Parameters
    ----------
    objectives : int
    population : int, optional
        Wanted number, by default 40, from four objectives on 100.
    """
    default = DEFAULT_POPULATION if objectives < MANY else DEFAULT_FOR_MANY
    wanted = default if population is None else population
    if objectives == 1:
        return np.ones((wanted, 1))
    # Importing pymoo takes far longer than the rest of this package.
    from pymoo.util.ref_dirs import get_reference_directions

    def layer(divisions: int) -> FloatArray:
        made = get_reference_directions("das-dennis", objectives, n_partitions=divisions)
        return np.asarray(made, dtype=np.float64)

    divisions = _divisions(objectives, wanted)
    if divisions >= objectives or objectives < 6:
        vectors = layer(divisions)
    else:
        outer = _divisions(objectives, max(wanted * 2 // 3, 2))
        inner = max(outer - 1, 1)
        vectors = np.concatenate([layer(outer), 0.5 * layer(inner) + 0.5 / objectives])
    vectors = np.maximum(vectors, SMALLEST_WEIGHT)
    return np.asarray(vectors / vectors.sum(axis=1, keepdims=True))


def neighbourhoods(weights: FloatArray) -> IntArray:
    """For each weight all weights (N, N), nearest first, itself at the head."""
    count = len(weights)
    if weights.shape[1] == 1:
        steps = np.abs(np.arange(count)[:, None] - np.arange(count)[None, :])
        distance = np.minimum(steps, count - steps).astype(np.float64)  # places on a ring
    else:
        # Rounding makes equal distances equal, so that the order is the same everywhere.
        difference = weights[:, None, :] - weights[None, :, :]
        distance = np.round((difference**2).sum(axis=2), 9)
    np.fill_diagonal(distance, -1.0)
    return np.argsort(distance, axis=1, kind="stable")


def _divisions(objectives: int, wanted: int) -> int:
    """Divisions h whose number of vectors, (h + m - 1) over h, is nearest to ``wanted``."""
    divisions = 1
    while comb(divisions + objectives - 1, divisions) < wanted:
        divisions += 1
    above = comb(divisions + objectives - 1, divisions)
    below = comb(divisions + objectives - 2, divisions - 1) if divisions > 1 else 0
    return divisions - 1 if below and wanted - below < above - wanted else divisions
