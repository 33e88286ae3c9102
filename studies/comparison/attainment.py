"""What several searches of one family reach: the empirical attainment function.

A point is attained by a search if some design of its front equals or beats it in every objective.
The share of searches that attain a point estimates the chance that one search does; the points
attained by at least one, half and all of them are bounded by the best, median and worst attainment
surface. Grunert da Fonseca, Fonseca and Hall, EMO 2001, LNCS 1993, 213-225.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from optimizer.fronts import hypervolume

FloatArray = NDArray[np.float64]

MOST_OBJECTIVES = 3  # in which volumes are known; a surface has two


def levels(searches: int) -> tuple[int, int, int]:
    """How many searches attain the best, median and worst surface."""
    return 1, (searches + 1) // 2, searches


def attainment_surface(fronts: Sequence[FloatArray], level: int) -> FloatArray:
    """Corners of the region that at least `level` of the fronts attain, in two objectives.

    Parameters
    ----------
    fronts : sequence of array (n, 2)
        Minimised values of each search; an empty one attains nothing.
    level : int
        From 1 to the number of fronts.

    Returns
    -------
    array (k, 2)
        By growing first and falling second objective, none dominating another; empty if nothing
        is attained so often.
    """
    across = np.unique(np.concatenate([front[:, 0] for front in fronts]))
    if not len(across):
        return np.zeros((0, 2))
    reached = np.full((len(fronts), len(across)), np.inf)
    for row, front in enumerate(fronts):
        place = np.searchsorted(across, front[:, 0])
        np.minimum.at(reached[row], place, front[:, 1])
    # The lowest that each search reaches up to here, then the `level`-th lowest of the searches.
    reached = np.sort(np.minimum.accumulate(reached, axis=1), axis=0)[level - 1]
    before = np.concatenate([[np.inf], reached[:-1]])
    corner = reached < before
    return np.column_stack([across[corner], reached[corner]])


def attained_share(fronts: Sequence[FloatArray], level: int, reference: float) -> float:
    """Share of the box from 0 to `reference` that at least `level` of the fronts attain.

    Parameters
    ----------
    fronts : sequence of array (n, m)
        On the scale of the box; at most `MOST_OBJECTIVES` objectives unless `level` is 1.
    level : int
    reference : float
        In every objective.
    """
    filled = [front for front in fronts if len(front)]
    if len(filled) < level:
        return 0.0
    objectives = filled[0].shape[1]
    if level == 1:
        corners = np.concatenate(filled)
    elif objectives == 2:
        corners = attainment_surface(filled, level)
    elif objectives == MOST_OBJECTIVES:
        import moocore

        sets = np.repeat(np.arange(1, len(filled) + 1), [len(front) for front in filled])
        wanted = 100.0 * level / len(filled)
        corners = moocore.eaf(np.concatenate(filled), sets, percentiles=[wanted])[:, :-1]
    else:
        msg = f"{objectives} objectives; attained volumes are known for {MOST_OBJECTIVES} at most"
        raise ValueError(msg)
    corner = np.full(objectives, reference)
    return float(hypervolume(corners, corner) / reference**objectives)
