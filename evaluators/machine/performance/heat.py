"""Temperatures and what they leave to the limits of insulation and materials."""

from __future__ import annotations

import numpy as np

from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.performance.operating import Operating
from evaluators.machine.quantity import FloatArray
from evaluators.machine.task.task import Task
from evaluators.machine.thermal.insulation import class_margin, rise_margin


def metrics(task: Task, sections: CrossSections, state: Operating) -> dict[str, FloatArray]:
    """Metrics of temperature."""
    cooling, parts = task.cooling, task.materials
    slot, ends = state.temperature("winding"), state.temperature("end_turns")
    end_length = sections.end_turn_length(task.construction)
    mean = (slot * state.length + ends * end_length) / (state.length + end_length)
    hot = _hot_spot(sections, state, slot, ends, end_length) + cooling.hot_spot_allowance
    magnets, sleeve = state.temperature("magnets"), state.temperature("sleeve")
    margins = [
        parts.magnet.temperature_range[1] - magnets,
        parts.sleeve.temperature_range[1] - sleeve,
        parts.shaft.temperature_range[1] - state.temperature("core"),
    ]
    return {
        "winding_temperature_C": mean,
        "hot_spot_temperature_C": hot,
        "insulation_margin_K": class_margin(cooling.insulation_class, hot),
        "temperature_rise_margin_K": rise_margin(cooling.insulation_class, mean),
        "magnet_temperature_C": magnets,
        "sleeve_temperature_C": sleeve,
        "gap_temperature_C": state.temperature("gap"),
        "rotor_material_margin_K": np.min(margins, axis=0),
    }


def _hot_spot(
    sections: CrossSections,
    state: Operating,
    slot: FloatArray,
    ends: FloatArray,
    end_length: FloatArray,
) -> FloatArray:
    """Hottest point of slots and end turns by conduction across them, degC, without allowance."""
    if state.solids is None:
        return np.maximum(slot, ends)
    slots = sections.family.slots
    in_slot = state.copper_slots / (slots * sections.slot_area * state.length)
    at_end = state.copper_ends / (slots * sections.slot_area * end_length)
    return np.maximum(
        slot + in_slot * state.solids.slot_excess, ends + at_end * state.solids.bundle_excess
    )
