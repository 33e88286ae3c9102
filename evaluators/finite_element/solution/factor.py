"""Sparse LDL^T of many matrices of one pattern at once.

The designs of a batch share the pattern, so `LANES` matrices are interleaved: entry k of all of
them lies side by side in memory, and every arithmetic operation of the elimination is one vector
operation over the lanes. Left-looking by panels of up to `PANEL` columns of equal structure, so
that what is read from memory serves several columns (T. A. Davis, Direct Methods for Sparse Linear
Systems, SIAM 2006, ch. 4 and 9). No pivoting: the matrices are symmetric positive definite.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numba import njit
from numpy.typing import NDArray

from evaluators.finite_element.solution.lanes import (
    LANES,
    product,
    subtract_panel,
    subtract_product,
)

FloatArray = NDArray[np.float64]
IndexArray = NDArray[np.uint32]
IntArray = NDArray[np.int64]

PANEL = 4
"""Columns eliminated together; the kernels are written out for four."""


@dataclass(frozen=True)
class Pattern:
    """Where the entries of a symmetric matrix and of its factor stand.

    Attributes
    ----------
    size : int
    row, column : array (a,)
        Of the stored entries of the lower triangle, row >= column, diagonal included.
    start : array (size + 1,), index : array (f,)
        Columns of the factor below the diagonal, compressed.
    target : array (a,)
        Place of every matrix entry: in the factor, or, for the diagonal, f + row.
    panel : array (panels + 1,)
        First column of every panel.
    update_start : array (panels + 1,), update_column, update_place, update_count : arrays (u,)
        For every panel the earlier columns that reach into it, the place of the first of their
        entries there and how many there are.
    """

    size: int
    row: IntArray
    column: IntArray
    start: IndexArray
    index: IndexArray
    target: IndexArray
    panel: IndexArray
    update_start: IndexArray
    update_column: IndexArray
    update_place: IndexArray
    update_count: IndexArray

    @property
    def entries(self) -> int:
        """Stored entries of the matrix."""
        return int(self.row.size)

    @property
    def tables(self) -> tuple[IndexArray, ...]:
        """The arrays `factorise` wants."""
        return (
            self.target,
            self.start,
            self.index,
            self.panel,
            self.update_start,
            self.update_column,
            self.update_place,
            self.update_count,
        )


def analyse(size: int, row: IntArray, column: IntArray) -> Pattern:
    """Symbolic factorisation of the lower triangle given by unique pairs (row >= column)."""
    below = row > column
    structure = _structure(size, row[below], column[below])
    lengths = np.array([item.size for item in structure])
    start = np.concatenate([[0], np.cumsum(lengths)])
    index = np.concatenate(structure)
    owner = np.repeat(np.arange(size), lengths)
    place = np.searchsorted(owner * size + index, column * size + row)
    target = np.where(below, place, index.size + row)

    panel = [0]
    for j in range(1, size):
        before = structure[j - 1]
        nested = before.size == structure[j].size + 1 and before[0] == j
        if not nested or j - panel[-1] == PANEL:
            panel.append(j)
    number = np.repeat(np.arange(len(panel)), np.diff([*panel, size]))
    # Runs of factor entries that one column has in one panel other than its own.
    foreign = np.flatnonzero(number[index] != number[owner])
    key = number[index[foreign]] * size + owner[foreign]
    runs, first, count = np.unique(key, return_index=True, return_counts=True)
    update_start = np.searchsorted(runs // size, np.arange(len(panel) + 1))

    def packed(values: IntArray | list[int]) -> IndexArray:
        return np.ascontiguousarray(values, dtype=np.uint32)

    return Pattern(
        size,
        row,
        column,
        packed(start),
        packed(index),
        packed(target),
        packed([*panel, size]),
        packed(update_start),
        packed(runs % size),
        packed(foreign[first]),
        packed(count),
    )


def _structure(size: int, row: IntArray, column: IntArray) -> list[IntArray]:
    """Rows below the diagonal of every column of the factor, by the elimination tree."""
    order = np.lexsort((row, column))
    row = row[order]
    ends = np.searchsorted(column[order], np.arange(size + 1))
    children: list[list[IntArray]] = [[] for _ in range(size)]
    structure: list[IntArray] = []
    for j in range(size):
        own = row[ends[j] : ends[j + 1]]
        if children[j]:
            own = np.unique(np.concatenate([own, *children[j]]))
            own = own[own > j]
            children[j] = []
        structure.append(own)
        if own.size:
            children[int(own[0])].append(own[1:])
    return structure


@njit(cache=True, fastmath={"contract"}, error_model="numpy")
def _subtract(work, index, lower, first, last, s):  # type: ignore[no-untyped-def]
    """work[index[p]] -= s * lower[p] for p in first..last-1."""
    for p in range(first, last):
        subtract_product(work[index[p]], s, lower[p])


@njit(cache=True, fastmath={"contract"}, error_model="numpy")
def _dot(x, index, lower, first, last, s):  # type: ignore[no-untyped-def]
    """s -= sum of lower[p] * x[index[p]] over p in first..last-1."""
    for p in range(first, last):
        subtract_product(s, lower[p], x[index[p]])


@njit(cache=True, fastmath={"contract"}, error_model="numpy")
def factorise(  # type: ignore[no-untyped-def]
    values,
    target,
    start,
    index,
    panel,
    update_start,
    update_column,
    update_place,
    update_count,
    lower,
    diagonal,
    work,
):
    """Factorise `values` (a, LANES) into `lower` (f, LANES) and `diagonal` (size, LANES).

    The integer arrays are `Pattern.tables`; `work` (size, PANEL, LANES) is scratch.
    """
    off_diagonal = lower.shape[0]
    lower[:, :] = 0.0
    for e in range(values.shape[0]):
        t = target[e]
        if t < off_diagonal:
            lower[t, :] = values[e, :]
        else:
            diagonal[t - off_diagonal, :] = values[e, :]
    scale = np.empty((PANEL, LANES))
    corner = np.empty((PANEL, PANEL, LANES))
    one = np.uint32(1)
    for number in range(panel.shape[0] - 1):
        j0, j1 = panel[number], panel[number + 1]
        width = j1 - j0
        # Rows below the panel are those of its last column.
        below, end = start[j1 - one], start[j1]
        for c in range(width):
            first = start[j0 + c]
            for r in range(c + 1, width):
                corner[r, c, :] = lower[first + r - c - 1, :]
            corner[c, c, :] = diagonal[j0 + c, :]
            offset = first + width - c - 1
            for p in range(below, end):
                work[index[p], c, :] = lower[offset + p - below, :]
        for u in range(update_start[number], update_start[number + 1]):
            k, place, count = update_column[u], update_place[u], update_count[u]
            if count < PANEL:
                scale[:, :] = 0.0
            for q in range(count):
                r = index[place + q] - j0
                product(scale[r], lower[place + q], diagonal[k])
                for q2 in range(q + 1):
                    c = index[place + q2] - j0
                    subtract_product(corner[r, c], scale[c], lower[place + q])
            subtract_panel(work, index, lower, place + count, start[k + one], scale)
        for c in range(width):
            first = start[j0 + c]
            offset = first + width - c - 1
            diagonal[j0 + c, :] = corner[c, c, :]
            for lane in range(LANES):
                scale[c, lane] = 1.0 / corner[c, c, lane]
            for r in range(c + 1, width):
                left = lower[first + r - c - 1]
                product(left, corner[r, c], scale[c])
                for c2 in range(c + 1, r + 1):
                    subtract_product(corner[r, c2], left, corner[c2, c])
            for p in range(below, end):
                w = work[index[p]]
                product(lower[offset + p - below], w[c], scale[c])
                for c2 in range(c + 1, width):
                    subtract_product(w[c2], lower[first + c2 - c - 1], w[c])


@njit(cache=True, fastmath={"contract"}, error_model="numpy")
def solve(start, index, lower, diagonal, x):  # type: ignore[no-untyped-def]
    """Solve L D L^T x = b in place, x (size, LANES)."""
    size = diagonal.shape[0]
    scale = np.empty(LANES)
    for j in range(size):
        scale[:] = x[j, :]
        _subtract(x, index, lower, start[j], start[j + 1], scale)
    for back in range(size):
        j = size - 1 - back
        for lane in range(LANES):
            scale[lane] = x[j, lane] / diagonal[j, lane]
        _dot(x, index, lower, start[j], start[j + 1], scale)
        x[j, :] = scale
