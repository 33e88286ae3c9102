"""Assembly of the field equations of a sector for a batch of LANES designs.

Unknown is the vector potential A on the nodes; the equations are the stationary point of the
magnetic energy minus the work of the currents, so that the tangent is symmetric. Everything linear
(air, slots, gap and rotor) is assembled once per design; the iron is assembled at every iteration
with the consistent tangent.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numba import njit
from numpy.typing import NDArray

from evaluators.finite_element.mesh.geometry import POINTS, SHAPE, Mesh
from evaluators.finite_element.mesh.lattice import Lattice
from evaluators.finite_element.solution.factor import Pattern, analyse
from evaluators.finite_element.solution.gap import bore_entries
from evaluators.finite_element.solution.lanes import (
    LANES,
    add_product,
    add_products,
    product,
    products,
)
from evaluators.machine.materials.magnetization import MagnetizationCurve

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]
IndexArray = NDArray[np.uint32]

NU_0 = 1.0 / (4e-7 * np.pi)
STEP = 0.01  # T, width of the bins in which a piece of the magnetisation curve is looked up


@dataclass(frozen=True)
class CurveTable:
    """A magnetisation curve prepared for the kernels: its cubic pieces and a bin index.

    Attributes
    ----------
    knots : array (k,)
        Flux densities where the pieces begin, T; the last piece is the vacuum line.
    cubic : array (k, 4)
        H = c0 + c1 t + c2 t^2 + c3 t^3 with t = B - knot.
    piece : array
        Piece that holds at the beginning of each bin of `STEP`.
    """

    knots: FloatArray
    cubic: FloatArray
    piece: IntArray

    @classmethod
    def of(cls, curve: MagnetizationCurve) -> CurveTable:
        """Prepare a curve."""
        b, h, s = curve.flux_density_points, curve.field_points, curve.slopes
        width, secant = np.diff(b), np.diff(h) / np.diff(b)
        cubic = np.zeros((b.size, 4))
        cubic[:, 0], cubic[:, 1] = h, s
        cubic[-1, 1] = NU_0
        cubic[:-1, 2] = (3.0 * secant - 2.0 * s[:-1] - s[1:]) / width
        cubic[:-1, 3] = (s[:-1] + s[1:] - 2.0 * secant) / width**2
        cubic[0, 2] = 0.0  # the first piece is odd in B
        bins = np.arange(int(np.ceil(b[-1] / STEP)) + 1) * STEP
        piece = np.searchsorted(b, bins, side="right") - 1
        return cls(b, np.ascontiguousarray(cubic), piece)

    @classmethod
    def linear(cls, relative_permeability: float) -> CurveTable:
        """Straight line through the origin."""
        slope = NU_0 / relative_permeability
        cubic = np.array([[0.0, slope, 0.0, 0.0]])
        return cls(np.zeros(1), cubic, np.zeros(1, dtype=np.int64))

    @property
    def arrays(self) -> tuple[FloatArray, FloatArray, IntArray]:
        """What the kernels want."""
        return self.knots, self.cubic, self.piece


@njit(cache=True, error_model="numpy")
def reluctivity(square, knots, cubic, piece):  # type: ignore[no-untyped-def]
    """Reluctivity H/B and twice its derivative by B^2, both at B^2."""
    b = np.sqrt(square)
    position = int(b / STEP)
    k = piece[min(position, piece.shape[0] - 1)]
    while k + 1 < knots.shape[0] and knots[k + 1] <= b:
        k += 1
    c0, c1, c2, c3 = cubic[k, 0], cubic[k, 1], cubic[k, 2], cubic[k, 3]
    if k == 0:
        return c1 + c3 * square, 2.0 * c3
    t = b - knots[k]
    nu = (c0 + t * (c1 + t * (c2 + t * c3))) / b
    slope = c1 + t * (2.0 * c2 + 3.0 * c3 * t)
    return nu, (slope - nu) / square


@njit(cache=True, error_model="numpy")
def _iron(  # type: ignore[no-untyped-def]
    potential,
    past,
    cells,
    beyond,
    own,
    entries,
    geometry,
    gradient,
    weight,
    curve,
    values,
    residual,
    tangent,
):
    """Add the iron: `residual` of the potential and, if `tangent`, the tangent into `values`.

    potential, residual : (size + 1, LANES), the last row belongs to A = 0
    past, own : factor past the sector of the potential and of the equations; they differ where
        the tangent at one field is wanted for another
    cells, beyond : (k, 8); entries : (k, 36), one past the end for A = 0; geometry : (k,)
    gradient : (g, POINTS, 8, 2, LANES); weight : (g, POINTS, LANES)
    """
    knots, cubic, piece = curve
    local = np.empty((8, LANES))
    force = np.empty((8, LANES))
    stiff = np.empty((36, LANES))
    left = np.empty((8, 2, LANES))
    flux = np.empty((2, LANES))
    nu = np.empty(LANES)
    slope = np.empty(LANES)
    m00 = np.empty(LANES)
    m01 = np.empty(LANES)
    m11 = np.empty(LANES)
    for k in range(cells.shape[0]):
        for a in range(8):
            i = cells[k, a]
            sign = past if beyond[k, a] else 1.0
            for lane in range(LANES):
                local[a, lane] = sign * potential[i, lane]
        force[:, :] = 0.0
        stiff[:, :] = 0.0
        for q in range(POINTS):
            g = gradient[geometry[k], q]
            w = weight[geometry[k], q]
            flux[:, :] = 0.0
            for a in range(8):
                add_product(flux[0], g[a, 0], local[a])
                add_product(flux[1], g[a, 1], local[a])
            for lane in range(LANES):
                square = flux[0, lane] ** 2 + flux[1, lane] ** 2
                value, rise = reluctivity(square, knots, cubic, piece)
                nu[lane] = w[lane] * value
                slope[lane] = w[lane] * rise
            if tangent:
                for lane in range(LANES):
                    b0, b1 = flux[0, lane], flux[1, lane]
                    m00[lane] = nu[lane] + slope[lane] * b0 * b0
                    m01[lane] = slope[lane] * b0 * b1
                    m11[lane] = nu[lane] + slope[lane] * b1 * b1
                e = 0
                for a in range(8):
                    products(left[a, 0], m00, g[a, 0], m01, g[a, 1])
                    products(left[a, 1], m01, g[a, 0], m11, g[a, 1])
                    for b in range(a + 1):
                        add_products(stiff[e], left[a, 0], g[b, 0], left[a, 1], g[b, 1])
                        e += 1
            product(flux[0], flux[0], nu)
            product(flux[1], flux[1], nu)
            for a in range(8):
                add_products(force[a], flux[0], g[a, 0], flux[1], g[a, 1])
        for a in range(8):
            i = cells[k, a]
            sign = own if beyond[k, a] else 1.0
            for lane in range(LANES):
                residual[i, lane] += sign * force[a, lane]
        if tangent:
            e = 0
            for a in range(8):
                for b in range(a + 1):
                    t = entries[k, e]
                    sign = own if beyond[k, a] != beyond[k, b] else 1.0
                    for lane in range(LANES):
                        values[t, lane] += sign * stiff[e, lane]
                    e += 1


@njit(cache=True, fastmath={"contract"}, error_model="numpy")
def _multiply(values, row, column, x, result):  # type: ignore[no-untyped-def]
    """result += K x for the lower triangle of a symmetric matrix."""
    for e in range(row.shape[0]):
        i, j = row[e], column[e]
        add_product(result[i], values[e], x[j])
        if i != j:
            add_product(result[j], values[e], x[i])


class Topology:
    """Index arrays of the equations of one lattice; `iron` overrides which cells are iron."""

    def __init__(self, lattice: Lattice, iron: NDArray[np.bool_] | None = None) -> None:
        self.lattice = lattice
        self.iron_mask = lattice.iron if iron is None else iron
        size = lattice.size
        cells = lattice.cells
        a, b = np.tril_indices(8)
        first, second = cells[..., a], cells[..., b]
        high, low = np.maximum(first, second), np.minimum(first, second)
        key = np.where(low >= 0, high * size + low, -1)
        number = np.arange(lattice.bore.size) + size - lattice.bore.size
        row, column = np.meshgrid(number, number, indexing="ij")
        bore_key = (row * size + column)[row >= column]
        stored = np.unique(np.concatenate([key.ravel(), bore_key]))
        stored = stored[stored >= 0]
        self.pattern: Pattern = analyse(size, stored // size, stored % size)
        self.row = (stored // size).astype(np.uint32)
        self.column = (stored % size).astype(np.uint32)
        self.bore_entry = np.searchsorted(stored, bore_key)
        self.bore_source = bore_entries(lattice)
        place = np.where(key >= 0, np.searchsorted(stored, key), stored.size)
        nodes = np.where(cells >= 0, cells, size)
        geometry = np.broadcast_to(
            np.arange(cells.shape[1] * cells.shape[2]).reshape(cells.shape[1:3]), cells.shape[:3]
        )

        def chosen(
            mask: NDArray[np.bool_],
        ) -> tuple[IndexArray, NDArray[np.bool_], IndexArray, IndexArray]:
            every = np.broadcast_to(mask, cells.shape[:3])
            return (
                np.ascontiguousarray(nodes[every], dtype=np.uint32),
                np.ascontiguousarray(lattice.beyond[every]),
                np.ascontiguousarray(place[every], dtype=np.uint32),
                np.ascontiguousarray(geometry[every], dtype=np.uint32),
            )

        self.iron_cells = chosen(self.iron_mask)
        self.air_cells = chosen(~self.iron_mask)

    @property
    def size(self) -> int:
        """Number of unknowns."""
        return self.lattice.size

    @cached_property
    def slot_nodes(self) -> IntArray:
        """Unknowns of the wound cells of each slot, (slots, wound cells, 8)."""
        return self.lattice.cells[:, self.lattice.wound]


def slot_load(mesh: Mesh, lattice: Lattice) -> FloatArray:
    """Share of a slot's current that each node of its wound cells takes, (cells, 8, LANES)."""
    weight = mesh.weight[lattice.wound]
    load = np.einsum("cql,qa->cal", weight, SHAPE)
    return np.asarray(load / weight.sum(axis=(0, 1)))


class System:
    """The equations of one sector for a batch of LANES designs.

    Parameters
    ----------
    topology : Topology
    mesh : Mesh
        Of LANES designs.
    curve : CurveTable
        Of the stator iron.
    """

    def __init__(self, topology: Topology, mesh: Mesh, curve: CurveTable) -> None:
        self.topology = topology
        self.curve = curve
        shape = (-1, POINTS, 8, 2, LANES)
        self.gradient = mesh.gradient.reshape(shape)
        self.weight = mesh.weight.reshape(-1, POINTS, LANES)
        self.air = np.zeros((topology.pattern.entries + 1, LANES))
        air = CurveTable.linear(1.0)
        self.own = float(topology.lattice.sector.sign)
        nothing = np.zeros((topology.size + 1, LANES))
        nodes, beyond, entries, geometry = topology.air_cells
        _iron(
            nothing,
            1.0,
            nodes,
            beyond,
            self.own,
            entries,
            geometry,
            self.gradient,
            self.weight,
            air.arrays,
            self.air,
            np.zeros_like(nothing),
            True,
        )
        self.linear = self.air

    def set_gap(self, stiffness: FloatArray) -> None:
        """Take over the stiffness of gap and rotor, see `GapCoupling.stiffness`."""
        self.linear = self.air.copy()
        self.linear[self.topology.bore_entry] += stiffness[self.topology.bore_source]

    def residual(self, potential: FloatArray, load: FloatArray) -> FloatArray:
        """Residual K(A) A - load, (size, LANES)."""
        return self._evaluate(potential, load, self.own, tangent=False)[0]

    def tangent(self, potential: FloatArray, load: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Residual (size, LANES) and entries of the tangent matrix (entries, LANES)."""
        return self._evaluate(potential, load, self.own, tangent=True)

    def tangent_at(self, potential: FloatArray, past: float) -> FloatArray:
        """Entries of the tangent matrix at a field whose factor past the sector is `past`."""
        return self._evaluate(potential, np.zeros_like(potential), past, tangent=True)[1]

    def _evaluate(
        self, potential: FloatArray, load: FloatArray, past: float, *, tangent: bool
    ) -> tuple[FloatArray, FloatArray]:
        size = self.topology.size
        padded = np.zeros((size + 1, LANES))
        padded[:-1] = potential
        residual = np.zeros((size + 1, LANES))
        residual[:-1] = -load
        topology = self.topology
        _multiply(self.linear, topology.row, topology.column, padded, residual)
        values = self.linear.copy() if tangent else self.linear
        nodes, beyond, entries, geometry = topology.iron_cells
        _iron(
            padded,
            past,
            nodes,
            beyond,
            self.own,
            entries,
            geometry,
            self.gradient,
            self.weight,
            self.curve.arrays,
            values,
            residual,
            tangent,
        )
        return residual[:-1], values[:-1]
