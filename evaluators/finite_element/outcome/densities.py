"""Flux densities of the parts of the machine at the duty."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.mesh.lattice import Lattice
from evaluators.finite_element.rotor.uniform import MU_0
from evaluators.finite_element.solution.batch import BatchField, Solution

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

MAGNETIC_FROM = 0.1  # T at 1 kA/m: any ferritic steel is far above, any austenitic one far below


@dataclass(frozen=True)
class Densities:
    """Flux densities, (LANES,) each, T; see `evaluators.machine.field.FieldSolution`."""

    gap: FloatArray
    tooth: FloatArray
    yoke: FloatArray
    core: FloatArray
    magnet: FloatArray


def densities(
    batch: BatchField,
    loaded: Solution,
    unloaded: Solution,
    small: ComplexArray,
    suspension: FloatArray,
) -> Densities:
    """Read the densities off the fields; the suspension field adds its amplitude."""
    model, sections = batch.model, batch.sections
    tooth, yoke = _fluxes(model.torque.lattice, loaded.nodes)
    tooth_small, yoke_small = _fluxes(model.suspension.lattice, small)
    place = int(np.searchsorted(unloaded.waves.orders, model.pole_pairs))
    turned = np.exp(1j * model.pole_pairs * unloaded.waves.angles)[:, None]
    fundamental = (unloaded.waves.potential[:, place] * turned).mean(axis=0)
    core, magnet = _rotor(batch, loaded)
    return Densities(
        gap=2.0 * model.pole_pairs * np.abs(fundamental) / sections.bore_radius,
        tooth=(tooth + suspension * tooth_small) / sections.tooth_width,
        yoke=(yoke + suspension * yoke_small) / sections.yoke_thickness,
        core=core,
        magnet=magnet,
    )


def _fluxes(lattice: Lattice, nodes: FloatArray | ComplexArray) -> tuple[FloatArray, FloatArray]:
    """Largest flux of a tooth body and of the yoke behind a slot, (LANES,) each, Wb/m."""
    res = lattice.resolution
    first, last = 2 * (res.tip + res.wedge), 2 * (res.rows - res.yoke)
    wide = 2 * res.columns
    body = lattice.node[first : last + 1 : 2]
    left = 2 * res.tooth + wide * np.arange(lattice.slots)
    right = wide - 2 * res.tooth + wide * (np.arange(lattice.slots) - 1)
    sign = np.where(right < 0, float(lattice.sector.sign), 1.0)[:, None]
    tooth = nodes[:, body[:, left]] - sign * nodes[:, body[:, right % lattice.columns]]
    behind = (left[:, None] + np.arange(wide - 4 * res.tooth + 1)).ravel()
    yoke = nodes[:, lattice.node[last, behind][lattice.node[last, behind] >= 0]]
    return np.abs(tooth).max(axis=(0, 1, 2)), np.abs(yoke).max(axis=(0, 1))


def _rotor(batch: BatchField, loaded: Solution) -> tuple[FloatArray, FloatArray]:
    """Mean density of the core and lowest one at the magnets' surface, (LANES,) each.

    Of the field that stands still in the rotor: magnet harmonics and torque fundamental. In the
    magnets it is the density along the magnetisation over the outer surface, up to 98 % of the
    arc, because the series of harmonics rings at the very edge.
    """
    model, sections = batch.model, batch.sections
    orders = model.magnet_orders[model.magnet_orders <= 6 * model.slots]
    inside = batch.rotor_field(orders, loaded.waves)
    shape = np.exp(1j * np.outer(np.linspace(0.0, np.pi, 65), orders / model.pole_pairs))
    at_core = 2.0 * np.real(np.einsum("am,ml->al", shape, inside.core))
    half = model.discretisation.iron_rings
    at_shaft = 2.0 * np.real(np.einsum("am,ml->al", shape, inside.iron[half - 1]))
    if float(model.shaft_curve.flux_density(1e3)) > MAGNETIC_FROM:
        core = np.abs(at_core).max(axis=0) / sections.core_radius
    else:
        core = np.abs(at_core - at_shaft).max(axis=0) / sections.core_thickness
    angle = (
        np.linspace(-0.98, 0.98, 25)[:, None]
        * (0.5 * np.pi / model.pole_pairs)
        * sections.magnet_arc_ratio
    )
    wave = np.exp(1j * angle[:, None, :] * orders[:, None])

    def over_magnet(coefficients: ComplexArray) -> FloatArray:
        return np.asarray(2.0 * np.real(np.einsum("aml,ml->al", wave, coefficients)))

    along = over_magnet(inside.surface_radial)
    if model.task.construction.magnetisation == "parallel":
        # Inside the magnets B_phi is mu H_phi plus the tangential remanence.
        field = over_magnet(inside.surface_field) / sections.magnet_radius
        tangential = -MU_0 * model.recoil * field - model.remanence * np.sin(angle)
        along = along * np.cos(angle) - tangential * np.sin(angle)
    return core, np.asarray(along.min(axis=0))
