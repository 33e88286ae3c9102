"""Figures of the section on chance: the hypervolume of every search, and attainment surfaces."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from bokeh.models import (
    ColumnDataSource,
    FixedTicker,
    PanTool,
    Range1d,
    ResetTool,
    SaveTool,
    WheelZoomTool,
)
from numpy.typing import NDArray

from studies.comparison.certainty import FamilySearches
from studies.drawing.palette import BLACK, Mark
from studies.report.figures import SMALL, plain_figure

FloatArray = NDArray[np.float64]

ROW = 34  # pixels of a family
MARKS = 6  # on a line, to tell it from others without its colour


@dataclass(frozen=True)
class Surfaces:
    """Staircases (k, 2) of one family that one, half and all of its searches reach."""

    best: FloatArray
    median: FloatArray
    worst: FloatArray


def order_figure(families: Sequence[FamilySearches], marks: Sequence[Mark]) -> Any:
    """One row a family, the first on top: a mark for each search, a bar at the median.

    Parameters
    ----------
    families : sequence of FamilySearches
    marks : sequence of Mark
        In the same order. The page's program writes the names of the families at the axis.
    """
    plot = plain_figure(
        70 + ROW * len(families),
        [],
        y_range=Range1d(start=len(families) - 0.4, end=-0.6),
        name="order-plot",
    )
    for row, (family, mark) in enumerate(zip(families, marks, strict=True)):
        plot.scatter(
            [family.median],
            [row],
            marker="dash",
            angle=0.5 * np.pi,
            size=26,
            line_width=3,
            line_color=BLACK,
        )
        plot.scatter(
            family.hypervolumes,
            np.full(len(family), row),
            marker=mark.marker,
            size=11,
            fill_color=mark.colour,
            line_color="#FFFFFF",
            fill_alpha=0.85,
        )
    plot.xaxis.axis_label = "hypervolume of one search"
    plot.yaxis.ticker = FixedTicker(ticks=list(range(len(families))))
    plot.yaxis.name = "order-axis"
    plot.yaxis.axis_line_color = plot.yaxis.major_tick_line_color = None
    return plot


def attainment_figure(place: int, families: Sequence[Surfaces], marks: Sequence[Mark]) -> Any:
    """Median lines over bands from the best to the worst surface.

    Parameters
    ----------
    place : int
        Which pair of objectives it shows; part of the names of its models.
    families : sequence of Surfaces
    marks : sequence of Mark
    """
    tools = [PanTool(), WheelZoomTool(), ResetTool(), SaveTool()]
    plot = plain_figure(360, tools, name=f"attainment-plot-{place}")
    plot.xaxis.name, plot.yaxis.name = f"attainment-x-{place}", f"attainment-y-{place}"
    for position, (family, mark) in enumerate(zip(families, marks, strict=True)):
        name = f"attained-{place}-{position}"
        band = np.concatenate([family.best, family.worst[::-1]])
        source = ColumnDataSource({"x": band[:, 0], "y": band[:, 1]})
        plot.patch(
            "x",
            "y",
            source=source,
            fill_color=mark.colour,
            fill_alpha=0.22,
            line_color=None,
            name=f"{name}-band",
        )
        x, y = family.median.T
        plot.line(x, y, line_color=mark.colour, line_width=2, name=f"{name}-line")
        # Corners of the staircase, evenly taken; its ends lie on the edge of the box.
        inner = np.arange(1, len(x) - 1, 2)
        evenly = np.unique(np.linspace(0, len(inner) - 1, MARKS).astype(int))
        chosen = inner[evenly] if len(inner) else inner
        plot.scatter(
            x[chosen],
            y[chosen],
            marker=mark.marker,
            size=9,
            fill_color=mark.colour,
            line_color="#FFFFFF",
            name=f"{name}-marks",
        )
    plot.xaxis.axis_label_text_font_size = plot.yaxis.axis_label_text_font_size = SMALL
    return plot
