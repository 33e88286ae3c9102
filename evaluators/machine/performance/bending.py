"""Bending speeds of the rotor."""

from __future__ import annotations

import numpy as np

from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.mechanics.bending import (
    TIMOSHENKO_SHEAR,
    amplification_factor,
    beam_matrices,
    natural_speeds,
    separation_margin,
    supported_modes,
)
from evaluators.machine.performance.operating import Operating, held
from evaluators.machine.quantity import FloatArray
from evaluators.machine.task.task import Task

END_ELEMENTS, ACTIVE_ELEMENTS = 2, 3
FIRST_BENDING = 2  # column after the two rigid modes of a beam
MOSTLY = 0.5  # of a mode's elastic energy
RPM = 30.0 / np.pi


def metrics(task: Task, sections: CrossSections, state: Operating) -> dict[str, FloatArray]:
    """Metrics of bending speeds and of their margin to the speed range of the duty.

    Every bending speed counts for the margin: a rotor that runs above its first one must stay
    clear of the second as well. A mode counts as bending if the rotor itself holds most of its
    elastic energy. With soft supports these are all but the two rigid modes; on a stiff second
    bearing the rotor bends in a lower mode already.
    """
    free, masses = _beam(task, sections, state)
    speeds, share = supported_modes(free, _supported(task, state, free), masses)
    bends = share > MOSTLY
    bends[:, FIRST_BENDING:] = True  # a rigid rotor has two modes, no more
    duty = task.duty
    margin = separation_margin(
        speeds,
        duty.speed * duty.lowest_speed_ratio,
        duty.speed * duty.highest_speed_ratio,
        amplification_factor(task.rotor.damping_ratio),
    )
    return {
        "free_bending_speed_rpm": RPM * natural_speeds(free, masses)[:, FIRST_BENDING],
        "bending_speed_rpm": RPM * np.min(speeds, axis=1, initial=np.inf, where=bends),
        "separation_margin": np.min(margin, axis=1, initial=np.inf, where=bends),
    }


def suspension_stiffness(task: Task, state: Operating) -> FloatArray:
    """Net stiffness of the position control, (n,) N/m; see `RotorLayout`."""
    if task.rotor.suspension_stiffness is None:
        return np.asarray(state.field.displacement_stiffness * state.length)
    return np.full_like(state.length, task.rotor.suspension_stiffness)


def _beam(task: Task, sections: CrossSections, state: Operating) -> tuple[FloatArray, FloatArray]:
    """Matrices of the free rotor with its mounted parts."""
    layout, parts = task.rotor, task.materials
    ends = layout.ends(sections.shaft_radius, sections.rotor_radius)
    hot = held(state.temperature("core"))
    young, poisson = parts.shaft.young_modulus.at(hot), parts.shaft.poisson_ratio.at(hot)
    shear_modulus = young / (2.0 * (1.0 + poisson))
    steel = float(parts.shaft.density.value)

    def disc(radius: FloatArray) -> FloatArray:
        return np.asarray(0.25 * np.pi * radius**4)

    end_area = np.pi * ends.radius**2
    core = disc(sections.core_radius) - disc(sections.shaft_radius)
    magnets = disc(sections.magnet_radius) - disc(sections.core_radius)
    sleeve = disc(sections.rotor_radius) - disc(sections.magnet_radius)
    extra = layout.core_stiffening * (core + magnets)
    axial_modulus = parts.sleeve.young_modulus_radial.at(held(state.temperature("sleeve")))
    active_bending = young * (disc(sections.shaft_radius) + extra) + axial_modulus * sleeve
    densities = (
        (sections.shaft_area, disc(sections.shaft_radius), steel),
        (sections.core_area, core, _core_density(task)),
        (
            sections.magnet_area,
            sections.magnet_arc_ratio * magnets,
            float(parts.magnet.density.value),
        ),
        (sections.sleeve_area, sleeve, float(parts.sleeve.density.value)),
    )
    active_mass = np.sum([area * rho for area, _, rho in densities], axis=0)
    active_inertia = np.sum([moment * rho for _, moment, rho in densities], axis=0)
    active_length = state.length + task.construction.rotor_overhang

    def along(end: FloatArray, active: FloatArray) -> FloatArray:
        columns = [end] * END_ELEMENTS + [active] * ACTIVE_ELEMENTS + [end] * END_ELEMENTS
        return np.stack(np.broadcast_arrays(*columns), axis=1)

    lengths = along(ends.drive_length / END_ELEMENTS, active_length / ACTIVE_ELEMENTS)
    lengths[:, -END_ELEMENTS:] = (ends.free_length / END_ELEMENTS)[:, None]
    stiffness, masses = beam_matrices(
        lengths,
        along(young * disc(ends.radius), active_bending),
        along(TIMOSHENKO_SHEAR * shear_modulus * end_area, _active_shear(sections, shear_modulus)),
        along(end_area * steel, active_mass),
        along(disc(ends.radius) * steel, active_inertia),
    )
    # The overhung part sits before the first station, hence the negative coupling.
    m, c = layout.overhung_mass, layout.overhung_offset
    masses[:, 0, 0] += m
    masses[:, 0, 1] -= m * c
    masses[:, 1, 0] -= m * c
    masses[:, 1, 1] += layout.overhung_transverse_inertia + m * c * c
    masses[:, -2, -2] += layout.free_end_mass
    return stiffness, masses


def _supported(task: Task, state: Operating, free: FloatArray) -> FloatArray:
    """Stiffness with the suspension, half at each end of the stack, and the second bearing."""
    supported = free.copy()
    half = 0.5 * suspension_stiffness(task, state)
    for station in (END_ELEMENTS, END_ELEMENTS + ACTIVE_ELEMENTS):
        supported[:, 2 * station, 2 * station] += half
    middle = 2 * (END_ELEMENTS + ACTIVE_ELEMENTS) + END_ELEMENTS
    supported[:, middle, middle] += task.rotor.bearing_stiffness
    return supported


def _core_density(task: Task) -> float:
    steel = task.materials.rotor_steel
    return float(steel.density.value) * float(steel.stacking_factor.value)


def _active_shear(sections: CrossSections, shear_modulus: FloatArray) -> FloatArray:
    """Shear stiffness of the active part: the shaft alone, as the bending stiffness."""
    return np.asarray(TIMOSHENKO_SHEAR * shear_modulus * sections.shaft_area)
