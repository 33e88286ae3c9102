"""Geometry, winding and excitation of one machine as JSON for the user's own field solver."""

from __future__ import annotations

from dataclasses import asdict, fields
from typing import Any

import numpy as np

from evaluators.machine.field import excitation
from evaluators.machine.geometry import RADII
from evaluators.machine.metrics import METRICS
from studies.chosen import Chosen
from studies.drawing.outlines import Loop, Outline
from studies.export.files import ExportedFile, json_file
from studies.export.suspension import CURRENT
from studies.inspection import GROUP_NAMES, PHASE_NAMES

FORMAT = "hovergap machine"
FORMAT_VERSION = 1
MACHINE = "machine.json"
EMF = "EMF of phase one per turn of a coil"

GUIDE = {
    "frame": "x along the axis of tooth 1, counter-clockwise positive, origin on the shaft axis; "
    "rotor angle theta = 0 has a north magnet on x; speed is counter-clockwise",
    "outlines": "vertices in mm with the bulge of the edge that leaves each: 0 straight, else an "
    "arc of 4 atan(bulge), counter-clockwise if positive; rings run counter-clockwise and close; "
    "holes are left out of the outer ring",
    "current": "a coil side carries turns_per_coil * (torque_direction * torque current of its "
    "phase + suspension_direction * suspension current of its phase) along +z",
    "torque_current": "i_k = torque_peak_A cos(p theta + torque_angle - torque_sequence 2 pi k/3)",
    "suspension_current": "i_k = suspension_peak_A cos(p theta + angle - suspension_sequence 2 pi "
    "k/3), angle = suspension_angle_x for a mean force along x, suspension_angle_y along y",
    "length": "two-dimensional results per metre times stack_length_mm / 1000",
}


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
    sections, family = chosen.sections, task.winding.family
    return {
        "format": FORMAT,
        "format_version": FORMAT_VERSION,
        "guide": GUIDE,
        "design": chosen.design,
        "study": chosen.results.study.name,
        "family": {**asdict(family), "id": family.id},
        "duty": {
            "power_W": task.duty.power,
            "speed_rad_s": task.duty.speed,
            "electrical_frequency_Hz": task.electrical_frequency,
            "dc_link_V": task.duty.dc_link_voltage,
            "suspension_share": task.duty.suspension_share,
        },
        "variables": chosen.values,
        "radii_m": {name: float(getattr(sections, name)[0]) for name in RADII},
        "stack_length_mm": chosen.metric("stack_length_mm"),
        "materials": {
            item.name: getattr(task.materials, item.name).name for item in fields(task.materials)
        },
        "magnetisation": task.construction.magnetisation,
        "magnet_temperature_C": task.conditions.magnet_temperature,
        "remanence_T": float(
            task.materials.magnet.remanence.at(task.conditions.magnet_temperature)
        ),
        "regions": [_region(chosen, part) for part in parts],
        "excitation": _excitation(chosen),
        "results": {
            "evaluator": row["evaluator"],
            "evaluator_version": row["evaluator_version"],
            "metrics": {item.name: row[item.name] for item in METRICS if item.name in row},
        },
    }


def _region(chosen: Chosen, part: Outline) -> dict[str, Any]:
    region: dict[str, Any] = {
        "part": part.part,
        "number": part.number + 1,
        "label": part.label,
        "area_mm2": part.area,
        "outer": _ring(part.outer),
        "holes": [_ring(hole) for hole in part.holes],
    }
    if part.part == "winding":
        side = chosen.task.winding.coil_sides[part.number]
        region |= {
            "slot": side.slot + 1,
            "layer": side.layer,
            "coil": side.coil + 1,
            "phase": PHASE_NAMES[side.phase],
            "group": GROUP_NAMES[side.group],
            "torque_direction": side.torque_direction,
            "suspension_direction": side.suspension_direction,
        }
    elif part.part == "magnet":
        poles = chosen.task.winding.family.poles
        region |= {
            "pole": "north" if part.number % 2 == 0 else "south",
            "axis_deg": 360.0 * part.number / poles,
        }
    return region


def _ring(loop: Loop) -> dict[str, Any]:
    return {"vertices_mm": loop.vertices.tolist(), "bulges": loop.bulges.tolist()}


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
