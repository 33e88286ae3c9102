"""Torque, force and flux densities at the duty."""

from __future__ import annotations

import numpy as np

from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.performance.operating import Operating
from evaluators.machine.quantity import FloatArray
from evaluators.machine.task.task import Task


def metrics(task: Task, sections: CrossSections, state: Operating) -> dict[str, FloatArray]:
    """Metrics of torque, suspension force and field."""
    weights, field, length = task.ripple, state.field, state.length
    angle_deg = np.degrees(field.force_error_angle)
    bias = np.zeros_like(length) if field.force_angle_bias is None else field.force_angle_bias
    index = (
        weights.torque_ripple_weight * field.torque_ripple / weights.torque_ripple_limit
        + weights.force_error_weight * field.force_error_magnitude / weights.force_error_limit
        + weights.force_angle_weight * angle_deg / weights.force_angle_limit_deg
    )
    torque = field.torque * length
    return {
        "torque_Nm": torque,
        "torque_ripple": field.torque_ripple,
        "cogging_torque_Nm": field.cogging * length,
        "torque_density_Nm_L": torque / (1e3 * np.pi * sections.outer_radius**2 * length),
        "force_N": field.force * length,
        "force_error_magnitude": field.force_error_magnitude,
        "force_error_angle_deg": angle_deg,
        "force_angle_bias_deg": np.degrees(np.abs(bias)),
        "residual_voltage": np.full_like(length, task.winding.residual_voltage),
        "ripple_index": index,
        "displacement_stiffness_N_mm": 1e-3 * field.displacement_stiffness * length,
        "gap_flux_density_T": field.gap_flux_density,
        "tooth_flux_density_T": field.tooth_flux_density,
        "yoke_flux_density_T": field.yoke_flux_density,
        "core_flux_density_T": field.core_flux_density,
        "magnet_flux_density_T": field.magnet_flux_density,
        "slot_opening_mm": 1e3 * sections.slot_opening,
    }
