"""Losses by place and mechanism."""

from __future__ import annotations

import numpy as np

from evaluators.machine.field import FieldSolution
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.losses.iron import IronLoss, iron_loss_sine
from evaluators.machine.performance.operating import Operating
from evaluators.machine.quantity import FloatArray
from evaluators.machine.task.task import Task

SMALLEST_DENSITY = 1e-3  # T


def metrics(task: Task, sections: CrossSections, state: Operating) -> dict[str, FloatArray]:
    """Metrics of losses and efficiency."""
    field, length = state.field, state.length
    copper = state.copper_slots + state.copper_ends
    teeth, yoke = field.loss_teeth * length, field.loss_yoke * length
    magnet, sleeve = field.loss_magnet * length, field.loss_sleeve * length
    iron = _by_mechanism(task, field)
    total = copper + teeth + yoke + magnet + sleeve + state.friction
    surface = 2.0 * np.pi * sections.outer_radius * length
    return {
        "loss_copper_W": copper,
        "loss_strand_eddy_W": state.copper_eddy,
        "loss_teeth_W": teeth,
        "loss_yoke_W": yoke,
        "loss_iron_W": teeth + yoke,
        "loss_iron_hysteresis_W": iron.hysteresis * length,
        "loss_iron_eddy_W": iron.classical * length,
        "loss_iron_excess_W": iron.excess * length,
        "loss_magnet_W": magnet,
        "loss_sleeve_W": sleeve,
        "loss_air_friction_W": state.friction,
        "loss_total_W": total,
        "efficiency": task.duty.power / (task.duty.power + total),
        "surface_loss_W_cm2": 1e-4 * (copper + teeth + yoke) / surface,
    }


def _by_mechanism(task: Task, field: FieldSolution) -> IronLoss:
    """Iron loss of teeth and yoke by mechanism, W/m.

    Where the field does not tell, each part is split as the steel's law splits the loss of a sine
    of the part's largest density at the electrical frequency.
    """
    hysteresis, eddy, excess = (
        field.loss_iron_hysteresis,
        field.loss_iron_eddy,
        field.loss_iron_excess,
    )
    if hysteresis is not None and eddy is not None and excess is not None:
        return IronLoss(hysteresis, eddy, excess)
    steel = task.materials.stator_steel
    stacking = float(steel.stacking_factor.value)
    parts = []
    for loss, density in (
        (field.loss_teeth, field.tooth_flux_density),
        (field.loss_yoke, field.yoke_flux_density),
    ):
        # At no flux the shares are those of the smallest flux: finite, and there is no loss then.
        sheet = np.maximum(density / stacking, SMALLEST_DENSITY)
        law = iron_loss_sine(steel.losses, sheet, task.electrical_frequency)
        parts.append([loss * part / law.total for part in law])
    return IronLoss(*(np.asarray(teeth + yoke) for teeth, yoke in zip(*parts, strict=True)))
