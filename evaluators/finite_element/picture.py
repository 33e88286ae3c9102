"""Field picture of one design: flux lines over |B|."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.batch import BatchField
from evaluators.finite_element.lanes import LANES
from evaluators.finite_element.mesh import shape_functions
from evaluators.finite_element.model import FieldModel
from evaluators.machine.field import excitation
from evaluators.machine.geometry import CrossSections, cross_sections

FloatArray = NDArray[np.float64]

LINES = 24
"""Flux lines between smallest and largest potential."""

STEEL, EDGE = "0.2", 0.5


def field_picture(
    model: FieldModel, design: Mapping[str, float], path: Path, angle: float = 0.0
) -> None:
    """Draw the field of one design at the duty's torque current into an SVG or PNG file.

    Parameters
    ----------
    design : mapping
        One value of every design variable.
    path : Path
        Its suffix chooses the format.
    angle : float
        Rotor angle, rad.

    Raises
    ------
    ValueError
        If the design has no cross-section.
    """
    # Only whoever draws needs the plotting library.
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure
    from matplotlib.tri import Triangulation

    task = model.task
    batch = {name: np.array([float(value)]) for name, value in design.items()}
    sections, valid, reasons = cross_sections(task.winding.family, batch, task.construction)
    if not valid.size:
        raise ValueError(str(reasons[0]))
    density = batch["current_density_A_mm2"] * 1e6
    exciting = excitation(sections, density, task.duty, task.construction)
    lanes = np.zeros(LANES, dtype=np.int64)
    field = BatchField(model, sections.rows(lanes))
    current = exciting.torque[lanes]
    start = field.settle_rotor_iron(angle, current)
    solution = field.solve_torque(np.array([angle]), current, start)
    x, y, potential, triangles, magnitude = _stator(field, solution.nodes[0, :, 0])
    inner = _inside(field, solution.waves.potential[0, :, 0], solution.waves.orders, angle)
    # The constant part of the potential makes no field and is not among the orders.
    inner[2][:] += _mean_on_bore(field, solution.nodes[0, :, 0])
    offset = x.size
    x, y = np.concatenate([x, inner[0]]), np.concatenate([y, inner[1]])
    potential = np.concatenate([potential, inner[2]])
    triangles = np.concatenate([triangles, inner[3] + offset])
    magnitude = np.concatenate([magnitude, inner[4]])

    figure = Figure(figsize=(8.0, 7.0))
    FigureCanvasAgg(figure)
    axes = figure.add_subplot(aspect="equal")
    grid = Triangulation(1e3 * x, 1e3 * y, triangles)
    shades = axes.tripcolor(grid, facecolors=magnitude, cmap="viridis", vmin=0.0, vmax=2.0)
    shades.set_rasterized(True)
    levels = np.linspace(potential.min(), potential.max(), LINES + 2)[1:-1]
    axes.tricontour(
        grid, potential, levels=levels, colors="white", linewidths=0.6, linestyles="solid"
    )
    for outline in _outlines(sections, field, angle):
        axes.plot(1e3 * outline[0], 1e3 * outline[1], color=STEEL, linewidth=EDGE)
    figure.colorbar(shades, ax=axes, label="|B| in T")
    axes.set_xlabel("x in mm")
    axes.set_ylabel("y in mm")
    axes.set_title(f"{task.winding.family.id}, rotor at {np.degrees(angle):.1f} degrees")
    figure.savefig(path, dpi=150, bbox_inches="tight")


def _stator(
    field: BatchField, nodes: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray, NDArray[np.int64], FloatArray]:
    """Points, potential, triangles and |B| of the whole stator, every cell cut in four."""
    model = field.model
    lattice = model.torque.lattice
    res = lattice.resolution
    padded = np.append(nodes, 0.0)
    local = lattice.cell_signs * padded[lattice.cells]
    flux = np.einsum("rcqad,srca->srcqd", field.mesh.gradient[..., 0], local)
    density = np.hypot(flux[..., 0], flux[..., 1]).mean(axis=3)
    offset = np.arange(3)
    shapes = np.array([shape_functions(x, y)[0] for y in offset - 1.0 for x in offset - 1.0])
    value = local @ shapes.T  # (slots, R, C, 9)
    i = 2 * np.arange(res.rows)[:, None, None, None] + offset[:, None]
    j = 2 * np.arange(res.columns)[:, None, None] + offset
    shape = (res.rows, res.columns, 9)
    theta = field.mesh.angle[i, j, 0].reshape(shape)
    distance = np.broadcast_to(field.mesh.radius[i, 0], (*shape[:2], 3, 3)).reshape(shape)
    slot = np.arange(model.slots)
    turns, here = np.divmod(slot, lattice.slots)
    factor = float(lattice.sector.sign) ** turns
    potential = factor[:, None, None, None] * value[here]
    angle = theta + (slot * model.pitch)[:, None, None, None]
    quarters = np.array([[k, k + 1, k + 4, k + 3] for k in (0, 1, 3, 4)])
    pieces = np.concatenate([quarters[:, [0, 1, 2]], quarters[:, [0, 2, 3]]])
    first = 9 * np.arange(density.size * model.slots // lattice.slots)
    triangles = (first[:, None, None] + pieces).reshape(-1, 3)
    return (
        (distance * np.cos(angle)).ravel(),
        (distance * np.sin(angle)).ravel(),
        potential.ravel(),
        triangles,
        np.repeat(density[here].ravel(), len(pieces)),
    )


def _mean_on_bore(field: BatchField, nodes: FloatArray) -> float:
    """Mean potential on the bore, Wb/m."""
    lattice = field.model.torque.lattice
    if lattice.sector.sign < 0:
        return 0.0
    angle, pitch = field.mesh.angle[0, :-1, 0], field.model.pitch
    even = np.linspace(0.0, pitch, 512, endpoint=False)
    values = [np.interp(even, angle, nodes[row], period=pitch) for row in lattice.bore]
    return float(np.mean(values))


def _inside(
    field: BatchField, potential: NDArray[np.complex128], orders: NDArray[np.int64], angle: float
) -> tuple[FloatArray, FloatArray, FloatArray, NDArray[np.int64], FloatArray]:
    """Points, potential, triangles and |B| inside the bore, by the series of orders."""
    model, rotor = field.model, field.rotor
    kept = orders <= 4 * model.slots
    order = orders[kept]
    magnet = np.isin(order, model.magnet_orders)
    place = np.searchsorted(model.magnet_orders, order[magnet])
    amplitudes = [np.zeros((order.size, LANES)), np.zeros((order.size, LANES))]
    for amplitude, remanence in zip(amplitudes, field.remanence, strict=True):
        amplitude[magnet] = remanence[place]
    own = (potential[kept] * np.exp(1j * order * angle))[:, None] * np.ones(LANES)
    radii, values = rotor.profile(order, field.reluctivity, amplitudes[0], amplitudes[1], own)
    phi = np.linspace(0.0, 2.0 * np.pi, 721)
    wave = np.exp(1j * np.outer(order, phi - angle))
    grid = 2.0 * np.real(np.einsum("rm,ma->ra", values[:, :, 0], wave))
    r = radii[:, 0]
    rows, columns = r.size, phi.size
    number = np.arange(rows * columns).reshape(rows, columns)
    corner = [number[:-1, :-1], number[:-1, 1:], number[1:, 1:], number[1:, :-1]]
    triangles = np.concatenate(
        [
            np.stack([corner[0], corner[1], corner[2]], -1).reshape(-1, 3),
            np.stack([corner[0], corner[2], corner[3]], -1).reshape(-1, 3),
        ]
    )
    middle = 0.5 * (r[1:] + r[:-1])[:, None]
    along = np.diff(0.5 * (grid[1:] + grid[:-1]), axis=1) / (middle * np.diff(phi))
    across = np.diff(0.5 * (grid[:, 1:] + grid[:, :-1]), axis=0) / np.diff(r)[:, None]
    magnitude = np.hypot(along, across).ravel()
    x, y = r[:, None] * np.cos(phi), r[:, None] * np.sin(phi)
    return x.ravel(), y.ravel(), grid.ravel(), triangles, np.concatenate([magnitude, magnitude])


def _outlines(
    sections: CrossSections, field: BatchField, angle: float
) -> list[tuple[FloatArray, FloatArray]]:
    """Edges of the parts, m."""
    model = field.model
    phi = np.linspace(0.0, 2.0 * np.pi, 361)
    outlines = [
        (float(r[0]) * np.cos(phi), float(r[0]) * np.sin(phi))
        for r in (
            sections.shaft_radius,
            sections.core_radius,
            sections.magnet_radius,
            sections.rotor_radius,
            sections.outer_radius,
        )
    ]
    res = model.resolution
    radius, theta = field.mesh.radius[:, 0], field.mesh.angle[..., 0]
    last = 2 * (res.rows - res.yoke)
    left, right = 2 * res.tooth, 2 * (res.columns - res.tooth)
    for slot in range(model.slots):
        turn = slot * model.pitch
        before = theta[0, right:] - model.pitch
        r = np.concatenate(
            [
                np.full(before.size, radius[0]),
                np.full(left, radius[0]),
                radius[: last + 1],
                np.full(right - left - 1, radius[last]),
                radius[last::-1],
            ]
        )
        a = np.concatenate(
            [
                before,
                theta[0, 1 : left + 1],
                theta[: last + 1, left],
                theta[last, left + 1 : right],
                theta[last::-1, right],
            ]
        )
        outlines.append((r * np.cos(a + turn), r * np.sin(a + turn)))
    pitch = np.pi / model.pole_pairs
    half = 0.5 * pitch * float(sections.magnet_arc_ratio[0])
    ends = np.array([float(sections.core_radius[0]), float(sections.magnet_radius[0])])
    for k in range(2 * model.pole_pairs):
        for side in (-half, half):
            edge = angle + k * pitch + side
            outlines.append((ends * np.cos(edge), ends * np.sin(edge)))
    return outlines
