"""One machine as plain values of JSON: for files others read, and for solvers outside."""

from __future__ import annotations

from dataclasses import asdict, fields
from typing import Any

from evaluators.machine.geometry.cross_sections import RADII, CrossSections
from evaluators.machine.geometry.outlines import Loop, Outline
from evaluators.machine.materials.kinds import Material, Table
from evaluators.machine.quantity import Quantity
from evaluators.machine.task.task import Task
from evaluators.machine.winding.winding import Winding

PHASE_NAMES = "UVW"
GROUP_NAMES = "ab"

TEMPERATURE_LAW = "value * (1 + per_K * (T - at_C)), or table_value over table_C"

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
}
"""How to read frame, outlines and currents."""


def machine_description(task: Task, sections: CrossSections, row: int) -> dict[str, Any]:
    """Family, duty, radii and magnets of design `row`; units stand in the names."""
    family = task.winding.family
    temperature = task.conditions.magnet_temperature
    return {
        "family": {**asdict(family), "id": family.id},
        "duty": {
            "power_W": task.duty.power,
            "speed_rad_s": task.duty.speed,
            "electrical_frequency_Hz": task.electrical_frequency,
            "dc_link_V": task.duty.dc_link_voltage,
            "suspension_share": task.duty.suspension_share,
        },
        "radii_m": {name: float(getattr(sections, name)[row]) for name in RADII},
        "magnetisation": task.construction.magnetisation,
        "magnet_temperature_C": temperature,
        "remanence_T": float(task.materials.magnet.remanence.at(temperature)),
    }


def region_description(winding: Winding, part: Outline) -> dict[str, Any]:
    """One part with its outline; coil sides and magnets with what they carry."""
    region: dict[str, Any] = {
        "part": part.part,
        "number": part.number + 1,
        "label": part.label,
        "area_mm2": part.area,
        "outer": _ring(part.outer),
        "holes": [_ring(hole) for hole in part.holes],
    }
    if part.part == "winding":
        side = winding.coil_sides[part.number]
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
        region |= {
            "pole": "north" if part.number % 2 == 0 else "south",
            "axis_deg": 360.0 * part.number / winding.family.poles,
        }
    return region


def _ring(loop: Loop) -> dict[str, Any]:
    return {"vertices_mm": loop.vertices.tolist(), "bulges": loop.bulges.tolist()}


def materials_by_role(task: Task) -> dict[str, Material]:
    """The materials of the machine by their key in the study."""
    return {item.name: getattr(task.materials, item.name) for item in fields(task.materials)}


def material_description(material: Material) -> dict[str, Any]:
    """Every property of a material with unit, temperature law, source and year, and its tables."""
    content: dict[str, Any] = {"name": material.name, "description": material.description}
    for item in fields(material):
        value = getattr(material, item.name)
        if isinstance(value, Quantity):
            content[item.name] = {
                entry.name: _plain(getattr(value, entry.name)) for entry in fields(value)
            }
        elif isinstance(value, Table):
            content[item.name] = {
                "source": value.source,
                "year": value.year,
                **{name: column.tolist() for name, column in value.columns.items()},
            }
    return content


def _plain(value: object) -> object:
    return list(value) if isinstance(value, tuple) else value
