"""Fronts and how they compare; every objective is minimised.

Non-dominated sorting, hypervolume, additive epsilon and IGD+ are computed by ``moocore``; it is
imported on first use because it takes longer than the rest of this package.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from optimizer.problem import BoolArray, FloatArray, IntArray

_SORT_BELOW = 1000  # points; from there on comparing is faster than sorting (measured)
_BLOCK_ELEMENTS = 4_000_000  # of one comparison array: 32 MB of numbers


def non_dominated(objectives: ArrayLike) -> BoolArray:
    """Mask of the points that no other point dominates; of equal points the first is kept.

    Parameters
    ----------
    objectives : (n, m) array
        Finite numbers.

    Returns
    -------
    (n,) array of bool
    """
    points = _points(objectives)
    if len(points) == 0:
        return np.zeros(0, dtype=np.bool_)
    if points.shape[1] == 1:
        mask = np.zeros(len(points), dtype=np.bool_)
        mask[np.argmin(points[:, 0])] = True
        return mask
    import moocore

    return np.asarray(moocore.is_nondominated(points), dtype=np.bool_)


def hypervolume(points: ArrayLike, reference: ArrayLike) -> float:
    """Volume that ``points`` (n, m) dominate below the ``reference`` point (m,).

    Points that do not lie below the reference in every objective add nothing.
    Zitzler and Thiele, IEEE Trans. Evol. Comput. 3 (1999) 257-271.
    """
    points = _points(points)
    corner = np.asarray(reference, dtype=np.float64)
    if corner.shape != (points.shape[1],):
        msg = f"reference has shape {corner.shape}; ({points.shape[1]},) fits the points"
        raise ValueError(msg)
    points = points[(points < corner).all(axis=1)]
    if len(points) == 0:
        return 0.0
    if points.shape[1] == 1:
        return float(corner[0] - points.min())
    import moocore

    return float(moocore.hypervolume(points, ref=corner))


def hypervolume_estimate(points: ArrayLike, reference: ArrayLike) -> float:
    """Estimate of :func:`hypervolume` for six objectives and more, where that takes minutes.

    An integral over 16384 fixed, evenly spread directions (Deng and Zhang, IEEE Trans. Evol.
    Comput. 23 (2019) 913-918, with the points of ``moocore``'s method Rphi-FWE+), so it is the
    same whenever it is asked, and further points never lower it.
    """
    points = _points(points)
    corner = np.asarray(reference, dtype=np.float64)
    points = points[(points < corner).all(axis=1)]
    if len(points) == 0:
        return 0.0
    import moocore

    return float(moocore.hv_approx(points, ref=corner, nsamples=2**14, method="Rphi-FWE+"))


def coverage(a: ArrayLike, b: ArrayLike) -> float:
    """Share of the points of ``b`` that some point of ``a`` equals or dominates.

    Set coverage C(a, b) of Zitzler and Thiele (1999), cited at :func:`hypervolume`. It is not
    symmetric: give both directions. NaN if ``b`` is empty.
    """
    first, second = _pair(a, b)
    if len(second) == 0:
        return float("nan")
    if len(first) == 0:
        return 0.0
    distinct, counts = np.unique(second, axis=0, return_counts=True)
    own = non_dominated(distinct)
    covered = np.zeros(len(distinct), dtype=np.bool_)
    # Of points that do not dominate one another, those that fall out beside the others do so
    # because of them: sorting finds that far sooner than comparing every pair.
    covered[own] = ~non_dominated(np.concatenate([first, distinct[own]]))[len(first) :]
    rest = np.flatnonzero(~own)
    step = max(1, _BLOCK_ELEMENTS // first.size)
    for start in range(0, len(rest), step):
        block = rest[start : start + step]
        covered[block] = np.all(first[None] <= distinct[block, None, :], axis=2).any(axis=1)
    return float(counts[covered].sum() / len(second))


def additive_epsilon(a: ArrayLike, b: ArrayLike) -> float:
    """Smallest number by which ``a`` must be shifted down to equal or dominate all of ``b``.

    In the unit of the objectives, so give objectives scaled alike. Infinite if ``a`` is empty.
    Zitzler et al., IEEE Trans. Evol. Comput. 7 (2003) 117-132.
    """
    first, second = _pair(a, b)
    if len(first) == 0 or len(second) == 0:
        return float("inf") if len(second) else float("-inf")
    import moocore

    return float(moocore.epsilon_additive(first, ref=second))


def igd_plus(points: ArrayLike, reference_front: ArrayLike) -> float:
    """Mean distance from the reference front to the region the points dominate (IGD+).

    Ishibuchi et al., EMO 2015, LNCS 9019, 110-125. Infinite if there are no points.
    """
    first, second = _pair(points, reference_front)
    if len(second) == 0:
        msg = "the reference front is empty; IGD+ needs at least one reference point"
        raise ValueError(msg)
    if len(first) == 0:
        return float("inf")
    import moocore

    return float(moocore.igd_plus(first, ref=second))


def normalise(
    objectives: ArrayLike, ideal: ArrayLike | None = None, nadir: ArrayLike | None = None
) -> FloatArray:
    """Scale objectives so that ``ideal`` becomes 0 and ``nadir`` 1.

    Default are the smallest and the largest value of each objective. An objective that does
    not vary becomes 0 at the ideal and keeps its own unit elsewhere.
    """
    points = _points(objectives)
    low = points.min(axis=0) if ideal is None else np.asarray(ideal, dtype=np.float64)
    high = points.max(axis=0) if nadir is None else np.asarray(nadir, dtype=np.float64)
    span = high - low
    return np.asarray((points - low) / np.where(span > 0.0, span, 1.0))


def compromise(objectives: ArrayLike) -> int:
    """Index of the point nearest to the ideal once every objective spans 0 to 1.

    The distance is Euclidean; of equally near points the first is taken. Give a front, not all
    designs, because the scale follows from the points given.
    """
    points = _points(objectives)
    if len(points) == 0:
        msg = "there is no point to choose a compromise from"
        raise ValueError(msg)
    return int(np.argmin((normalise(points) ** 2).sum(axis=1)))


class Front:
    """Growing set of non-dominated points with the number of the evaluation that gave each.

    The set has no size limit. Points stay in the order in which they came.
    """

    def __init__(self, objectives: int) -> None:
        # Columns with room to grow: what is compared lies together, what is added is not copied.
        self._columns: FloatArray = np.zeros((objectives, 64))
        self._numbers: IntArray = np.zeros(64, dtype=np.int64)
        self._count = 0

    def __len__(self) -> int:
        return self._count

    @property
    def points(self) -> FloatArray:
        """Points (n, m); a view that the next :meth:`add` may change."""
        return self._columns[:, : self._count].T

    @property
    def evaluations(self) -> IntArray:
        """Number (n,) of the evaluation that gave each; a view too."""
        return self._numbers[: self._count]

    def add(self, points: FloatArray, evaluations: IntArray) -> None:
        """Add feasible ``points`` (n, m); drop whatever is dominated then."""
        if len(points) == 0:
            return
        first = non_dominated(points)
        points, evaluations = points[first], evaluations[first]
        if len(self) < _SORT_BELOW:
            both = np.concatenate([self.points, points])
            mask = non_dominated(both)
            self.replace(both[mask], np.concatenate([self.evaluations, evaluations])[mask])
            return
        # Sorting a large front anew for a few points is wasteful; compare the few with it.
        columns = self._columns[:, : self._count]
        new = np.array([not _compare(columns, point, np.less_equal).any() for point in points])
        points, evaluations = points[new], evaluations[new]
        beaten = np.zeros(len(self), dtype=np.bool_)
        for point in points:
            beaten |= _compare(columns, point, np.greater_equal)
        if beaten.any():
            left = np.flatnonzero(~beaten)
            for column in (*self._columns, self._numbers):
                column[: len(left)] = column[left]
            self._count = len(left)
        self._append(points, evaluations)

    def replace(self, points: FloatArray, evaluations: IntArray) -> None:
        """Hold these points, which must not dominate one another, instead."""
        self._count = 0
        self._append(points, evaluations)

    def _append(self, points: FloatArray, evaluations: IntArray) -> None:
        end = self._count + len(points)
        if end > len(self._numbers):
            room = max(end, 2 * len(self._numbers))
            columns, numbers = np.zeros((points.shape[1], room)), np.zeros(room, dtype=np.int64)
            columns[:, : self._count] = self._columns[:, : self._count]
            numbers[: self._count] = self._numbers[: self._count]
            self._columns, self._numbers = columns, numbers
        self._columns[:, self._count : end] = points.T
        self._numbers[self._count : end] = evaluations
        self._count = end


def _compare(columns: FloatArray, point: FloatArray, relation: np.ufunc) -> BoolArray:
    """Mask of the points, stored as columns (m, n), in that relation to ``point`` throughout."""
    mask = relation(columns[0], point[0])
    for column, value in zip(columns[1:], point[1:], strict=True):
        mask &= relation(column, value)
    return np.asarray(mask)


def _points(values: ArrayLike) -> FloatArray:
    points = np.asarray(values, dtype=np.float64)
    if points.ndim != 2 or points.shape[1] == 0:
        msg = f"points have shape {points.shape}; (points, objectives) is wanted"
        raise ValueError(msg)
    if np.isnan(points).any():
        msg = "points hold NaN; leave out rows that failed"
        raise ValueError(msg)
    return np.ascontiguousarray(points)


def _pair(a: ArrayLike, b: ArrayLike) -> tuple[FloatArray, FloatArray]:
    first, second = _points(a), _points(b)
    if first.shape[1] != second.shape[1]:
        msg = f"the fronts have {first.shape[1]} and {second.shape[1]} objectives; compare like"
        raise ValueError(msg)
    return first, second
