"""Properties, magnetization and loss tables of the materials of a machine, with their sources."""

from __future__ import annotations

from dataclasses import fields

import numpy as np

from evaluators.machine.materials.kinds import Magnet, Table
from evaluators.machine.quantity import Quantity
from evaluators.machine.task.description import (
    TEMPERATURE_LAW,
    material_description,
    materials_by_role,
)
from evaluators.machine.task.task import Task
from studies.export.files import ExportedFile, json_file, text_file
from studies.tables import csv_text

FORMAT = "hovergap materials"
FORMAT_VERSION = 1
PROPERTIES = "material_properties.csv"
MATERIALS = "materials.json"
BEYOND_KNEE = "below this the magnet loses remanence"


def material_files(task: Task) -> list[ExportedFile]:
    """All properties as JSON and CSV, and one CSV for each magnetization and loss table."""
    found = materials_by_role(task)
    files = [
        json_file(
            MATERIALS,
            {
                "format": FORMAT,
                "format_version": FORMAT_VERSION,
                "temperature_law": TEMPERATURE_LAW,
                "materials": {
                    role: material_description(item)
                    for role, item in materials_by_role(task).items()
                },
            },
            "every property of every material with unit, temperature law, source and year",
        ),
        text_file(PROPERTIES, _properties(task), "the same properties as one table"),
    ]
    for role, material in found.items():
        for item in fields(material):
            table = getattr(material, item.name)
            if isinstance(table, Table):
                word = "bh" if item.name == "magnetization_table" else "iron_loss"
                sheet = ", of the sheet itself, not of the stack" if "steel" in role else ""
                columns = [column.tolist() for column in table.columns.values()]
                files.append(
                    text_file(
                        f"{word}_{role}.csv",
                        csv_text(list(table.columns), zip(*columns, strict=True)),
                        f"{material.name}{sheet}; source: {table.source} ({table.year})",
                    )
                )
        if isinstance(material, Magnet):
            files.append(_magnet_line(task, material))
    return files


def _magnet_line(task: Task, magnet: Magnet) -> ExportedFile:
    """Straight part of the second quadrant at the study's magnet temperature."""
    temperature = task.conditions.magnet_temperature
    knee = float(magnet.knee_field(temperature))
    field = np.linspace(knee, 0.0, 11)
    remanence = float(magnet.remanence.at(temperature))
    slope = (remanence - float(magnet.knee_flux_density(temperature))) / -knee
    rows = zip(field.tolist(), (remanence + slope * field).tolist(), strict=True)
    return text_file(
        "bh_magnet.csv",
        csv_text(["field_A_per_m", "flux_density_T"], rows),
        f"{magnet.name} at {temperature:g} °C, recoil line from the knee ({BEYOND_KNEE}) to zero "
        f"field; source: {magnet.remanence.source} ({magnet.remanence.year})",
    )


def _properties(task: Task) -> str:
    head = [
        "used_for",
        "material",
        "property",
        "value",
        "unit",
        "at_C",
        "per_K",
        "uncertainty",
        "source",
        "year",
    ]
    rows: list[list[object]] = []
    for role, material in materials_by_role(task).items():
        for item in fields(material):
            value = getattr(material, item.name)
            if not isinstance(value, Quantity):
                continue
            spread = "" if value.uncertainty is None else value.uncertainty
            plain = [value.value, value.unit, value.at_C, value.per_K, spread]
            rows.append([role, material.name, item.name, *plain, value.source, value.year])
    return csv_text(head, rows)
