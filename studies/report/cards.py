"""What the cards of the designs hold: cross-sections, windings, curves over the turn."""

from __future__ import annotations

from typing import Any

import numpy as np

from evaluators.machine.geometry.cross_sections import cross_sections
from evaluators.machine.geometry.variables import VARIABLES
from studies.drawing.cross_section import cross_section_svg
from studies.drawing.winding_diagram import winding_svg
from studies.report.collect import FamilyData, ReportData
from studies.report.encoding import coarse
from studies.report.waves import TurnCurves, all_curves

LONGEST_CURVES_S = 60.0
"""Curves are left to the compromises if the stored evaluations were so slow that all of them
would take longer than this on one processor."""


def cards(data: ReportData, workers: int) -> dict[str, Any]:
    """Drawings and curves of every design shown, in the order of the page."""
    designs = []
    for family, curves in zip(data.families, _curves(data, workers), strict=True):
        sections = _sections(family)
        designs += [
            {"section": section, "curves": _curve_content(item)}
            for section, item in zip(sections, curves, strict=True)
        ]
    return {
        "windings": [winding_svg(family.winding) for family in data.families],
        "designs": designs,
    }


def _sections(family: FamilyData) -> list[str]:
    if not family.ids:
        return []
    designs = {item.name: family.shown[item.name].to_numpy() for item in VARIABLES}
    study = family.results.study
    sections, valid, _ = cross_sections(family.winding.family, designs, study.construction)
    drawn = [""] * len(family.ids)
    for row, position in enumerate(valid.tolist()):
        drawn[position] = cross_section_svg(
            sections, row, family.winding, family.ids[position], "cs"
        )
    return drawn


def _curves(data: ReportData, workers: int) -> list[list[TurnCurves | None]]:
    """Curves of all designs, or of the compromises alone where all would take too long."""
    chosen = []
    for family in data.families:
        rows = family.shown.to_pylist()
        time = float(np.median([row["time_s"] for row in rows])) if rows else 0.0
        # Curves of one design take longer than its share of a batch.
        slow = 10.0 * time * sum(len(f.ids) for f in data.families) > LONGEST_CURVES_S
        few = [] if family.compromise is None else [family.compromise]
        chosen.append(few if slow else list(range(len(rows))))
    tasks = []
    for family, rows_of in zip(data.families, chosen, strict=True):
        study = family.results.study
        rows = family.shown.to_pylist()
        tasks.append(
            (
                study.task(family.member.stored.family),
                study.evaluator.name,
                study.evaluator.settings,
                [rows[position] for position in rows_of],
            )
        )
    found = all_curves(tasks, workers)
    whole: list[list[TurnCurves | None]] = []
    for family, rows_of, curves in zip(data.families, chosen, found, strict=True):
        line: list[TurnCurves | None] = [None] * len(family.ids)
        for position, item in zip(rows_of, curves, strict=True):
            line[position] = item
        whole.append(line)
    return whole


def _curve_content(curves: TurnCurves | None) -> dict[str, Any] | None:
    if curves is None:
        return None
    parts = {
        "torque": curves.torque,
        "cogging": curves.cogging,
        "xx": curves.force_x.real,
        "xy": curves.force_x.imag,
        "yx": curves.force_y.real,
        "yy": curves.force_y.imag,
    }
    content: dict[str, Any] = {key: coarse(part) for key, part in parts.items() if part.size}
    content["current"] = [float(f"{item:.5g}") for item in curves.current]
    content["force"] = [float(f"{item:.5g}") for item in curves.force]
    content["angle"] = [float(f"{item:.5g}") for item in curves.error_angle]
    content["error"] = [float(f"{item:.5g}") for item in curves.error_magnitude]
    return content
