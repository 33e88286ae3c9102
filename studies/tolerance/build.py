"""Machines as built: scattered dimensions as design variables, scattered lots as tasks."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.quantity import Quantity
from evaluators.machine.task.task import Task
from studies.tolerance.scatter import PROPERTIES, Draw

FloatArray = NDArray[np.float64]

MILLI, MICRO = 1e-3, 1e-6


def nominal_dimensions(sections: CrossSections) -> dict[str, float]:
    """Dimensions of one design (a batch of one) as a drawing states them, mm."""
    one = {
        "rotor_radius_mm": sections.rotor_radius,
        "bore_radius_mm": sections.bore_radius,
        "sleeve_thickness_mm": sections.rotor_radius - sections.magnet_radius,
        "magnet_thickness_mm": sections.magnet_radius - sections.core_radius,
        "magnet_width_mm": _pole_pitch(sections) * sections.magnet_arc_ratio,
        "shaft_radius_mm": sections.shaft_radius,
        "tooth_width_mm": sections.tooth_width,
        "tip_width_mm": 2.0 * sections.tip_half_width,
        "tip_height_mm": sections.tip_radius - sections.bore_radius,
        "wedge_height_mm": sections.wedge_radius - sections.tip_radius,
        "slot_depth_mm": sections.slot_radius - sections.wedge_radius,
        "outer_radius_mm": sections.outer_radius,
    }
    return {name: float(value[0]) / MILLI for name, value in one.items()}


def _pole_pitch(sections: CrossSections) -> FloatArray:
    """Along the magnets' outer surface, m."""
    return np.asarray(np.pi * sections.magnet_radius / sections.family.pole_pairs)


def scattered_variables(sections: CrossSections, draw: Draw) -> dict[str, FloatArray]:
    """Design variables (n,) of the machines, all but the current density.

    Each dimension scatters on its own: a larger rotor does not make the bore larger.
    """
    size = {name: value + draw.of(name) for name, value in nominal_dimensions(sections).items()}
    family = sections.family
    bore, tooth = size["bore_radius_mm"], size["tooth_width_mm"]
    magnet = size["rotor_radius_mm"] - size["sleeve_thickness_mm"]
    slot = bore + size["tip_height_mm"] + size["wedge_height_mm"] + size["slot_depth_mm"]
    half_pitch = np.pi / family.slots
    return {
        "rotor_radius_mm": size["rotor_radius_mm"],
        "clearance_mm": bore - size["rotor_radius_mm"],
        "sleeve_thickness_mm": size["sleeve_thickness_mm"],
        "magnet_thickness_mm": size["magnet_thickness_mm"],
        "magnet_arc_ratio": np.minimum(
            size["magnet_width_mm"] * family.pole_pairs / (np.pi * magnet), 1.0
        ),
        "core_ratio": size["shaft_radius_mm"] / (magnet - size["magnet_thickness_mm"]),
        "tooth_width_ratio": tooth / (2.0 * bore * np.sin(half_pitch)),
        "tip_span_ratio": _tip_span(bore, tooth, size["tip_width_mm"], half_pitch),
        "tip_height_mm": size["tip_height_mm"],
        "wedge_height_mm": size["wedge_height_mm"],
        "slot_depth_ratio": size["slot_depth_mm"] / bore,
        "yoke_ratio": (size["outer_radius_mm"] - slot)
        / (tooth * family.slots / (2.0 * np.pi * family.pole_pairs)),
    }


def _tip_span(
    bore: FloatArray, tooth: FloatArray, tip: FloatArray, half_pitch: float
) -> FloatArray:
    """Inverse of the definition of ``tip_span_ratio``."""
    straight = np.arcsin(0.5 * tooth / bore)
    closing = np.arcsin(0.5 * tip / bore)
    wide = 1.0 + (closing - straight) / (half_pitch - straight)
    return np.asarray(np.where(tip <= tooth, tip / tooth, wide))


def built_task(task: Task, interference_um: float | None, draw: Draw, machine: int) -> Task:
    """The task with the materials of the lot of one machine.

    Parameters
    ----------
    task : Task
    interference_um : float or None
        Of the design; held, because the parts are made to it. None leaves it to the evaluator.
    draw : Draw
    machine : int
        Any machine of the lot.
    """

    def factor(name: str) -> float:
        return 1.0 + float(draw.of(name)[machine])

    parts = task.materials
    for name, material, quantity, _ in PROPERTIES:
        old = getattr(parts, material)
        if factor(name) != 1.0:
            scaled_one = replace(old, **{quantity: scaled(getattr(old, quantity), factor(name))})
            parts = replace(parts, **{material: scaled_one})
    loss = factor("stator_steel_loss")
    old_loss = parts.stator_steel.losses
    losses = replace(
        old_loss,
        hysteresis=loss * old_loss.hysteresis,
        classical=loss * old_loss.classical,
        excess=loss * old_loss.excess,
    )
    parts = replace(parts, stator_steel=replace(parts.stator_steel, losses=losses))
    construction = replace(
        task.construction, copper_fill=task.construction.copper_fill * factor("copper_fill")
    )
    if interference_um is not None:
        micrometres = interference_um + float(draw.of("sleeve_interference_um")[machine])
        construction = replace(construction, sleeve_interference=max(0.0, micrometres) * MICRO)
    return replace(task, materials=parts, construction=construction)


def scaled(quantity: Quantity, factor: float) -> Quantity:
    """The quantity `factor` times as large at every temperature."""
    return replace(
        quantity,
        value=quantity.value * factor,
        table_value=tuple(value * factor for value in quantity.table_value),
    )
