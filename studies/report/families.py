"""The section on families: how their fronts compare, which shapes were chosen, what binds."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from evaluators.machine.geometry.variables import VARIABLES
from studies.comparison.certainty_text import once_only
from studies.comparison.numbers import BINDING, REFERENCE, extremes
from studies.drawing.palette import Mark
from studies.drawing.winding_diagram import winding_svg
from studies.report.collect import FamilyData, ReportData
from studies.report.columns import title
from studies.report.html import Cell, design_cell, element, family_cell, paragraph, table
from studies.study_file.crosschecks import Limit
from studies.tables import number, percent

STRAIGHT = 0.02
"""Tip spans nearer to 1 than this count as straight walls."""


def families_html(data: ReportData, marks: Sequence[Mark]) -> str:
    """The whole section."""
    return "".join(
        [
            _overview(data, marks),
            _once_only(data),
            _best(data, marks),
            '<div class="two"><div>',
            element("h3", "Search progress"),
            paragraph(
                "Share of a common box that the designs found so far dominate. The box spans the "
                "best to the worst value of every objective over all fronts, and "
                f"{REFERENCE - 1:.0%} beyond. A curve that still rises at its end asks for a "
                "larger budget.",
                "lead",
            ),
            '<div id="plot-progress" class="plot" style="min-height:300px"></div></div><div>',
            _tips(data, marks),
            _binding(data),
            "</div></div>",
            element("h3", "Where the fronts lie between the bounds"),
            paragraph(
                "Every tick is one design of a front; families lie above each other in the order "
                "of the table. Ticks crowded at a bound ask whether the bound should be moved.",
                "lead",
            ),
            '<div id="plot-spread" class="plot" style="min-height:600px"></div>',
            _quartiles(data, marks),
            _windings(data),
        ]
    )


def _once_only(data: ReportData) -> str:
    said = "" if data.certainty else once_only(data.comparison)
    return paragraph(said.replace("`", ""), "quiet") if said else ""


def _overview(data: ReportData, marks: Sequence[Mark]) -> str:
    rows: list[list[str | Cell]] = []
    for family, mark in zip(data.families, marks, strict=True):
        evaluations, feasible, failed = family.member.stored.counts
        machine = family.winding.family
        rows.append(
            [
                family_cell(mark, family.label),
                str(machine.coil_pitch),
                f"{family.winding.torque_winding_factor:.3f}",
                f"{family.winding.suspension_winding_factor:.3f}",
                f"{machine.electrical_frequency(family.results.study.duty.speed):.0f}",
                f"{evaluations:,}",
                percent(feasible / evaluations) if evaluations else "-",
                f"{failed:,}",
                f"{family.front_size:,}",
                number(family.member.hypervolume, 3),
                percent(family.member.joint_share),
            ]
        )
    head = [
        "family",
        "coil pitch",
        "torque winding factor",
        "suspension winding factor",
        "frequency, Hz",
        "evaluations",
        "feasible",
        "failed",
        "front",
        "hypervolume",
        "share of the joint front",
    ]
    return table(head, rows, "Joint front: the designs that no design of any family beats.")


def _best(data: ReportData, marks: Sequence[Mark]) -> str:
    """Best value of each objective per family, and the compromise."""
    goals = data.comparison.objectives
    head: list[str] = ["family"]
    for goal in goals:
        column = data.columns[data.position(goal.name)]
        unit = f", {column.unit}" if column.unit else ""
        head.append(f"{'largest' if goal.maximise else 'smallest'} {column.title}{unit}")
        head.append("design")
    head.append("compromise")
    rows = []
    for family, mark in zip(data.families, marks, strict=True):
        best = extremes(data.comparison, family.member)
        cells: list[str | Cell] = [family_cell(mark, family.label)]
        for goal in goals:
            value, design = best.get(goal.name, (float("nan"), "-"))
            cells += [number(value), design_cell(design)]
        compromise = family.compromise
        cells.append(design_cell("-" if compromise is None else family.ids[compromise]))
        rows.append(cells)
    return element("h3", "Best of each family") + table(
        head,
        rows,
        "Compromise: the design of a front nearest to the best value of every objective, on the "
        "scale of all fronts together.",
    )


def tip_shapes(spans: np.ndarray[tuple[int], np.dtype[np.float64]]) -> tuple[int, int, int]:
    """How many tooth tips are pointed, straight and half-closed.

    Parameters
    ----------
    spans : array (n,)
        `tip_span_ratio`: below 1 pointed, 1 straight walls, above 1 half-closed.
    """
    pointed = int(np.count_nonzero(spans < 1.0 - STRAIGHT))
    closed = int(np.count_nonzero(spans > 1.0 + STRAIGHT))
    return pointed, len(spans) - pointed - closed, closed


def _tips(data: ReportData, marks: Sequence[Mark]) -> str:
    column = data.position("tip_span_ratio")
    rows = []
    for family, mark in zip(data.families, marks, strict=True):
        counts = tip_shapes(family.front_values[:, column])
        size = max(1, family.front_size)
        rows.append(
            [
                family_cell(mark, family.label),
                *(Cell(percent(n / size), n / size) for n in counts),
            ]
        )
    return element("h3", "Tooth tips the search chose") + table(
        ["family", "pointed", "straight", "half-closed"],
        rows,
        f"Share of the front; straight: tip span ratio within {STRAIGHT:g} of 1.",
    )


def _limit_text(data: ReportData, limit: Limit) -> str:
    column = data.columns[data.position(limit.metric)]
    sign = "≤" if limit.kind == "at_most" else "≥"
    return f"{column.title} {sign} {limit.value:g} {column.unit}".rstrip()


def _binding(data: ReportData) -> str:
    limits = {limit.name: limit for results in data.opened for limit in results.study.limits}
    bound = [name for name in limits if any(name in f.member.binding for f in data.families)]
    heading = element("h3", "Limits that bind")
    if not bound:
        return heading + paragraph("No design of any front comes close to a limit.")
    head = ["limit", *(family.label for family in data.families)]
    rows = []
    for name in bound:
        cells: list[str | Cell] = [_limit_text(data, limits[name])]
        for family in data.families:
            share = family.member.binding.get(name, 0.0)
            cells.append(Cell(percent(share), shade=share))
        rows.append(cells)
    return heading + table(
        head,
        rows,
        f"Share of the front that keeps less than {BINDING:.0%} of the limit in reserve.",
    )


def _quartiles(data: ReportData, marks: Sequence[Mark]) -> str:
    """The distributions as numbers."""
    head = ["variable", "unit", *(family.label for family in data.families)]
    rows = []
    for variable in VARIABLES:
        column = data.position(variable.name)
        unit = data.columns[column].unit
        shares = [_middle_half(family, column, variable.name) for family in data.families]
        rows.append([title(variable.name, variable.unit), unit, *shares])
    return (
        "<details><summary>The same as numbers</summary>"
        + table(head, rows, "Quarter, half and three quarters of each front.", words=2)
        + "</details>"
    )


def _middle_half(family: FamilyData, column: int, name: str) -> str:
    low, high = family.results.study.bounds[family.member.stored.family][name]
    if low == high:
        return f"fixed at {number(low, 3)}"
    if not family.front_size:
        return "-"
    quartiles = np.quantile(family.front_values[:, column], (0.25, 0.5, 0.75))
    return " / ".join(number(float(item), 3) for item in quartiles)


def _windings(data: ReportData) -> str:
    """One drawing for each different winding."""
    drawn = {family.winding.family: family.winding for family in data.families}
    parts = [element("h3", "Windings")]
    for winding in drawn.values():
        text = (
            f"{winding.family.id}, coil pitch {winding.family.coil_pitch}, torque factor "
            f"{winding.torque_winding_factor:.3f}, suspension factor "
            f"{winding.suspension_winding_factor:.3f}"
        )
        parts.append(
            f"<details><summary>{text}</summary>"
            '<div class="wide" tabindex="0" role="group" aria-label="Winding, scrolls sideways">'
            f'<div class="drawing">{winding_svg(winding)}</div></div></details>'
        )
    return "".join(parts)
