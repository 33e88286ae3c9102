"""Geometry, winding and excitation of one machine as JSON for the user's own field solver."""

from __future__ import annotations

from typing import Any

import numpy as np

from evaluators.machine.field import excitation
from evaluators.machine.geometry.outlines import Outline
from evaluators.machine.metrics import METRICS
from evaluators.machine.task.description import (
    GUIDE,
    machine_description,
    materials_by_role,
    region_description,
)
from studies.export.files import ExportedFile, json_file
from studies.export.suspension import CURRENT
from studies.inspection.chosen import Chosen

FORMAT = "hovergap machine"
FORMAT_VERSION = 1
MACHINE = "machine.json"
EMF = "EMF of phase one per turn of a coil"

LENGTH = "two-dimensional results per metre times stack_length_mm / 1000"


def machine_file(chosen: Chosen, parts: tuple[Outline, ...]) -> ExportedFile:
    """The file ``machine.json``."""
    return json_file(
        MACHINE,
        machine_content(chosen, parts),
        f"format {FORMAT!r} version {FORMAT_VERSION}: outlines of all parts, materials, winding, "
        "currents with their phases, and the results of this evaluation to compare with",
    )


def machine_content(chosen: Chosen, parts: tuple[Outline, ...]) -> dict[str, Any]:
    """Everything another solver needs, and what this one found."""
    task, row = chosen.task, chosen.found.row
    return {
        "format": FORMAT,
        "format_version": FORMAT_VERSION,
        "guide": {**GUIDE, "length": LENGTH},
        "design": chosen.design,
        "study": chosen.results.study.name,
        **machine_description(task, chosen.sections, 0),
        "variables": chosen.values,
        "stack_length_mm": chosen.metric("stack_length_mm"),
        "materials": {role: item.name for role, item in materials_by_role(task).items()},
        "regions": [region_description(task.winding, part) for part in parts],
        "excitation": _excitation(chosen),
        "results": {
            "evaluator": row["evaluator"],
            "evaluator_version": row["evaluator_version"],
            "metrics": {item.name: row[item.name] for item in METRICS if item.name in row},
        },
    }


def _excitation(chosen: Chosen) -> dict[str, Any]:
    task = chosen.task
    density = np.array([1e6 * chosen.values["current_density_A_mm2"]])
    exciting = excitation(chosen.sections, density, task.duty, task.construction)
    turns = chosen.metric("turns_per_coil")
    content: dict[str, Any] = {
        "turns_per_coil": turns,
        "torque_peak_A": float(exciting.torque[0]) / turns,
        "suspension_peak_A": float(exciting.suspension[0]) / turns,
        "torque_sequence": task.winding.torque_sequence,
        "suspension_sequence": task.winding.suspension_sequence,
        "torque_angle_deg": _phase(chosen, EMF),
        "suspension_angle_x_deg": _phase(chosen, CURRENT.format(command="x")),
        "suspension_angle_y_deg": _phase(chosen, CURRENT.format(command="y")),
    }
    if content["torque_angle_deg"] is None:
        content["missing_angles"] = "the evaluator gives no waveforms to read them from"
    return content


def _phase(chosen: Chosen, name: str) -> float | None:
    """Electrical phase at rotor angle 0 of a waveform's fundamental, degrees."""
    if name not in chosen.waveforms:
        return None
    wave = chosen.waveforms[name]
    pole_pairs = chosen.task.winding.family.pole_pairs
    phasor = np.mean(wave.values * np.exp(-1j * pole_pairs * wave.positions))
    return float(np.degrees(np.angle(phasor)))
