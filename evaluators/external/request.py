"""What a program outside is told of one design."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from math import degrees
from typing import Any

from evaluators.external.quantities import FIELD
from evaluators.machine.field import Excitation
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.geometry.dxf import dxf_bytes
from evaluators.machine.geometry.outlines import outlines
from evaluators.machine.task.description import (
    GUIDE,
    TEMPERATURE_LAW,
    machine_description,
    material_description,
    materials_by_role,
    region_description,
)
from evaluators.machine.task.task import Task
from evaluators.machine.winding.phases import current_phases

FORMAT = "hovergap field request"
FORMAT_VERSION = 1
DRAWING = "cross_section.dxf"
MILLI = 1e-3


def request_files(
    task: Task,
    sections: CrossSections,
    exciting: Excitation,
    row: int,
    variables: Mapping[str, float],
    field: bool,
    metrics: Sequence[str],
    drawing: bool,
) -> dict[str, bytes]:
    """Content by name of the files for design `row`: ``request.json``, and a drawing if wanted.

    Parameters
    ----------
    variables : mapping of name to float
        The design in the units of the names.
    field : bool
        Whether the reply must hold the field quantities.
    metrics : sequence of str
        Metrics the reply must hold.
    """
    parts = outlines(sections, row, task.winding)
    conditions, construction = task.conditions, task.construction
    phases = current_phases(task.winding)
    content: dict[str, Any] = {
        "format": FORMAT,
        "format_version": FORMAT_VERSION,
        **machine_description(task, sections, row),
        "variables": dict(variables),
        "torque_winding_factor": task.winding.torque_winding_factor,
        "suspension_winding_factor": task.winding.suspension_winding_factor,
        "tooth_width_m": float(sections.tooth_width[row]),
        "tip_half_width_m": float(sections.tip_half_width[row]),
        "excitation": {
            "turns_per_coil": 1,
            "torque_peak_A": float(exciting.torque[row]),
            "suspension_peak_A": float(exciting.suspension[row]),
            "torque_sequence": task.winding.torque_sequence,
            "suspension_sequence": task.winding.suspension_sequence,
            "torque_angle_deg": degrees(phases.torque),
            "suspension_angle_x_deg": degrees(phases.suspension_x),
            "suspension_angle_y_deg": degrees(phases.suspension_y),
        },
        "construction": {
            "magnet_segments": construction.magnet_segments,
            "magnet_axial_segment_mm": construction.magnet_axial_segment / MILLI,
            "copper_fill": construction.copper_fill,
        },
        "temperatures": {
            "winding_C": conditions.winding_temperature,
            "magnet_C": conditions.magnet_temperature,
            "sleeve_C": conditions.sleeve_temperature,
        },
        "drawing": DRAWING if drawing else None,
        "wanted_field": [item.key for item in FIELD] if field else [],
        "wanted_metrics": list(metrics),
        "guide": {
            **GUIDE,
            "length": "all results are of a slice of the machine, per metre of its length",
            "temperature_law": TEMPERATURE_LAW,
        },
        "materials": {
            role: material_description(item) for role, item in materials_by_role(task).items()
        },
        "regions": [region_description(task.winding, part) for part in parts],
    }
    # One scalar a line, so that a program without a JSON library can pick what it needs.
    text = json.dumps(content, indent=1, allow_nan=False, ensure_ascii=True)
    files = {"request.json": (text + "\n").encode()}
    if drawing:
        title = f"{task.winding.family.id}, rotor at angle 0, mm"
        files[DRAWING] = dxf_bytes(parts, title, {}, "See request.json beside this file.")
    return files
