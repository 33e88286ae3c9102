"""The field of one design at one rotor angle, ready to be drawn.

The stator comes from the finite elements, gap and rotor from the Fourier coefficients on the bore,
so that flux lines run on through the gap. The whole circle is solved, with the rotor's iron as the
evaluator settles it and without induced currents.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element import analysis
from evaluators.finite_element.mesh.geometry import shape_functions
from evaluators.finite_element.model import FieldModel
from evaluators.finite_element.outcome import nonlinear_force
from evaluators.finite_element.picture.patches import Patch, grid_triangles, patch_of
from evaluators.finite_element.picture.rings import rings
from evaluators.finite_element.solution.batch import BatchField
from evaluators.finite_element.solution.lanes import LANES
from evaluators.machine.field import Excitation, excitation
from evaluators.machine.geometry.cross_sections import CrossSections, cross_sections

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]

DIVISIONS = 4  # of a cell's edge


@dataclass(frozen=True)
class Currents:
    """Which currents flow.

    Attributes
    ----------
    torque : bool
        The duty's torque current.
    force_direction : float or None
        Suspension current that commands a mean force in this direction, rad; None for none.
    """

    torque: bool = True
    force_direction: float | None = None


@dataclass(frozen=True)
class FieldPicture:
    """Field of one design at one rotor angle.

    Attributes
    ----------
    sections : CrossSections
        The design, a batch of one.
    angle : float
        Of the rotor, rad.
    patches : tuple of Patch
        From the stator inwards.
    element_flux_density : array (slots, R, C, POINTS, 2)
        B_x and B_y at the integration points of every cell of the stator mesh, T.
    element_area : array (R, C, POINTS)
        Area each of these points stands for, m2.
    """

    sections: CrossSections
    angle: float
    patches: tuple[Patch, ...]
    element_flux_density: FloatArray
    element_area: FloatArray

    def patch(self, name: str) -> Patch:
        """The patch called `name`."""
        return next(item for item in self.patches if item.name == name)


def field_picture(
    model: FieldModel,
    design: Mapping[str, float],
    angle: float = 0.0,
    currents: Currents | None = None,
) -> FieldPicture:
    """Solve one design at one rotor angle.

    Parameters
    ----------
    model : FieldModel
    design : mapping
        Variables in the units of their names.
    angle : float
        Rotor angle, rad.
    currents : Currents, optional
        By default the torque current alone.

    Raises
    ------
    ValueError
        If the design has no cross-section or its field does not converge.
    """
    task, currents = model.task, currents or Currents()
    columns = {name: np.array([float(value)]) for name, value in design.items()}
    sections, valid, reasons = cross_sections(task.winding.family, columns, task.construction)
    if not valid.size:
        raise ValueError(str(reasons[0]))
    density = columns["current_density_A_mm2"] * 1e6
    single = excitation(sections, density, task.duty, task.construction)
    lanes = np.zeros(LANES, dtype=np.int64)
    exciting = Excitation(single.torque[lanes], single.suspension[lanes])
    batch = BatchField(model, sections.rows(lanes))
    start = batch.settle_rotor_iron(float(model.angles[0]), exciting.torque)
    source, factor = model.unfold(model.whole)
    solution = nonlinear_force.solve(
        batch,
        batch.equations(model.whole),
        np.array([angle]),
        exciting.torque * currents.torque,
        _suspension(model, batch.sections, exciting, currents.force_direction),
        start[source] * factor[:, None],
    )
    if not solution.converged[0]:
        msg = "the field did not converge within the allowed Newton iterations"
        raise ValueError(msg)
    nodes = solution.nodes[0]
    stator, element = _stator(batch, nodes[:, 0])
    return FieldPicture(
        sections=sections,
        angle=angle,
        patches=(stator, *rings(batch, nodes, angle)),
        element_flux_density=element,
        element_area=batch.mesh.weight[..., 0],
    )


def _suspension(
    model: FieldModel, sections: CrossSections, exciting: Excitation, direction: float | None
) -> ComplexArray:
    """Phasor of the suspension ampere-turns, (LANES,)."""
    if direction is None:
        return np.zeros(LANES, dtype=np.complex128)
    family = model.task.winding.family
    forward = family.suspension_pole_pairs > family.pole_pairs
    force = analysis.evaluate(analysis.solve(model, sections, exciting), exciting).force
    return np.asarray(exciting.suspension * force.command(direction, forward))


def _stator(batch: BatchField, nodes: FloatArray) -> tuple[Patch, FloatArray]:
    """Cells divided into triangles, and B at their integration points, from `nodes` (size,)."""
    lattice = batch.model.whole.lattice
    cells = lattice.cells
    local = np.where(cells >= 0, nodes[np.maximum(cells, 0)], 0.0)  # (slots, R, C, 8)
    gradient = batch.mesh.gradient[..., 0]  # (R, C, POINTS, 8, 2), of slot 0
    slope = np.einsum("rcqax,srca->srcqx", gradient, local)
    turn = np.exp(1j * batch.model.pitch * np.arange(batch.model.slots))[:, None, None, None]
    # B_x + j B_y = dA/dy - j dA/dx, turned with the slot.
    density = (slope[..., 1] - 1j * slope[..., 0]) * turn
    place = (batch.mesh.radius[:, None, 0] * np.exp(1j * batch.mesh.angle[..., 0]))[None]
    rows, columns = cells.shape[1:3]
    first_row = 2 * np.arange(rows)[:, None, None]
    first_column = 2 * np.arange(columns)[:, None]
    row_offset, column_offset = _OFFSETS
    corner = place[0][first_row + row_offset, first_column + column_offset]  # (R, C, 8)
    shape = np.array([shape_functions(xi, eta)[0] for xi, eta in _GRID])  # (g, 8)
    z = np.einsum("ga,rca->rcg", shape, corner)[None] * turn
    potential = np.einsum("ga,srca->srcg", shape, local)
    at_grid = np.einsum("gq,srcq->srcg", _EXTRAPOLATION, density)
    count = cells.shape[0] * rows * columns
    triangles = (_TRIANGLES + len(_GRID) * np.arange(count)[:, None, None]).reshape(-1, 3)
    patch = patch_of("stator", z.ravel(), triangles, potential.ravel(), at_grid.ravel())
    return patch, np.stack([density.real, density.imag], axis=-1)


_OFFSETS = (np.array([0, 0, 0, 1, 2, 2, 2, 1]), np.array([0, 1, 2, 2, 2, 1, 0, 0]))
_STEPS = np.linspace(-1.0, 1.0, DIVISIONS + 1)
_GRID = [(float(xi), float(eta)) for eta in _STEPS for xi in _STEPS]
_TRIANGLES = grid_triangles(DIVISIONS + 1, DIVISIONS + 1)
# Bilinear through the 2 x 2 integration points, which lie at 1/sqrt(3).
_EXTRAPOLATION = np.array(
    [
        [
            0.25 * (1.0 + np.sqrt(3.0) * a * xi) * (1.0 + np.sqrt(3.0) * b * eta)
            for b in (-1, 1)
            for a in (-1, 1)
        ]
        for xi, eta in _GRID
    ]
)
