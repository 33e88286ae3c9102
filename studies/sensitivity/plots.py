"""Pictures of a sensitivity study: lines of objectives, lines of margins, global indices."""

from __future__ import annotations

import io
from math import ceil
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from studies.drawing.palette import FAMILY_COLOURS
from studies.sensitivity.indices import Indices
from studies.sensitivity.lines import Line
from studies.sensitivity.study import Sensitivity, watched_values

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

FloatArray = NDArray[np.float64]

COLUMNS = 4
STYLES = ("-", "--", ":", "-.")
OUTSIDE = "#E3E5E8"  # where a limit is broken
LARGEST_CHANGE = 100.0  # per cent shown; steeper lines leave the panel
LARGEST_MARGIN = 0.5
MOST_LIMITS = 6


def line_pictures(found: Sensitivity) -> dict[str, bytes]:
    """``objective_lines.svg`` and, if the study has limits, ``limit_lines.svg``."""
    study = found.chosen.results.study
    curves = []
    for line in found.lines:
        values = watched_values(study, line.outcome)
        curves.append(
            {
                name: 100.0 * (values[name] / values[name][line.at] - 1.0)
                for name in found.objectives
                if values[name][line.at]
            }
        )
    title = f"{found.chosen.design}: change of the objectives in per cent of the design's value"
    pictures = {
        "objective_lines.svg": _panels(found, curves, title, LARGEST_CHANGE, zero_is_limit=False)
    }
    if study.limits:
        nearest = _nearest_limits(found)
        margins = [{name: _margin(found, line, name) for name in nearest} for line in found.lines]
        title = (
            f"{found.chosen.design}: distance to the nearest limits over their size; above 0 a "
            "limit is broken"
        )
        pictures["limit_lines.svg"] = _panels(
            found, margins, title, LARGEST_MARGIN, zero_is_limit=True
        )
    return pictures


def _margin(found: Sensitivity, line: Line, name: str) -> FloatArray:
    column = found.chosen.problem.constraints.index(name)
    return np.where(line.outcome.ok, line.outcome.constraints[:, column], np.nan)


def _nearest_limits(found: Sensitivity) -> list[str]:
    """The limits that come nearest to being broken on any line, or are broken."""
    worst = {
        name: max(
            (
                float(np.nanmax(m))
                for line in found.lines
                if np.isfinite(m := _margin(found, line, name)).any()
            ),
            default=-np.inf,
        )
        for name in found.chosen.problem.constraints
    }
    return sorted(worst, key=lambda name: -worst[name])[:MOST_LIMITS]


def _panels(
    found: Sensitivity,
    curves: list[dict[str, FloatArray]],
    title: str,
    largest: float,
    zero_is_limit: bool,
) -> bytes:
    from matplotlib.figure import Figure
    from matplotlib.ticker import MaxNLocator

    rows = ceil((len(found.lines) + 1) / COLUMNS)
    height = 2.3 * rows + 0.4
    figure = Figure(figsize=(3.1 * COLUMNS, height))
    # Fixed margins in inches: solving for them would take longer than drawing.
    figure.subplots_adjust(
        left=0.045,
        right=0.99,
        bottom=0.5 / height,
        top=1.0 - 0.5 / height,
        hspace=0.42,
        wspace=0.15,
    )
    panels: list[Axes] = list(np.ravel(figure.subplots(rows, COLUMNS, sharey=True, squeeze=False)))
    reach = _reach(curves, largest)
    for panel, line, drawn in zip(panels, found.lines, curves, strict=False):
        _shade(panel, line)
        for k, (_, values) in enumerate(drawn.items()):
            panel.plot(line.values, values, **_style(k), marker=".", markersize=3)
        panel.axhline(0.0, color="#000000" if zero_is_limit else "#9AA0A8", linewidth=0.8)
        panel.axvline(float(line.values[line.at]), color="#9AA0A8", linewidth=0.8)
        panel.set_xlabel(f"{line.variable}{' (fixed)' if line.fixed else ''}", fontsize=8)
        panel.set_ylim(-reach, reach)
        panel.margins(x=0.0)
        panel.xaxis.set_major_locator(MaxNLocator(4))  # ticks are most of the drawing time
        panel.yaxis.set_major_locator(MaxNLocator(4))
        panel.tick_params(labelsize=7)
    _legend(panels[len(found.lines)], list(curves[0]))
    for panel in panels[len(found.lines) + 1 :]:
        panel.set_axis_off()
    figure.suptitle(title, fontsize=10, y=1.0 - 0.12 / height)
    return _svg(figure)


def _reach(curves: list[dict[str, FloatArray]], largest: float) -> float:
    values = np.concatenate([item for drawn in curves for item in drawn.values()])
    values = np.abs(values[np.isfinite(values)])
    return float(min(largest, 1.05 * values.max())) if values.size and values.max() else 1.0


def _style(number: int) -> dict[str, Any]:
    """Colour and stroke of the k-th curve: told apart without colour too."""
    return {
        "color": FAMILY_COLOURS[number % len(FAMILY_COLOURS)],
        "linestyle": STYLES[number % len(STYLES)],
        "linewidth": 1.4,
    }


def _shade(panel: Axes, line: Line) -> None:
    """Grey where a limit is broken or the design cannot be evaluated, cell by cell."""
    edges = np.concatenate(
        [line.values[:1], 0.5 * (line.values[1:] + line.values[:-1]), line.values[-1:]]
    )
    for low, high, good in zip(edges[:-1], edges[1:], line.outcome.feasible, strict=True):
        if not good:
            panel.axvspan(float(low), float(high), color=OUTSIDE, linewidth=0.0)


def _legend(panel: Axes, names: list[str]) -> None:
    from matplotlib.patches import Patch

    panel.set_axis_off()
    handles: list[Any] = [
        panel.plot([], [], **_style(k), label=name)[0] for k, name in enumerate(names)
    ]
    handles.append(Patch(color=OUTSIDE, label="a limit is broken, or no result"))
    panel.legend(handles=handles, loc="center left", fontsize=8, frameon=False)


def index_picture(indices: Indices) -> bytes:
    """The second index of every metric and variable as a table of shades with numbers."""
    from matplotlib.figure import Figure

    rows, columns = len(indices.variables), len(indices.metrics)
    width, height = 2.2 + 0.75 * columns, 2.3 + 0.34 * rows
    figure = Figure(figsize=(width, height))
    figure.subplots_adjust(
        left=2.0 / width, right=1.0 - 0.2 / width, bottom=1.9 / height, top=1.0 - 0.4 / height
    )
    panel = figure.subplots()
    shades = np.clip(indices.other.T, 0.0, 1.0)
    panel.imshow(shades, cmap="Greys", vmin=0.0, vmax=1.4, aspect="auto")
    for row in range(rows):
        for column in range(columns):
            value = indices.other[column, row]
            ink = "#FFFFFF" if shades[row, column] > 0.75 else "#000000"
            panel.text(column, row, f"{value:.2f}", ha="center", va="center", fontsize=8, color=ink)
    panel.set_xticks(range(columns), indices.metrics, rotation=40, ha="right", fontsize=8)
    panel.set_yticks(range(rows), indices.variables, fontsize=8)
    panel.set_title(f"{indices.other_name} index, {indices.method}", fontsize=10)
    return _svg(figure)


def _svg(figure: Figure) -> bytes:
    """SVG whose bytes depend on the drawing alone."""
    import matplotlib as mpl

    stream = io.BytesIO()
    with mpl.rc_context({"svg.hashsalt": "hovergap", "svg.fonttype": "none"}):
        figure.savefig(stream, format="svg", metadata={"Date": None, "Creator": "hovergap"})
    return stream.getvalue()
