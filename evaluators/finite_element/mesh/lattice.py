"""Connectivity of the stator mesh: one slot pitch of quadrilaterals, repeated over a sector.

A slot pitch runs from the axis of tooth s over slot s to the axis of tooth s + 1. Its columns
follow the tooth edge, its rows are circles: over the tip, the wedge, the wound part of the slot
and the yoke, so that every cell lies in one part. Elements are 8-node serendipity quadrilaterals;
nodes sit on a lattice of 2 R + 1 rows and 2 C columns a slot, centres left out. The row on the
bore comes last in the elimination order, because the gap couples all its nodes with each other;
the outermost row is held at A = 0 (no flux leaves the stator).

Nothing here depends on a design: it is made once per family and resolution.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.mesh.symmetry import Sector

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

# Local node k sits at lattice offset (row, column) from the cell's inner left corner.
ROW_OFFSET = np.array([0, 0, 0, 1, 2, 2, 2, 1])
COLUMN_OFFSET = np.array([0, 1, 2, 2, 2, 1, 0, 0])


def graded(cells: int, ratio: float) -> FloatArray:
    """Break points 0..1 of `cells` cells, each `ratio` times as long as the one before."""
    breaks = np.concatenate([[0.0], np.cumsum(ratio ** np.arange(cells))])
    return np.asarray(breaks / breaks[-1])


@dataclass(frozen=True)
class Resolution:
    """Cells of one slot pitch.

    Attributes
    ----------
    tooth, slot : int
        Cells across half a tooth and across half a slot.
    tip, wedge, body, yoke : int
        Cells over the radial heights of these parts.
    """

    tooth: int = 4
    slot: int = 3
    tip: int = 2
    wedge: int = 2
    body: int = 3
    yoke: int = 3

    def __post_init__(self) -> None:
        for name, value in ((item.name, getattr(self, item.name)) for item in fields(self)):
            if not 1 <= value <= 64:
                msg = f"resolution: {name} = {value} cells must lie between 1 and 64"
                raise ValueError(msg)

    @classmethod
    def suited(cls, slots: int) -> Resolution:
        """Default for a machine with that many slots: the fewer, the more cells a slot pitch.

        Cells across the tooth count most, and cost most: the gap couples all bore nodes with each
        other. With many slots a third cell across half a tooth would halve the error of the
        teeth's iron loss at 1.6 times the cost; setting `cells` has it.
        """
        if slots <= 8:
            return cls()
        if slots <= 15:
            return cls(tooth=4, slot=2, tip=2, wedge=1, body=2, yoke=2)
        return cls(tooth=2, slot=2, tip=2, wedge=1, body=2, yoke=2)

    def refined(self, factor: int) -> Resolution:
        """The same with `factor` times the cells in every direction."""
        return Resolution(**{item.name: factor * getattr(self, item.name) for item in fields(self)})

    @property
    def rows(self) -> int:
        """Cells from bore to outside."""
        return self.tip + self.wedge + self.body + self.yoke

    @property
    def columns(self) -> int:
        """Cells over one slot pitch."""
        return 2 * (self.tooth + self.slot)

    @cached_property
    def across_tooth(self) -> FloatArray:
        """Break points of half a tooth on the bore from axis (0) to edge (1), denser there."""
        return graded(self.tooth, 0.55 ** (3.0 / self.tooth))

    @cached_property
    def across_body(self) -> FloatArray:
        """Break points of half a tooth behind its tip."""
        return graded(self.tooth, 0.8 ** (3.0 / self.tooth))

    @cached_property
    def across_slot(self) -> FloatArray:
        """Break points of half a slot from wall (0) to axis (1), denser towards the wall."""
        return graded(self.slot, 1.7 ** (3.0 / self.slot))

    @cached_property
    def row_levels(self) -> FloatArray:
        """Break points of the rows: 0..1 tip, 1..2 wedge, 2..3 body, 3..4 yoke."""
        return np.concatenate(
            [
                graded(self.tip, 2.0 ** (2.0 / self.tip)),
                1.0 + graded(self.wedge, 1.0)[1:],
                2.0 + graded(self.body, 1.3 ** (4.0 / self.body))[1:],
                3.0 + graded(self.yoke, 1.5 ** (3.0 / self.yoke))[1:],
            ]
        )


@dataclass(frozen=True)
class Lattice:
    """Unknowns and cells of a sector.

    Unknowns are numbered in elimination order. `node` gives the number of a lattice point, -1 where
    there is none or where A = 0.
    """

    resolution: Resolution
    sector: Sector

    @property
    def slots(self) -> int:
        """Slots of the sector."""
        return self.sector.slots

    @cached_property
    def columns(self) -> int:
        """Lattice columns of the sector."""
        return 2 * self.resolution.columns * self.slots

    @cached_property
    def node(self) -> IntArray:
        """Unknown at each lattice point, (2 R + 1, columns)."""
        rows = 2 * self.resolution.rows
        order = _dissection(rows, self.columns)
        order += [(0, j) for j in range(self.columns)]
        number = np.full((rows + 1, self.columns), -1, dtype=np.int64)
        for k, (i, j) in enumerate(order):
            number[i, j] = k
        return number

    @cached_property
    def size(self) -> int:
        """Number of unknowns."""
        return int(self.node.max()) + 1

    @cached_property
    def bore(self) -> IntArray:
        """Unknowns on the bore, (slots, 2 C); the last of all unknowns, in order."""
        return np.asarray(self.node[0].reshape(self.slots, -1))

    @cached_property
    def cells(self) -> IntArray:
        """Unknowns of every cell, (slots, R, C, 8); -1 where A = 0."""
        r = np.arange(self.resolution.rows)[:, None, None]
        c = np.arange(self.slots * self.resolution.columns)[:, None]
        found = self.node[2 * r + ROW_OFFSET, (2 * c + COLUMN_OFFSET) % self.columns]
        return np.ascontiguousarray(
            found.reshape(self.resolution.rows, self.slots, -1, 8).transpose(1, 0, 2, 3)
        )

    @cached_property
    def beyond(self) -> NDArray[np.bool_]:
        """Whether a cell node lies past the sector, on its first column, (slots, R, C, 8)."""
        c = np.arange(self.slots * self.resolution.columns)[:, None]
        last = (2 * c + COLUMN_OFFSET == self.columns).reshape(self.slots, 1, -1, 8)
        return np.ascontiguousarray(
            np.broadcast_to(last, (self.slots, self.resolution.rows, *last.shape[2:]))
        )

    @cached_property
    def cell_signs(self) -> FloatArray:
        """Factor of the unknown at each cell node, (slots, R, C, 8)."""
        return np.where(self.beyond, float(self.sector.sign), 1.0)

    @cached_property
    def iron(self) -> NDArray[np.bool_]:
        """Whether a cell of the slot pitch is iron, (R, C)."""
        r, c = np.indices((self.resolution.rows, self.resolution.columns))
        res = self.resolution
        in_slot = (c >= res.tooth) & (c < res.columns - res.tooth)
        return np.asarray(~in_slot | (r >= res.rows - res.yoke))

    @cached_property
    def yoke(self) -> NDArray[np.bool_]:
        """Whether a cell of the slot pitch is yoke, (R, C)."""
        r = np.arange(self.resolution.rows)[:, None]
        return np.array(
            np.broadcast_to(r >= self.resolution.rows - self.resolution.yoke, self.iron.shape)
        )

    @cached_property
    def wound(self) -> NDArray[np.bool_]:
        """Whether a cell of the slot pitch carries current, (R, C)."""
        r = np.arange(self.resolution.rows)[:, None]
        return np.asarray(~self.iron & (r >= self.resolution.tip + self.resolution.wedge))


def _dissection(rows: int, columns: int) -> list[tuple[int, int]]:
    """Elimination order of lattice rows 1..rows-1 by nested dissection.

    A. George, "Nested dissection of a regular finite element mesh", SIAM J. Numer. Anal. 10(2),
    1973. Separators are lines of even number, which no element crosses. The sector closes upon
    itself through column 0, which is therefore taken out first.
    """
    order: list[tuple[int, int]] = []

    def points(i0: int, i1: int, j0: int, j1: int) -> list[tuple[int, int]]:
        return [(i, j) for j in range(j0, j1) for i in range(i0, i1) if i % 2 == 0 or j % 2 == 0]

    def cut(i0: int, i1: int, j0: int, j1: int) -> None:
        height, width = i1 - i0, j1 - j0
        if height <= 0 or width <= 0:
            return
        if height <= 3 and width <= 3:
            order.extend(points(i0, i1, j0, j1))
        elif width >= height:
            middle = _even_middle(j0, j1)
            cut(i0, i1, j0, middle)
            cut(i0, i1, middle + 1, j1)
            order.extend(points(i0, i1, middle, middle + 1))
        else:
            middle = _even_middle(i0, i1)
            cut(i0, middle, j0, j1)
            cut(middle + 1, i1, j0, j1)
            order.extend(points(middle, middle + 1, j0, j1))

    cut(1, rows, 1, columns)
    order.extend(points(1, rows, 0, 1))
    return order


def _even_middle(low: int, high: int) -> int:
    middle = (low + high - 1) // 2
    return middle if middle % 2 == 0 else middle + 1 if middle + 1 < high else middle - 1
