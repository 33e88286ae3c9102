"""Losses by place and mechanism."""

from __future__ import annotations

import numpy as np

from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.performance.operating import Operating
from evaluators.machine.quantity import FloatArray
from evaluators.machine.task.task import Task


def metrics(task: Task, sections: CrossSections, state: Operating) -> dict[str, FloatArray]:
    """Metrics of losses and efficiency."""
    field, length = state.field, state.length
    copper = state.copper_slots + state.copper_ends
    teeth, yoke = field.loss_teeth * length, field.loss_yoke * length
    magnet, sleeve = field.loss_magnet * length, field.loss_sleeve * length
    total = copper + teeth + yoke + magnet + sleeve + state.friction
    surface = 2.0 * np.pi * sections.outer_radius * length
    return {
        "loss_copper_W": copper,
        "loss_strand_eddy_W": state.copper_eddy,
        "loss_teeth_W": teeth,
        "loss_yoke_W": yoke,
        "loss_iron_W": teeth + yoke,
        "loss_magnet_W": magnet,
        "loss_sleeve_W": sleeve,
        "loss_air_friction_W": state.friction,
        "loss_total_W": total,
        "efficiency": task.duty.power / (task.duty.power + total),
        "surface_loss_W_cm2": 1e-4 * (copper + teeth + yoke) / surface,
    }
