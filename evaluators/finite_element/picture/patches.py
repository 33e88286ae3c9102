"""Triangles with potential and flux density over one part of a machine, for drawing."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]


@dataclass(frozen=True)
class Patch:
    """Triangles over one part.

    Attributes
    ----------
    name : str
        ``stator``, ``clearance``, ``sleeve``, ``magnets``, ``core`` or ``shaft``.
    x, y : arrays (k,)
        Corners, m.
    triangles : array (t, 3)
        Corners of every triangle.
    potential : array (k,)
        Vector potential A_z, Wb/m.
    flux_density : array (k, 2)
        B_x and B_y, T. Corners at a border between materials are there once for each side.
    """

    name: str
    x: FloatArray
    y: FloatArray
    triangles: IntArray
    potential: FloatArray
    flux_density: FloatArray

    @property
    def magnitude(self) -> FloatArray:
        """|B| at the corners, T."""
        return np.asarray(np.hypot(self.flux_density[:, 0], self.flux_density[:, 1]))


def patch_of(
    name: str, z: ComplexArray, triangles: IntArray, potential: FloatArray, density: ComplexArray
) -> Patch:
    """Patch of complex corners x + j y and flux densities B_x + j B_y."""
    flux_density = np.column_stack([density.real, density.imag])
    return Patch(name, z.real.copy(), z.imag.copy(), triangles, potential, flux_density)


def grid_triangles(rows: int, columns: int, *, closed: bool = False) -> IntArray:
    """Triangles of a grid of points numbered row by row; a closed one joins its ends."""
    i = np.arange(rows - 1)[:, None]
    j = np.arange(columns if closed else columns - 1)
    a, b = i * columns + j, i * columns + (j + 1) % columns
    c, d = a + columns, b + columns
    return np.stack([a, b, d, a, d, c], axis=-1).reshape(-1, 3)
