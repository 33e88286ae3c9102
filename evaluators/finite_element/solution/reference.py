"""The slow path: the same equations in plain NumPy and SciPy, one design after the other.

Needs no compiled kernels. Tests hold the batched path against it; it also serves where the
batched one is not wanted.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csc_matrix
from scipy.sparse.linalg import SuperLU, splu

from evaluators.finite_element.solution.factor import Pattern
from evaluators.finite_element.solution.lanes import LANES
from evaluators.finite_element.solution.system import NU_0, Topology
from evaluators.machine.materials.magnetization import MagnetizationCurve

FloatArray = NDArray[np.float64]


class SciPySolver:
    """Sparse LU of every lane; satisfies `newton.LinearSolver`."""

    def __init__(self, pattern: Pattern) -> None:
        self.pattern = pattern
        self._factors: list[SuperLU] = []

    def factorise(self, values: FloatArray) -> None:
        """Factorise entries (entries, LANES) of the pattern."""
        self._factors = [splu(full_matrix(self.pattern, values[:, k])) for k in range(LANES)]

    def solve(self, load: FloatArray) -> FloatArray:
        """Solution (size, LANES) for a right-hand side of that shape."""
        columns = [self._factors[k].solve(np.ascontiguousarray(load[:, k])) for k in range(LANES)]
        return np.stack(columns, axis=1)


def full_matrix(pattern: Pattern, values: FloatArray) -> csc_matrix:
    """Symmetric matrix of one lane from the entries of its lower triangle."""
    shape = (pattern.size, pattern.size)
    lower = csc_matrix((values, (pattern.row, pattern.column)), shape=shape)
    strict = pattern.row > pattern.column
    upper = csc_matrix((values[strict], (pattern.column[strict], pattern.row[strict])), shape=shape)
    return csc_matrix(lower + upper)


def tangent(
    topology: Topology,
    gradient: FloatArray,
    weight: FloatArray,
    curve: MagnetizationCurve,
    gap: FloatArray,
    potential: FloatArray,
) -> tuple[FloatArray, csc_matrix]:
    """Internal force K(A) A (size,) and tangent matrix of one design.

    Parameters
    ----------
    gradient, weight : arrays (cells of a slot, POINTS, 8, 2) and (cells of a slot, POINTS)
    curve : MagnetizationCurve
    gap : array (bore nodes, bore nodes)
        Stiffness of gap and rotor, bore nodes in order.
    potential : array (size,)
    """
    size = topology.size
    force = np.zeros(size + 1)
    rows, columns, entries = [], [], []
    padded = np.append(potential, 0.0)
    own = float(topology.lattice.sector.sign)
    for (nodes, beyond, _, geometry), iron in (
        (topology.iron_cells, True),
        (topology.air_cells, False),
    ):
        if not len(nodes):
            continue
        signs = np.where(beyond, own, 1.0)
        g, w = gradient[geometry], weight[geometry]
        flux = np.einsum("cqad,ca->cqd", g, signs * padded[nodes])
        square = np.sum(flux**2, axis=2)
        nu, rise = curve.reluctivity(square) if iron else (NU_0, 0.0)
        local = np.einsum("cq,cqad,cqd->ca", w * nu, g, flux)
        np.add.at(force, nodes, signs * local)
        along = np.einsum("cqad,cqd->cqa", g, flux)
        stiff = np.einsum("cq,cqad,cqbd->cab", w * nu, g, g)
        stiff += np.einsum("cq,cqa,cqb->cab", 2.0 * w * rise, along, along)
        stiff *= signs[:, :, None] * signs[:, None, :]
        rows.append(np.repeat(nodes, 8, axis=1).ravel())
        columns.append(np.tile(nodes, (1, 8)).ravel())
        entries.append(stiff.ravel())
    row, column = (np.concatenate(item).astype(np.int64) for item in (rows, columns))
    bore = topology.lattice.bore.ravel()
    force[bore] += gap @ potential[bore]
    values = np.concatenate([np.concatenate(entries), gap.ravel()])
    row = np.concatenate([row, np.repeat(bore, bore.size)])
    column = np.concatenate([column, np.tile(bore, bore.size)])
    inside = (row < size) & (column < size)
    matrix = csc_matrix((values[inside], (row[inside], column[inside])), shape=(size, size))
    return force[:size], matrix
