"""The report as one HTML text."""

from __future__ import annotations

from collections.abc import Sequence
from html import escape
from importlib import resources
from string import Template
from typing import Any

import numpy as np
from bokeh.embed import components
from bokeh.resources import Resources

from evaluators.machine.geometry.variables import VARIABLES
from studies.comparison.numbers import BINDING, KEY_METRICS, LOSSES
from studies.drawing.palette import Mark, family_mark
from studies.report.cards import cards
from studies.report.certainty import (
    CertaintyData,
    all_surfaces,
    certainty_content,
    certainty_data,
    certainty_html,
)
from studies.report.certainty_figures import attainment_figure, order_figure
from studies.report.collect import FamilyData, ReportData
from studies.report.columns import title
from studies.report.encoding import coarse, packed, script_json, single
from studies.report.families import families_html
from studies.report.figures import fill_progress, fill_spread, report_figures
from studies.report.html import facts, paragraph, swatch
from studies.report.method import method_html

PROGRAM = (
    "base.js",
    "plots.js",
    "limits.js",
    "table.js",
    "card.js",
    "print.js",
    "certainty.js",
    "main.js",
)
MOST_AXES = 11


def report_html(data: ReportData, workers: int) -> str:
    """The whole page.

    Parameters
    ----------
    data : ReportData
    workers : int
        Processes that compute curves; the page does not depend on it.
    """
    marks = [family_mark(position) for position in range(len(data.families))]
    scaled = _spread(data)
    moving = np.any([np.isfinite(values).any(axis=0) for values in scaled], axis=0)
    varied = np.flatnonzero(moving).tolist()
    figures = report_figures(
        marks,
        [title(VARIABLES[position].name, VARIABLES[position].unit) for position in varied],
        [f"f{position}" for position in range(len(marks))],
    )
    fill_spread(figures, [values[:, varied] for values in scaled], marks)
    fill_progress(figures, [family.progress for family in data.families])
    chance = certainty_data(data)
    places_of_chance = _chance_figures(data, chance, marks)
    script, places = components({**figures.by_place, **places_of_chance}, wrap_script=False)
    parts = {
        "title": escape(_title(data)),
        "style": _asset("report.css"),
        "introduction": _introduction(data),
        "counts": _counts(data),
        "family_switches": _switches(data, marks),
        "axis_options": _options(data),
        "card": _asset("card.html"),
        "families": families_html(data, marks),
        "certainty": certainty_html(data, chance, marks),
        "certainty_link": '<a href="#certainty">Chance</a>\n' if chance else "",
        "method": method_html(data),
        "data": script_json(
            {**_content(data, marks), "certainty": certainty_content(data, chance)}
        ),
        "cards": script_json(packed(cards(data, workers))),
        "library": Resources(mode="inline", components=["bokeh"]).js_raw[0],
        "figures": script,
        "program": "(() => {\n" + "\n".join(_asset(name) for name in PROGRAM) + "\n})();",
    }
    page = Template(_asset("frame.html")).substitute(parts)
    for place, figure in places.items():
        # The figure's element takes the place that the frame, card or section keeps for it.
        start = page.index(f'<div id="{place}"')
        end = page.index("</div>", start)
        page = page[:end] + figure + page[end:]
    return page


def _chance_figures(
    data: ReportData, chance: CertaintyData | None, marks: Sequence[Mark]
) -> dict[str, Any]:
    if chance is None:
        return {}
    ordered = [marks[position] for position in chance.order]
    found = {"plot-order": order_figure(chance.certainty.families, ordered)}
    for place, surfaces in enumerate(all_surfaces(data, chance)):
        found[f"plot-attainment-{place}"] = attainment_figure(place, surfaces, marks)
    return found


def _asset(name: str) -> str:
    return resources.files("studies.report").joinpath("page", name).read_text(encoding="utf-8")


def _title(data: ReportData) -> str:
    names = list(dict.fromkeys(results.study.name for results in data.opened))
    return f"Fronts of {', '.join(names)}"


def _introduction(data: ReportData) -> str:
    said = [
        paragraph(results.study.description) for results in data.opened if results.study.description
    ]
    empty = [family.label for family in data.families if not family.front_size]
    if empty:
        said.append(paragraph(f"No design meets all limits in {', '.join(empty)}."))
    return "".join(said)


def _counts(data: ReportData) -> str:
    counts = [family.member.stored.counts for family in data.families]
    return facts(
        [
            ("families", f"{len(data.families)}"),
            ("evaluations", f"{sum(item[0] for item in counts):,}"),
            ("meet all limits", f"{sum(item[1] for item in counts):,}"),
            ("on the fronts", f"{sum(family.front_size for family in data.families):,}"),
            ("shown with a card", f"{sum(len(family.ids) for family in data.families):,}"),
        ]
    )


def _switches(data: ReportData, marks: Sequence[Mark]) -> str:
    return "".join(
        f'<label><input type="checkbox" checked data-family="{position}">'
        f"{swatch(mark, 'marker of')} {escape(family.label)} ({len(family.ids)})</label>"
        for position, (family, mark) in enumerate(zip(data.families, marks, strict=True))
    )


def _options(data: ReportData) -> str:
    """Choices of an axis, by group of the registry."""
    goals = {goal.name for goal in data.comparison.objectives}
    groups: dict[str, list[int]] = {"objectives": []}
    for position, column in enumerate(data.columns):
        group = "objectives" if column.name in goals else column.group
        groups.setdefault(group, []).append(position)
    said = []
    for group, positions in groups.items():
        inner = "".join(
            f'<option value="{position}">{escape(data.columns[position].title)}'
            f"{escape(', ' + data.columns[position].unit) if data.columns[position].unit else ''}"
            "</option>"
            for position in positions
        )
        if inner:
            said.append(f'<optgroup label="{escape(group)}">{inner}</optgroup>')
    return "".join(said)


# -- what the program of the page works with ------------------------------------------------------


def _content(data: ReportData, marks: Sequence[Mark]) -> dict[str, Any]:
    values = np.concatenate([family.values for family in data.families])
    context = np.concatenate([family.context for family in data.families])
    owners = [
        position for position, family in enumerate(data.families) for _ in range(len(family.ids))
    ]
    objectives = [data.position(goal.name) for goal in data.comparison.objectives]
    offsets = np.cumsum([0, *(len(family.ids) for family in data.families)])
    best = max(
        (item for item in range(len(data.families)) if data.families[item].ids),
        key=lambda item: data.families[item].member.joint_share,
    )
    compromise = data.families[best].compromise or 0
    return {
        "columns": [
            {
                "name": column.name,
                "title": column.title,
                "unit": column.unit,
                "kind": column.kind,
                "definition": column.definition,
                "better": {True: -1, False: 1, None: 0}[column.smaller_is_better],
            }
            for column in data.columns
        ],
        "families": [
            _family_content(data, family, mark, int(offset))
            for family, mark, offset in zip(data.families, marks, offsets[:-1], strict=True)
        ],
        "designs": {
            "ids": [item for family in data.families for item in family.ids],
            "family": owners,
            "values": single(values.T),
        },
        "context": {
            "count": len(context),
            "owner": [len(family.context) for family in data.families],
            "columns": [coarse(column) for column in context.T],
        },
        "verified": _verified_content(data, offsets),
        "objectives": objectives,
        "bounds": _bounds(data, values),
        "binding": BINDING,
        "losses": _loss_columns(data),
        "start": {
            "x": objectives[0],
            "y": objectives[min(1, len(objectives) - 1)],
            "colour": objectives[2] if len(objectives) > 2 else "family",
            "axes": _axes(data, values),
            "table": _table_columns(data),
            "key": _key_columns(data),
            "row": int(offsets[best]) + compromise,
        },
    }


def _family_content(
    data: ReportData, family: FamilyData, mark: Mark, offset: int
) -> dict[str, Any]:
    names = {column.name for column in data.columns}
    settings = family.member.stored.settings
    return {
        "label": family.label,
        "study": family.results.study.name,
        "pitch": family.winding.family.coil_pitch,
        "colour": mark.colour,
        "path": mark.path,
        "compromise": None if family.compromise is None else offset + family.compromise,
        "curvesBy": f"{settings.get('evaluator')} {settings.get('evaluator_version')}",
        "limits": [
            {
                "column": data.position(limit.metric),
                "kind": limit.kind,
                "value": limit.value,
                "scale": limit.scale,
            }
            for limit in family.results.study.limits
            if limit.metric in names
        ],
    }


def _verified_content(data: ReportData, offsets: np.ndarray[Any, Any]) -> list[dict[str, Any]]:
    found = []
    for family, offset in zip(data.families, offsets[:-1], strict=True):
        for position, design in enumerate(family.ids):
            item = family.verified.get(design)
            if item is not None:
                found.append(
                    {
                        "row": int(offset) + position,
                        "evaluator": f"{item.evaluator} {item.evaluator_version}",
                        "values": [item.metrics.get(column.name) for column in data.columns],
                    }
                )
    return found


def _bounds(data: ReportData, values: np.ndarray[Any, Any]) -> list[dict[str, Any]]:
    """Sliders: every limit at its loosest among the studies, then the objectives."""
    found: dict[tuple[int, str], float] = {}
    names = {column.name for column in data.columns}
    for results in data.opened:
        for limit in results.study.limits:
            if limit.metric in names:
                key = (data.position(limit.metric), limit.kind)
                loosest = max if limit.kind == "at_most" else min
                found[key] = loosest(found.get(key, limit.value), limit.value)
    for goal in data.comparison.objectives:
        column = data.position(goal.name)
        kind = "at_least" if goal.maximise else "at_most"
        if (column, kind) not in found:
            worst = np.nanmin if goal.maximise else np.nanmax
            found[column, kind] = float(worst(values[:, column]))
    return [
        {"column": column, "kind": kind, "start": start} for (column, kind), start in found.items()
    ]


def _positions(data: ReportData, names: Sequence[str]) -> list[int]:
    known = {column.name: position for position, column in enumerate(data.columns)}
    return [known[name] for name in dict.fromkeys(names) if name in known]


def _axes(data: ReportData, values: np.ndarray[Any, Any]) -> list[int]:
    """Objectives, then the variables that vary, then limited metrics, as many as stay readable."""
    goals = [goal.name for goal in data.comparison.objectives]
    varied = [item.name for item in VARIABLES]
    limited = [limit.metric for results in data.opened for limit in results.study.limits]
    candidates = _positions(data, [*goals, *varied, *limited])
    moving = [c for c in candidates if np.ptp(values[:, c]) > 0.0]
    return moving[:MOST_AXES]


def _table_columns(data: ReportData) -> list[int]:
    goals = [goal.name for goal in data.comparison.objectives]
    return _positions(data, [*goals, *KEY_METRICS])


def _key_columns(data: ReportData) -> list[int]:
    goals = [goal.name for goal in data.comparison.objectives]
    more = ["torque_Nm", "force_N", "turns_per_coil", "phase_current_A", "phase_voltage_V"]
    return _positions(data, [*goals, *KEY_METRICS, *more])


def _loss_columns(data: ReportData) -> dict[str, Any]:
    parts = [name for name in LOSSES if name != "loss_total_W"]
    total = _positions(data, ["loss_total_W"])
    return {"parts": _positions(data, parts), "total": total[0] if total else -1}


def _spread(data: ReportData) -> list[np.ndarray[Any, Any]]:
    """Per family the front's variables between 0 (lower bound) and 1 (upper), (n, variables)."""
    found = []
    for family in data.families:
        bounds = family.results.study.bounds[family.member.stored.family]
        scaled = np.full((family.front_size, len(VARIABLES)), np.nan)
        for position, item in enumerate(VARIABLES):
            low, high = bounds[item.name]
            if high > low:
                values = family.front_values[:, data.position(item.name)]
                scaled[:, position] = (values - low) / (high - low)
        found.append(scaled)
    return found
