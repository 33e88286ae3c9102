"""The Bokeh figures of the report, without data: the page's script fills their sources.

All figures share one document, so that the front's source can be selected in any of them.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from bokeh.models import (
    BoxSelectTool,
    CDSView,
    ColumnDataSource,
    DataRange1d,
    FixedTicker,
    HoverTool,
    IndexFilter,
    LassoSelectTool,
    LinearColorMapper,
    PanTool,
    Range1d,
    ResetTool,
    SaveTool,
    TapTool,
    Tool,
    WheelZoomTool,
)
from bokeh.models.annotations.legends import ColorBar
from bokeh.models.glyphs import MultiLine
from bokeh.palettes import Cividis256
from bokeh.plotting import figure
from bokeh.transform import factor_mark
from numpy.typing import NDArray

from studies.drawing.palette import BLACK, BLUE, ORANGE, SKY, VERMILION, Mark

FloatArray = NDArray[np.float64]

INK, MUTED, GRID = "#20242A", "#5A626D", "#E3E6EA"
GREYED = "#B9BFC8"
SMALL, LARGE = "12px", "14px"


@dataclass(frozen=True)
class Figures:
    """All figures by the name of their place in the page."""

    by_place: dict[str, Any]


def report_figures(marks: Sequence[Mark], rows: Sequence[str], families: Sequence[str]) -> Figures:
    """Figures of a report.

    Parameters
    ----------
    marks : sequence of Mark
        One for each family.
    rows : sequence of str
        Titles of the variables, for the distributions.
    families : sequence of str
        Factors that stand for the families, ``f0`` and so on: user text stays out of the figures.
    """
    # One design nobody sees, until the page's script fills in those there are.
    first = {"x": [0.0], "y": [0.0], "fill": [GREYED], "line": [GREYED], "family": [families[0]]}
    lines = {"design": [""], "says": [""], "xs": [[0.0, 1.0]], "ys": [[0.0, 1.0]]}
    front = ColumnDataSource({**first, **lines}, name="front")
    # The page decides which rows pass the tightened limits and which are greyed out.
    passing = CDSView(filter=IndexFilter(indices=[0], name="passing"))
    failing = CDSView(filter=IndexFilter(indices=[], name="failing"))
    return Figures(
        {
            "plot-front": _front(front, passing, failing, marks, families),
            "plot-axes": _axes(front, passing, failing),
            "plot-torque": _curves(
                "torque",
                ("rotor angle, degrees", "N m"),
                (("torque less its mean", BLUE, "solid"), ("cogging torque", ORANGE, "dashed")),
                (0.0, 360.0),
            ),
            "plot-force": _curves(
                "force",
                ("rotor angle, degrees", "N"),
                (("along the command", BLUE, "solid"), ("across", VERMILION, "dashed")),
                (0.0, 360.0),
            ),
            "plot-locus": _locus(),
            "plot-against": _curves(
                "against", ("suspension current, peak A", "N"), (("mean force", BLUE, "solid"),)
            ),
            "plot-error": _curves(
                "error",
                ("suspension current, peak A", "degrees; %"),
                (
                    ("error angle, degrees", VERMILION, "solid"),
                    ("error magnitude, %", BLUE, "dashed"),
                ),
            ),
            "plot-spread": _spread(rows, marks),
            "plot-progress": _progress(marks),
        }
    )


def plain_figure(height: int, tools: Sequence[Tool], **options: Any) -> Any:
    """A figure in the style of the page, without data."""
    plot = figure(
        height=height,
        sizing_mode="stretch_width",
        tools=list(tools),
        toolbar_location="right" if tools else None,
        background_fill_color=None,
        border_fill_color=None,
        outline_line_color=None,
        **options,
    )
    plot.toolbar.logo = None
    plot.toolbar.autohide = True
    for axis in plot.axis:
        axis.axis_label_text_font_style = "normal"
        axis.axis_label_text_font_size = LARGE
        axis.major_label_text_font_size = SMALL
        axis.axis_label_text_color = axis.major_label_text_color = INK
        axis.axis_line_color = axis.major_tick_line_color = MUTED
        axis.minor_tick_line_color = None
    plot.grid.grid_line_color = GRID
    return plot


def _front(
    front: ColumnDataSource,
    passing: CDSView,
    failing: CDSView,
    marks: Sequence[Mark],
    families: Sequence[str],
) -> Any:
    context = ColumnDataSource({"x": [], "y": []}, name="context")
    verified = ColumnDataSource(
        {name: [] for name in ("x", "y", "x0", "y0", "design")}, name="verified"
    )
    box, wheel = BoxSelectTool(), WheelZoomTool()
    plot = plain_figure(
        440,
        [PanTool(), wheel, TapTool(), box, LassoSelectTool(), ResetTool(), SaveTool()],
        x_range=DataRange1d(name="front-x"),
        y_range=DataRange1d(name="front-y"),
        name="front-plot",
    )
    plot.toolbar.active_drag = box
    plot.xaxis.name, plot.yaxis.name = "front-x-axis", "front-y-axis"
    # Thousands of points: a plain small circle in one colour is quick to draw.
    plot.scatter("x", "y", source=context, size=3, color="#C9CED6", line_color=None)
    marker = factor_mark("family", [mark.marker for mark in marks], list(families))
    grey = plot.scatter(
        "x",
        "y",
        source=front,
        view=failing,
        size=6,
        marker=marker,
        fill_color="#FFFFFF",
        line_color=GREYED,
        nonselection_alpha=0.6,
    )
    good = plot.scatter(
        "x",
        "y",
        source=front,
        view=passing,
        size=10,
        marker=marker,
        fill_color="fill",
        line_color="line",
        line_width=1.5,
        fill_alpha=0.95,
        selection_line_color=BLACK,
        selection_line_width=3,
        selection_fill_alpha=1.0,
        nonselection_fill_alpha=0.55,
        nonselection_line_alpha=0.55,
    )
    ring = ColumnDataSource({"x": [], "y": []}, name="ring")
    plot.scatter("x", "y", source=ring, size=20, fill_color=None, line_color=BLACK, line_width=2.5)
    plot.segment(
        "x0", "y0", "x", "y", source=verified, line_color=BLACK, line_width=1, line_dash="dotted"
    )
    checked = plot.scatter(
        "x", "y", source=verified, marker="x", size=12, line_width=2.5, line_color=BLACK
    )
    plot.x_range.renderers = [good, grey, checked]
    plot.y_range.renderers = [good, grey, checked]
    plot.add_tools(HoverTool(renderers=[good, grey], tooltips="@says", attachment="right"))
    plot.add_layout(
        ColorBar(
            color_mapper=LinearColorMapper(palette=Cividis256, low=0, high=1, name="colours"),
            name="colour-bar",
            width=12,
            title_text_font_style="normal",
            title_text_font_size=SMALL,
            major_label_text_font_size=SMALL,
            background_fill_color=None,
        ),
        "right",
    )
    return plot


def _axes(front: ColumnDataSource, passing: CDSView, failing: CDSView) -> Any:
    """Parallel coordinates: one line a design, its values scaled to 0..1 on every axis."""
    box = BoxSelectTool(dimensions="height", name="axis-box")
    plot = plain_figure(
        360,
        [TapTool(), box, ResetTool(), SaveTool()],
        x_range=Range1d(start=-0.4, end=10.4, name="axes-x"),
        y_range=Range1d(start=-0.06, end=1.06),
        name="axes-plot",
    )
    box.dimensions = "both"
    plot.toolbar.active_drag = box
    common: dict[str, Any] = {"xs": "xs", "ys": "ys"}
    grey = MultiLine(**common, line_color="#D5D9DF", line_alpha=0.7, line_width=0.7)
    plot.add_glyph(front, grey, view=failing, nonselection_glyph=grey)
    plot.add_glyph(
        front,
        MultiLine(**common, line_color="line", line_alpha=0.55, line_width=1.1),
        view=passing,
        selection_glyph=MultiLine(**common, line_color="line", line_alpha=1.0, line_width=3.5),
        nonselection_glyph=MultiLine(**common, line_color="line", line_alpha=0.16, line_width=1.0),
    )
    plot.yaxis.visible = False
    plot.ygrid.visible = False
    plot.xaxis.ticker = FixedTicker(ticks=[], name="axes-ticks")
    plot.xaxis.name = "axes-axis"
    plot.xaxis.major_label_orientation = 0.6
    plot.xaxis.axis_line_color = None
    plot.xgrid.grid_line_color = MUTED
    ends = ColumnDataSource({"x": [], "y": [], "text": []}, name="axes-ends")
    plot.text(
        "x",
        "y",
        text="text",
        source=ends,
        text_font_size=SMALL,
        text_align="center",
        text_baseline="middle",
        text_color=INK,
        background_fill_color="#FFFFFF",
        background_fill_alpha=0.85,
    )
    plot.y_range.start, plot.y_range.end = -0.1, 1.1
    return plot


def _curves(
    name: str,
    labels: tuple[str, str],
    lines: Sequence[tuple[str, str, str]],
    span: tuple[float, float] | None = None,
) -> Any:
    """A small figure of one or two curves over one axis."""
    columns = ["x", *(f"y{i}" for i in range(len(lines)))]
    # Two points until a card is shown: ranges cannot follow nothing.
    source = ColumnDataSource({column: [0.0, 1.0] for column in columns}, name=f"curve-{name}")
    options: dict[str, Any] = {"x_range": Range1d(start=span[0], end=span[1])} if span else {}
    plot = plain_figure(210, [HoverTool(tooltips=[("", "@x{0.[0]}, $y{0.[000]}")])], **options)
    plot.toolbar_location = None
    plot.xaxis.axis_label, plot.yaxis.axis_label = labels
    for index, (legend, colour, dash) in enumerate(lines):
        plot.line(
            "x",
            f"y{index}",
            source=source,
            color=colour,
            line_dash=dash,
            line_width=2,
            legend_label=legend,
        )
    if span:
        plot.xaxis.ticker = FixedTicker(ticks=list(range(0, 361, 60)))
    else:
        plot.y_range.start = 0.0
        plot.x_range.start = 0.0
    _legend_above(plot)
    return plot


def _legend_above(plot: Any) -> None:
    legend = plot.legend[0]
    legend.orientation = "horizontal"
    legend.label_text_font_size = SMALL
    legend.border_line_color = None
    legend.background_fill_color = None
    legend.padding = legend.margin = 2
    plot.add_layout(legend, "above")


def _locus() -> Any:
    sources = {
        direction: ColumnDataSource(
            {"x": [-1.0, 1.0], "y": [-1.0, 1.0]}, name=f"curve-locus-{direction}"
        )
        for direction in "xy"
    }
    plot = plain_figure(250, [], match_aspect=True)
    plot.xaxis.axis_label = "along the command, % of the mean force"
    plot.yaxis.axis_label = "across, %"
    for direction, colour, dash in (("x", BLUE, "solid"), ("y", SKY, "solid")):
        plot.line(
            "x",
            "y",
            source=sources[direction],
            color=colour,
            line_dash=dash,
            line_width=2,
            legend_label=f"commanded along {direction}",
        )
    plot.scatter([0.0], [0.0], marker="cross", size=14, color=BLACK, legend_label="mean")
    _legend_above(plot)
    return plot


def _spread(rows: Sequence[str], marks: Sequence[Mark]) -> Any:
    """Where the designs of each front lie between the bounds of every variable."""
    source = ColumnDataSource({"x": [], "y": [], "line": []}, name="spread")
    plot = plain_figure(
        60 + len(rows) * max(34, 9 * len(marks)),
        [],
        x_range=Range1d(start=-0.02, end=1.02),
        y_range=Range1d(start=len(rows) - 0.4, end=-0.6),
        name="spread-plot",
    )
    plot.scatter(
        "x", "y", source=source, marker="dash", angle=1.5708, size=9, line_color="line", alpha=0.6
    )
    plot.xaxis.ticker = FixedTicker(ticks=[0.0, 0.25, 0.5, 0.75, 1.0])
    plot.xaxis.major_label_overrides = {0: "lower bound", 0.5: "half-way", 1: "upper bound"}
    plot.yaxis.ticker = FixedTicker(ticks=list(range(len(rows))))
    plot.yaxis.major_label_overrides = dict(enumerate(rows))
    plot.yaxis.axis_line_color = plot.yaxis.major_tick_line_color = None
    plot.ygrid.grid_line_color = None
    return plot


def _progress(marks: Sequence[Mark]) -> Any:
    plot = plain_figure(300, [], name="progress-plot")
    plot.xaxis.axis_label = "evaluations"
    plot.yaxis.axis_label = "hypervolume, share of the common box"
    plot.yaxis.axis_label_text_font_size = SMALL
    plot.y_range.start = 0.0
    for index, mark in enumerate(marks):
        source = ColumnDataSource({"x": [], "y": []}, name=f"progress-{index}")
        ends = ColumnDataSource({"x": [], "y": []}, name=f"progress-end-{index}")
        plot.step("x", "y", source=source, mode="after", color=mark.colour, line_width=2)
        plot.scatter("x", "y", source=ends, marker=mark.marker, size=10, color=mark.colour)
    return plot


def fill_spread(figures: Figures, scaled: Sequence[FloatArray], marks: Sequence[Mark]) -> None:
    """Put the variables of every front into their rows.

    Parameters
    ----------
    figures : Figures
    scaled : sequence of array (n, variables)
        One for each family, 0 at the lower and 1 at the upper bound, NaN where fixed.
    """
    across, down, colours = [], [], []
    share = 0.8 / len(scaled)
    for position, values in enumerate(scaled):
        rows, columns = np.nonzero(np.isfinite(values))
        across.append(values[rows, columns])
        down.append(columns + (position - 0.5 * (len(scaled) - 1)) * share)
        colours += [marks[position].colour] * len(rows)
    source = figures.by_place["plot-spread"].select_one({"name": "spread"})
    source.data = {"x": np.concatenate(across), "y": np.concatenate(down), "line": colours}


def fill_progress(figures: Figures, curves: Sequence[Sequence[FloatArray]]) -> None:
    """Put the curves (points, 2) of evaluations and hypervolume into the figure of progress.

    One curve a search; those of a family share a source, with a gap between them.
    """
    plot = figures.by_place["plot-progress"]
    gap = np.full((1, 2), np.nan)
    for position, family in enumerate(curves):
        drawn = [curve for curve in family if len(curve)]
        if drawn:
            joined = np.concatenate([part for curve in drawn for part in (gap, curve)][1:])
            line = plot.select_one({"name": f"progress-{position}"})
            line.data = {"x": joined[:, 0], "y": joined[:, 1]}
            ends = np.array([curve[-1] for curve in drawn])
            end = plot.select_one({"name": f"progress-end-{position}"})
            end.data = {"x": ends[:, 0], "y": ends[:, 1]}
