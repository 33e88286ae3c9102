"""A spread choice of a front, where it holds more designs than a report can show in full."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]


def spread(points: FloatArray, count: int) -> NDArray[np.int64]:
    """Rows of at most `count` points that cover the front, in rising order.

    The best point in every objective comes first, then the point nearest to the corner of all
    best values, then always the point farthest from those taken (Gonzalez, Theor. Comput. Sci. 38,
    1985: within a factor two of the best cover).

    Parameters
    ----------
    points : array (n, m)
        Scaled so that distances mean something.
    count : int
        At least m + 1 are kept if there are so many.
    """
    if len(points) <= count:
        return np.arange(len(points))
    first = [int(np.argmin(column)) for column in points.T]
    first.append(int(np.argmin(((points - points.min(axis=0)) ** 2).sum(axis=1))))
    taken = list(dict.fromkeys(first))
    distance = np.min([((points - points[row]) ** 2).sum(axis=1) for row in taken], axis=0)
    while len(taken) < count:
        row = int(np.argmax(distance))
        taken.append(row)
        distance = np.minimum(distance, ((points - points[row]) ** 2).sum(axis=1))
    return np.sort(np.array(taken, dtype=np.int64))
