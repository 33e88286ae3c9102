"""The sheet of one design, section by section."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from evaluators.machine.geometry.cross_sections import CrossSections, cross_sections
from evaluators.machine.geometry.variables import VARIABLES
from evaluators.machine.metrics import METRICS
from evaluators.machine.winding.winding import Winding
from studies.drawing.cross_section import cross_section_svg
from studies.drawing.slot_detail import slot_detail_svg, slot_measures
from studies.drawing.winding_diagram import winding_svg
from studies.errors import ResultsError
from studies.inspection.design import (
    CAUTIONS,
    GROUP_NAMES,
    PHASE_NAMES,
    Inspection,
    inspect_design,
    reserve,
)
from studies.report.columns import UNITS, title
from studies.report.method import material_rows, task_rows
from studies.sheet.blocks import Block, Cautions, Drawing, Grid, Heading, Sheet, Text
from studies.sheet.checks import worked_checks
from studies.stored.layout import Results, program_version
from studies.tables import number, percent

DIRECTION = {1: "+", -1: "−"}


def design_sheet(results: Results, design: str) -> Sheet:
    """Everything about one stored design.

    Raises
    ------
    ResultsError
        If it is not stored, or could not be evaluated, so that there is nothing to build.
    """
    found = inspect_design(results, design)
    if not found.evaluated:
        msg = (
            f"{design} could not be evaluated ({found.row['status']}: {found.row['reason']}), so "
            "there is no sheet of it"
        )
        raise ResultsError(msg)
    study = results.study
    family = found.winding.family.id
    designs = {item.name: np.array([float(found.row[item.name])]) for item in VARIABLES}
    sections, _, _ = cross_sections(found.winding.family, designs, study.construction)
    blocks: list[Block] = [
        Text(_verdict(found)),
        Cautions(CAUTIONS),
        Heading("What it must do"),
        Grid(
            ("duty, conditions, construction", "value"),
            _pairs(task_rows(study)),
            weights=(5, 2),
        ),
        Grid(("part", "material"), _pairs(material_rows(study)), words=2),
        Heading("Cross-section"),
        Drawing(
            cross_section_svg(sections, 0, found.winding, found.design, "whole"),
            "To scale. Coil sides: colour is the phase, lighter is group b; a dot is current "
            "towards the reader.",
        ),
        Drawing(
            slot_detail_svg(sections, 0, found.winding, "detail"),
            "One slot, enlarged; letters as in the table below.",
        ),
        Grid(
            ("", "measure", "mm"),
            tuple((m.letter, m.name, f"{m.value:.3f}") for m in slot_measures(sections, 0)),
            words=2,
            weights=(1, 6, 2),
        ),
        *_dimensions(sections, found.row),
        Heading("Winding"),
        *_winding(found.winding, found.row),
        Heading("Limits"),
        _limits(found),
        Heading("Worked values"),
        Text(
            "Found again from other values of this sheet by textbook formulas. A line that does "
            "not agree asks for a look before anything is built."
        ),
        _checks(results, family, sections, found.row),
        Heading("All metrics"),
        _metrics(found),
        Heading("Where the numbers come from"),
        Grid(("", ""), _origin(results, found), words=2),
        Text("Checked by: ______________________    Date: ______________"),
    ]
    return Sheet(
        title=f"Design {found.design}",
        subtitle=f"Study {study.name}. {study.description}".strip(),
        footer=f"{found.design}, study {study.name}, hovergap {program_version()}",
        blocks=tuple(blocks),
    )


def _verdict(found: Inspection) -> str:
    family = found.winding.family
    kind = (
        f"{family.slots} slots, {family.poles} magnet poles, suspension field of "
        f"{2 * family.suspension_pole_pairs} poles, coil pitch {family.coil_pitch}."
    )
    if not found.row["feasible"]:
        return f"{kind} It breaks at least one limit of its study."
    if found.on_front:
        return f"{kind} It meets all limits and is on the front of its family."
    return f"{kind} It meets all limits; another design of its family beats it in every objective."


def _pairs(rows: list[list[str]]) -> tuple[tuple[str, ...], ...]:
    return tuple(tuple(row) for row in rows)


def _dimensions(sections: CrossSections, row: Mapping[str, Any]) -> list[Block]:
    radii = (
        ("stator outer diameter", sections.outer_radius),
        ("slot bottom diameter", sections.slot_radius),
        ("winding inner diameter", sections.wedge_radius),
        ("bore diameter", sections.bore_radius),
        ("rotor outer diameter, over the sleeve", sections.rotor_radius),
        ("magnet outer diameter", sections.magnet_radius),
        ("core outer diameter", sections.core_radius),
        ("shaft diameter", sections.shaft_radius),
    )
    lines = [(name, f"{2e3 * float(radius[0]):.3f} mm") for name, radius in radii]
    arc = 360.0 / sections.family.poles * float(sections.magnet_arc_ratio[0])
    lines.append(("arc of one magnet", f"{arc:.3f}° of {360.0 / sections.family.poles:g}°"))
    if row.get("stack_length_mm") is not None:
        lines.append(("stack length", f"{row['stack_length_mm']:.3f} mm"))
    areas = (
        ("wound area of one slot", sections.slot_area),
        ("stator iron", sections.stator_area),
        ("magnets", sections.magnet_area),
        ("sleeve", sections.sleeve_area),
        ("rotor core", sections.core_area),
        ("shaft", sections.shaft_area),
    )
    cut = [(name, f"{1e6 * float(area[0]):.2f} mm²") for name, area in areas]
    values = [
        (item.name, number(float(row[item.name]), 5), UNITS.get(item.unit, item.unit))
        for item in VARIABLES
    ]
    return [
        Grid(("dimension", "value"), tuple(lines)),
        Grid(("area", "value"), tuple(cut)),
        Grid(("design variable", "value", "unit"), tuple(values)),
    ]


def _winding(winding: Winding, row: Mapping[str, Any]) -> list[Block]:
    family = winding.family
    made = [
        ("torque winding factor", f"{winding.torque_winding_factor:.4f}"),
        ("suspension winding factor", f"{winding.suspension_winding_factor:.4f}"),
    ]
    for name, said in (
        ("turns_per_coil", "turns of one coil"),
        ("parallel_groups", "groups in parallel for torque"),
        ("strands_per_turn", "strands of one turn"),
        ("wire_diameter_mm", "bare wire diameter, mm"),
        ("copper_fill", "bare copper over wound area"),
    ):
        if row.get(name) is not None:
            made.append((said, number(float(row[name]))))
    sides = tuple(
        (
            str(side.slot + 1),
            str(side.layer),
            str(side.coil + 1),
            f"{PHASE_NAMES[side.phase]}{GROUP_NAMES[side.group]}",
            DIRECTION[int(side.torque_direction)],
            DIRECTION[int(side.suspension_direction)],
        )
        for side in winding.coil_sides
    )
    strings = tuple(
        (
            f"{PHASE_NAMES[item.phase]}{GROUP_NAMES[item.group]}",
            ", ".join(
                f"{coil + 1} (in {start + 1}, out {finish + 1})"
                for coil, start, finish in zip(item.coils, item.starts, item.finishes, strict=True)
            ),
        )
        for item in winding.connections
    )
    where = "beside each other" if family.coil_pitch == 1 else "above each other, 1 at the bottom"
    return [
        Drawing(
            winding_svg(winding),
            "Unrolled. First sign: torque current, second: suspension current, + towards the "
            "reader. Dashed coils are group b.",
            1.0,
        ),
        Grid(("winding", "value"), tuple(made)),
        Text(
            "Coil strings: coils in series in the order in which current passes, with the slot it "
            "enters and leaves each by. For suspension the ends of the strings of group b are "
            "exchanged."
        ),
        Grid(("string", "coils"), strings, words=2, weights=(1, 7)),
        Text(
            "Coil sides. Slots and coils are counted from 1, counter-clockwise, slot 1 after tooth "
            f"1; the two layers lie {where}."
        ),
        Grid(("slot", "layer", "coil", "string", "torque", "suspension"), sides, words=0),
    ]


def _limits(found: Inspection) -> Block:
    if not found.limits:
        return Text("The study has no limits.")
    rows = []
    for limit in found.limits:
        left = reserve(limit, found.row)
        sign = "≤" if limit.kind == "at_most" else "≥"
        rows.append(
            (
                limit.metric,
                number(found.row[limit.metric]),
                f"{sign} {number(limit.value)}",
                percent(left) if limit.value else number(left),
                "met" if left >= 0.0 else "BROKEN",
            )
        )
    return Grid(("limit on", "value", "limit", "reserve", ""), tuple(rows), weights=(4, 2, 2, 2, 2))


def _checks(
    results: Results, family: str, sections: CrossSections, row: Mapping[str, Any]
) -> Block:
    rows = []
    for check in worked_checks(results.study.task(family), sections, row):
        verdict = "agrees" if check.agrees else "LOOK"
        rows.append(
            (
                f"{check.name}: {check.formula}",
                check.worked,
                f"{number(check.by_hand)} {check.unit}".strip(),
                f"{number(check.reported)} {check.unit}".strip(),
                f"{percent(check.difference)}; {verdict} within {100 * check.tolerance:.3g} %: "
                f"{check.why}",
            )
        )
    return Grid(
        ("check", "with numbers", "by hand", "reported", "difference"),
        tuple(rows),
        words=2,
        tail=1,
        weights=(4, 5, 2, 2, 4),
    )


def _metrics(found: Inspection) -> Block:
    rows = []
    for metric in METRICS:
        value = found.row.get(metric.name)
        if value is not None:
            unit = found.currency if metric.unit == "money" else UNITS.get(metric.unit, metric.unit)
            rows.append(
                (
                    title(metric.name, metric.unit),
                    metric.definition,
                    f"{number(value)} {unit}".strip(),
                    metric.source,
                )
            )
    return Grid(
        ("metric", "meaning", "value", "source"),
        tuple(rows),
        words=2,
        tail=1,
        weights=(3, 6, 2.4, 4),
    )


def _origin(results: Results, found: Inspection) -> tuple[tuple[str, ...], ...]:
    row = found.row
    return (
        ("evaluator", f"{row['evaluator']} {row['evaluator_version']}"),
        (
            "seed, evaluation, generation",
            f"{row['seed']}, {row['evaluation']}, {row['generation']}",
        ),
        ("evaluated at", f"{row['finished_at']}"),
        ("study file, SHA-256", results.study.digest),
        ("program", f"hovergap {program_version()}"),
    )
