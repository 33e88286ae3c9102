"""The page of method: what was asked, how it was found, what the words mean, and what to mind."""

from __future__ import annotations

import tomllib
from html import escape

from evaluators.machine.geometry.variables import VARIABLES
from evaluators.machine.metrics import METRICS
from studies.comparison.numbers import BINDING, REFERENCE
from studies.inspection.design import CAUTIONS
from studies.report.collect import ReportData
from studies.report.columns import UNITS
from studies.report.html import bullets, element, paragraph, table
from studies.stored.layout import Results, program_version
from studies.study_file.convert import MATERIAL_KINDS
from studies.study_file.definition import Study
from studies.study_file.schema import OPTIONAL_SECTIONS, SIMPLE_SECTIONS
from studies.study_file.sections import unit_of
from studies.suggestions import stem
from studies.tables import number

READING = (
    "Front: the designs of one family that meet all limits and that no other design of that family "
    "beats in one objective without losing in another.",
    "Compromise: the design of a front nearest to the best value of every objective, once each "
    "objective is scaled from the best (0) to the worst (1) value of all fronts together.",
    "Hypervolume: share of a box that a front dominates; the box reaches from 0 to "
    f"{REFERENCE:g} in every objective on that same scale (Zitzler and Thiele 1999).",
    "Reserve: distance to a limit over the size of the limit; a limit binds where less than "
    f"{BINDING:.0%} is left.",
    "Force errors: a constant force is commanded for one whole turn. The mean force vector is the "
    "reference; the error magnitude is the largest relative deviation of the length of the force, "
    "the error angle the largest deviation of its direction.",
    "Screened values come from the evaluator named with the family. Verified values come from a "
    "finer one and are drawn as crosses joined to the screened design, where there are any.",
    "Angles are mechanical unless called electrical. The x axis is the axis of tooth 1, "
    "counter-clockwise is positive, forces are those on the rotor.",
    "Fronts with more designs than the report shows are thinned evenly; best values, statistics "
    "and distributions are of the whole front.",
)


def method_html(data: ReportData) -> str:
    """The whole section."""
    return "".join(
        [
            element("h3", "Cautions"),
            bullets(CAUTIONS, "cautions"),
            element("h3", "How to read this report"),
            bullets(READING),
            *(_study(results) for results in data.opened),
            _origin(data),
            element("h3", "Metrics"),
            table(
                ["metric", "unit", "meaning", "source"],
                [
                    [item.name, UNITS.get(item.unit, item.unit), item.definition, item.source]
                    for item in METRICS
                    if any(column.name == item.name for column in data.columns)
                ],
                words=4,
            ),
            element("h3", "Design variables"),
            table(
                ["variable", "unit", "meaning"],
                [
                    [item.name, UNITS.get(item.unit, item.unit), item.definition]
                    for item in VARIABLES
                ],
                words=3,
            ),
        ]
    )


def _study(results: Results) -> str:
    study = results.study
    return "".join(
        [
            element("h3", f"What was asked: {escape(study.name)}"),
            paragraph(study.description) if study.description else "",
            '<div class="two"><div>',
            table(["duty and conditions", "value"], task_rows(study), words=1),
            "</div><div>",
            table(["objective", "sense", "made of"], _goals(study), words=3),
            table(["limit"], [[limit.text()] for limit in study.limits])
            if study.limits
            else paragraph("No limits."),
            table(["material", "name"], material_rows(study), words=2),
            "</div></div>",
            _bounds(study),
        ]
    )


LEFT_OUT = ("study", "materials", "ripple_index", "search", "evaluator")
"""Sections of the study file that have a place of their own, or none, in a report."""


def task_rows(study: Study) -> list[list[str]]:
    """Duty, conditions and construction: every key of the study file with its value."""
    written = tomllib.loads(study.content.decode("utf-8-sig"))
    rows = []
    for section, model in (SIMPLE_SECTIONS | OPTIONAL_SECTIONS).items():
        if section in LEFT_OUT or (section in OPTIONAL_SECTIONS and section not in written):
            continue
        filled = model.model_validate(written.get(section, {}))
        for key, field in model.model_fields.items():
            value = getattr(filled, key)
            said = "left to the program" if value is None else _said(value, unit_of(key))
            name = stem(key).replace("_", " ")
            rows.append([f"{name}: {field.description}", said])
    return rows


def _said(value: object, unit: str) -> str:
    if isinstance(value, bool):
        return "yes" if value else "no"
    number_text = f"{value:.6g}" if isinstance(value, float) else str(value)
    return f"{number_text} {unit}".rstrip()


def material_rows(study: Study) -> list[list[str]]:
    """Which material each part is of."""
    return [
        [key.replace("_", " "), str(getattr(study.materials, key).name)] for key in MATERIAL_KINDS
    ]


def _goals(study: Study) -> list[list[str]]:
    return [
        [
            goal.name,
            "larger is better" if goal.maximise else "smaller is better",
            " + ".join(
                name if weight == 1.0 else f"{weight:g} × {name}" for name, weight in goal.terms
            ),
        ]
        for goal in study.objectives
    ]


def _bounds(study: Study) -> str:
    def said(family: str, name: str) -> str:
        low, high = study.bounds[family][name]
        if low == high:
            return f"fixed at {number(low)}"
        return f"{number(low)} to {number(high)}"

    columns: dict[tuple[str, ...], list[str]] = {}
    for family in study.families:
        key = tuple(said(family, item.name) for item in VARIABLES)
        columns.setdefault(key, []).append(family)
    heads = ["all families"] if len(columns) == 1 else [", ".join(v) for v in columns.values()]
    rows = [
        [item.name, *(key[position] for key in columns)] for position, item in enumerate(VARIABLES)
    ]
    return (
        "<details><summary>Bounds of the variables</summary>"
        + table(["variable", *heads], rows)
        + "</details>"
    )


def _origin(data: ReportData) -> str:
    """Evaluators, seeds and budgets, one line a search."""
    rows = []
    for family in data.families:
        prefix = family.label.removesuffix(family.member.stored.family)
        for search in family.member.stored.searches:
            settings = search.reader.settings
            evaluator = f"{settings.get('evaluator', '-')} {settings.get('evaluator_version', '')}"
            rows.append(
                [
                    f"{prefix}{search.name}",
                    evaluator.strip(),
                    str(settings.get("seed", "-")),
                    f"{search.counts[0]:,}",
                    str(settings.get("search", "-")),
                    family.results.study.digest[:16],
                ]
            )
    several = any(len(family.member.stored.searches) > 1 for family in data.families)
    head = [
        "search" if several else "family",
        "evaluator",
        "seed",
        "evaluations",
        "search",
        "study file, SHA-256",
    ]
    return (
        element("h3", "Where the numbers come from")
        + paragraph(f"Written by hovergap {program_version()}.")
        + table(head, rows, words=2)
    )
