"""Geometry of the mesh of one slot pitch: element gradients, loads and areas of n designs.

The map from the lattice of `lattice.py` to the cross-section is smooth in every design variable, so
that the results are smooth too. All slots of a sector share the mesh of slot 0, turned.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.mesh.lattice import COLUMN_OFFSET, ROW_OFFSET, Resolution
from evaluators.machine.geometry.cross_sections import CrossSections

FloatArray = NDArray[np.float64]

POINTS = 4
"""Quadrature points of a cell, 2 x 2 Gauss. Reduced integration of the 8-node element: the
gradient is most accurate at these points (Barlow, Int. J. Numer. Methods Eng. 10(2), 1976), and
the element keeps its rank of 7."""


class MeshError(ValueError):
    """A cell of a design is folded over."""


def shape_functions(xi: float, eta: float) -> tuple[FloatArray, FloatArray]:
    """Shape functions (8,) and their derivatives (8, 2) in the square -1..1."""
    corner_xi, corner_eta = COLUMN_OFFSET - 1.0, ROW_OFFSET - 1.0
    value = np.empty(8)
    slope = np.empty((8, 2))
    for k, (a, b) in enumerate(zip(corner_xi, corner_eta, strict=True)):
        if a != 0.0 and b != 0.0:
            value[k] = 0.25 * (1 + a * xi) * (1 + b * eta) * (a * xi + b * eta - 1)
            slope[k] = (
                0.25 * a * (1 + b * eta) * (2 * a * xi + b * eta),
                0.25 * b * (1 + a * xi) * (2 * b * eta + a * xi),
            )
        elif a == 0.0:
            value[k] = 0.5 * (1 - xi * xi) * (1 + b * eta)
            slope[k] = (-xi * (1 + b * eta), 0.5 * b * (1 - xi * xi))
        else:
            value[k] = 0.5 * (1 + a * xi) * (1 - eta * eta)
            slope[k] = (0.5 * a * (1 - eta * eta), -eta * (1 + a * xi))
    return value, slope


_GAUSS = 1.0 / np.sqrt(3.0)
_SHAPES = [shape_functions(x, y) for y in (-_GAUSS, _GAUSS) for x in (-_GAUSS, _GAUSS)]
SHAPE = np.array([value for value, _ in _SHAPES])  # (POINTS, 8)
SLOPE = np.array([slope for _, slope in _SHAPES])  # (POINTS, 8, 2)


@dataclass(frozen=True)
class Mesh:
    """Slot pitch of n designs; designs are the last axis.

    Attributes
    ----------
    gradient : array (R, C, POINTS, 8, 2, n)
        Gradients of the shape functions in x and y of slot 0, 1/m.
    weight : array (R, C, POINTS, n)
        Area that a quadrature point stands for, m2.
    angle : array (2 R + 1, 2 C + 1, n), radius : array (2 R + 1, n)
        Of the lattice points, rad and m.
    """

    gradient: FloatArray
    weight: FloatArray
    angle: FloatArray
    radius: FloatArray


def build(sections: CrossSections, resolution: Resolution) -> Mesh:
    """Map the lattice of one slot pitch to n cross-sections.

    Raises
    ------
    MeshError
        If a cell is folded over, naming the design.
    """
    radius, angle = lattice_points(sections, resolution)
    x = radius[:, :, None] * np.cos(angle)
    y = radius[:, :, None] * np.sin(angle)
    rows = 2 * np.arange(resolution.rows)[:, None, None] + ROW_OFFSET
    columns = 2 * np.arange(resolution.columns)[:, None] + COLUMN_OFFSET
    cell_x = x[:, rows, columns]  # (n, R, C, 8)
    cell_y = y[:, rows, columns]
    # Angle first, radius second: the reference square is mirrored, hence the sign of the area.
    flat = SLOPE.transpose(1, 0, 2).reshape(8, -1)  # (8, POINTS * 2)
    shape = (*cell_x.shape[:3], POINTS, 2)
    dx = (cell_x @ flat).reshape(shape)
    dy = (cell_y @ flat).reshape(shape)
    determinant = dx[..., 1] * dy[..., 0] - dx[..., 0] * dy[..., 1]
    folded = np.flatnonzero(np.any(~(determinant > 0.0), axis=(1, 2, 3)))
    if folded.size:
        msg = f"design {folded[0]}: a cell of the mesh is folded over"
        raise MeshError(msg)
    inverse = -1.0 / determinant
    gradient = np.empty((*cell_x.shape[:3], POINTS, 8, 2))
    # Inverse of the 2 x 2 matrix [[dx/dxi, dx/deta], [dy/dxi, dy/deta]].
    along, across = SLOPE[:, :, 0], SLOPE[:, :, 1]
    gradient[..., 0] = (along * dy[..., None, 1] - across * dy[..., None, 0]) * inverse[..., None]
    gradient[..., 1] = (across * dx[..., None, 0] - along * dx[..., None, 1]) * inverse[..., None]
    return Mesh(
        gradient=np.ascontiguousarray(np.moveaxis(gradient, 0, -1)),
        weight=np.ascontiguousarray(np.moveaxis(determinant, 0, -1)),
        angle=np.ascontiguousarray(np.moveaxis(angle, 0, -1)),
        radius=np.ascontiguousarray(radius.T),
    )


def lattice_points(
    sections: CrossSections, resolution: Resolution
) -> tuple[FloatArray, FloatArray]:
    """Radii (n, 2 R + 1) and angles (n, 2 R + 1, 2 C + 1) of the lattice of slot 0."""
    levels = np.interp(
        np.arange(2 * resolution.rows + 1) / 2.0,
        np.arange(resolution.rows + 1),
        resolution.row_levels,
    )
    corners = np.stack(
        [
            sections.bore_radius,
            sections.tip_radius,
            sections.wedge_radius,
            sections.slot_radius,
            sections.outer_radius,
        ],
        axis=1,
    )
    part = np.minimum(levels.astype(np.int64), 3)
    share = levels - part
    radius = corners[:, part] * (1.0 - share) + corners[:, part + 1] * share
    inside = np.minimum(radius, sections.slot_radius[:, None])
    edge = np.arcsin(sections.tooth_half_width(inside) / inside)
    pitch = 2.0 * np.pi / sections.family.slots

    def halves(breaks: FloatArray) -> FloatArray:
        cells = breaks.size - 1
        return np.interp(np.arange(2 * cells + 1) / 2.0, np.arange(cells + 1), breaks)

    slot = halves(resolution.across_slot)
    # Dense at the edge on the bore, where the field is singular; behind the tip the flux spreads
    # over the whole tooth, whose tips may be long.
    below = np.minimum(levels, 1.0)[:, None]
    tooth = (1.0 - below) * halves(resolution.across_tooth) + below * halves(resolution.across_body)
    left = np.concatenate(
        [
            edge[:, :, None] * tooth[:, :-1],
            edge[:, :, None] + (0.5 * pitch - edge[:, :, None]) * slot,
        ],
        axis=2,
    )
    right = pitch - left[:, :, -2::-1]
    return radius, np.concatenate([left, right], axis=2)
