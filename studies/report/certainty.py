"""The section on chance: how sure the order of the families is, and what their searches reach."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from html import escape
from itertools import combinations
from typing import Any

import numpy as np
from numpy.typing import NDArray

from optimizer.fronts import non_dominated
from studies.comparison.attainment import (
    MOST_OBJECTIVES,
    attained_share,
    attainment_surface,
    levels,
)
from studies.comparison.certainty import LEVEL, Certainty, FamilySearches
from studies.comparison.certainty_text import statements
from studies.comparison.numbers import REFERENCE
from studies.drawing.palette import Mark
from studies.report.certainty_figures import Surfaces
from studies.report.collect import ReportData
from studies.report.html import Cell, bullets, element, family_cell, paragraph, swatch, table
from studies.tables import number, percent

FloatArray = NDArray[np.float64]

MOST_PAIRS = 3  # of objectives that get a figure


@dataclass(frozen=True)
class CertaintyData:
    """What the section shows.

    Attributes
    ----------
    certainty : Certainty
    order : list of int
        Positions of the families in the report, the largest median first.
    pairs : list of (int, int)
        Objectives that are drawn against each other.
    """

    certainty: Certainty
    order: list[int]
    pairs: list[tuple[int, int]]


def certainty_data(data: ReportData) -> CertaintyData | None:
    """What the section shows; None if every family was searched once."""
    certainty = data.certainty
    if certainty is None:
        return None
    positions = {family.label: position for position, family in enumerate(data.families)}
    objectives = range(len(data.comparison.objectives))
    return CertaintyData(
        certainty=certainty,
        order=[positions[family.label] for family in certainty.families],
        pairs=list(combinations(objectives, 2))[:MOST_PAIRS],
    )


def certainty_content(data: ReportData, shown: CertaintyData | None) -> dict[str, Any] | None:
    """What the page's program needs to label the figures."""
    if shown is None:
        return None
    columns = [data.position(goal.name) for goal in data.comparison.objectives]
    return {
        "order": shown.order,
        "pairs": [[columns[across], columns[up]] for across, up in shown.pairs],
    }


def all_surfaces(data: ReportData, shown: CertaintyData) -> list[list[Surfaces]]:
    """For each pair of objectives the surfaces of each family, in the order of the report."""
    by_label = {family.label: family for family in shown.certainty.families}
    return [
        [_surfaces(data, by_label[family.label], pair) for family in data.families]
        for pair in shown.pairs
    ]


def _surfaces(data: ReportData, family: FamilySearches, pair: tuple[int, int]) -> Surfaces:
    """Best, median and worst surface of one family in two objectives, in their own units."""
    columns = list(pair)
    fronts = [_seen(front[:, columns]) for front in family.fronts]
    best, median, worst = (
        _path(attainment_surface(fronts, level)) for level in levels(len(family))
    )
    comparison = data.comparison
    low, high = comparison.ideal[columns], comparison.nadir[columns]
    signs = np.array([comparison.objectives[item].sign for item in columns])

    def own(path: FloatArray) -> FloatArray:
        return np.asarray(signs * (low + path * np.where(high > low, high - low, 1.0)))

    return Surfaces(own(best), own(median), own(worst))


def _seen(points: FloatArray) -> FloatArray:
    """The front (k, 2) of a front seen along the other objectives."""
    return points[non_dominated(points)]


def _path(corners: FloatArray) -> FloatArray:
    """Staircase (k, 2) along the corners, from edge to edge of the common box."""
    inside = corners[(corners < REFERENCE).all(axis=1)]
    if not len(inside):
        return np.array([[REFERENCE, REFERENCE]])
    x, y = inside.T
    across = np.concatenate([np.repeat(x, 2), [REFERENCE]])
    up = np.concatenate([[REFERENCE], np.repeat(y, 2)])
    return np.column_stack([across, up])


def certainty_html(data: ReportData, shown: CertaintyData | None, marks: Sequence[Mark]) -> str:
    """The whole section; nothing if every family was searched once."""
    if shown is None:
        return ""
    inner = [
        element("h2", "How sure is this order", id="certainty-title"),
        paragraph(
            "Every family was searched several times, each time from another seed. A mark is the "
            "hypervolume of one search alone, on the scale of all fronts together; the bar is the "
            "median of a family. Where the marks of two families overlap, another seed may turn "
            "their order round.",
            "lead",
        ),
        '<figure><div id="plot-order" class="plot" style="min-height:160px"></div></figure>',
        bullets(statements(shown.certainty)),
        _matrix(shown, marks),
        *_attainment(data, shown, marks),
    ]
    return element("section", "".join(inner), id="certainty", aria_labelledby="certainty-title")


def _matrix(shown: CertaintyData, marks: Sequence[Mark]) -> str:
    families = shown.certainty.families
    if len(families) < 3:
        return ""
    cells: dict[tuple[str, str], Cell] = {}
    for pair in shown.certainty.pairs:
        star = " *" if pair.sure else ""
        for a, b, chance in (
            (pair.first, pair.second, pair.probability),
            (pair.second, pair.first, 1.0 - pair.probability),
        ):
            cells[a, b] = Cell(f"{percent(chance)}{star}", chance)
    rows = [
        [
            family_cell(marks[position], row.label),
            *(cells.get((row.label, column.label), "–") for column in families),
        ]
        for row, position in zip(families, shown.order, strict=True)
    ]
    return table(
        ["", *(family.label for family in families)],
        rows,
        "Chance that one search of the row's family reaches more than one of the column's, ties "
        f"counted half (Vargha and Delaney 2000). *: p is {LEVEL:g} or less with all pairs "
        "counted.",
    )


def _attainment(data: ReportData, shown: CertaintyData, marks: Sequence[Mark]) -> list[str]:
    goals = data.comparison.objectives
    if not shown.pairs:
        return []
    seen = (
        ""
        if len(goals) == 2
        else " Two objectives are drawn at a time, whatever becomes of the others."
    )
    if len(shown.pairs) < len(goals) * (len(goals) - 1) // 2:
        seen += f" Of all pairs of objectives the first {len(shown.pairs)} are drawn."
    boxes = "".join(
        f'<label><input type="checkbox" checked data-attained="{position}">'
        f"{swatch(mark, 'marker of')} {escape(family.label)}</label>"
        for position, (family, mark) in enumerate(zip(data.families, marks, strict=True))
    )
    plots = "".join(
        f'<figure><div id="plot-attainment-{place}" class="plot" style="min-height:340px"></div>'
        "</figure>"
        for place in range(len(shown.pairs))
    )
    return [
        element("h3", "What the searches of a family reach"),
        paragraph(
            "At least half of a family's searches come as far as the line, at least one as far as "
            "the better edge of the shaded band, all as far as its other edge (attainment surface: "
            "Grunert da Fonseca, Fonseca and Hall 2001). Where the band is wide, one search more "
            f"may move the front as much.{seen}",
            "lead",
        ),
        f'<fieldset class="families"><legend>Families</legend>{boxes}</fieldset>',
        f'<div class="two">{plots}</div>',
        _shares(data, shown, marks),
    ]


def _shares(data: ReportData, shown: CertaintyData, marks: Sequence[Mark]) -> str:
    if len(data.comparison.objectives) > MOST_OBJECTIVES:
        return ""
    rows: list[list[str | Cell]] = []
    for family, position in zip(shown.certainty.families, shown.order, strict=True):
        shares = [attained_share(family.fronts, level, REFERENCE) for level in levels(len(family))]
        rows.append(
            [
                family_cell(marks[position], family.label),
                str(len(family)),
                *(number(share, 3) for share in shares),
            ]
        )
    return table(
        ["family", "searches", "by any search", "by half of them", "by all"],
        rows,
        "Share of the common box reached.",
    )
