"""Flux lines over the flux density of one design, drawn with matplotlib."""

from __future__ import annotations

import io
import math
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.picture.patches import Patch
from evaluators.finite_element.picture.picture import FieldPicture
from evaluators.machine.geometry.outlines import MILLI, Loop, Outline, outlines
from evaluators.machine.winding.winding import Winding

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.colors import Colormap
    from matplotlib.tri import Triangulation

FloatArray = NDArray[np.float64]

LINES = 26
"""Flux lines from the smallest to the largest potential."""
LARGEST_DENSITY = 2.0  # T, at most, at the end of the colours; above it steel is far in saturation
SHARE_SHOWN = 0.995  # of the machine's area lies within the colours if that limit allows
SIZE_INCHES = (8.6, 7.4)
DOTS_PER_INCH = 160
ROTATING = ("magnet", "sleeve", "core", "shaft")
EDGE, LINE = "#1B1E23", "#14171B"
FORMATS = ("png", "svg")
OKLAB_TO_CONES = np.array(
    [
        [1.0, 0.3963377774, 0.2158037573],
        [1.0, -0.1055613458, -0.0638541728],
        [1.0, -0.0894841775, -1.2914855480],
    ]
)
CONES_TO_RGB = np.array(
    [
        [4.0767416621, -3.3077115913, 0.2309699292],
        [-1.2684380046, 2.6097574011, -0.3413193965],
        [-0.0041960863, -0.7034186147, 1.7076147010],
    ]
)


def field_image(picture: FieldPicture, winding: Winding, title: str, note: str, kind: str) -> bytes:
    """Draw a field as PNG or SVG.

    Parameters
    ----------
    picture : FieldPicture
    winding : Winding
    title, note : str
        Above and below the drawing.
    kind : str
        One of `FORMATS`.
    """
    import matplotlib as mpl
    from matplotlib.figure import Figure

    figure = Figure(figsize=SIZE_INCHES, layout="constrained")
    axes: Axes = figure.subplots()
    shades = _shade(axes, picture)
    step = _flux_lines(axes, picture)
    for part in outlines(picture.sections, 0, winding):
        _outline(axes, part, picture.angle)
    _poles(axes, picture)
    outer = 1.02 * float(picture.sections.outer_radius[0]) / MILLI
    axes.set(xlim=(-outer, outer), ylim=(-outer, outer), aspect="equal")
    axes.set_xlabel(f"x, mm\n{note}\nBetween two lines flow {_flux(step)} per metre of stack.")
    axes.set_ylabel("y, mm")
    axes.set_title(title, fontsize=11)
    bar = figure.colorbar(shades, ax=axes, extend="max", shrink=0.88, pad=0.02)
    bar.set_label("flux density |B|, T")
    stream = io.BytesIO()
    with mpl.rc_context({"svg.hashsalt": "hovergap", "svg.fonttype": "none"}):
        metadata: dict[str, Any] = {"Date": None, "Creator": "hovergap"} if kind == "svg" else {}
        figure.savefig(stream, format=kind, dpi=DOTS_PER_INCH, metadata=metadata)
    return stream.getvalue()


def colours() -> Colormap:
    """From white for no field through blue to violet, evenly darker all the way.

    Straight in lightness of Oklab (B. Ottosson, "A perceptual color space for image processing",
    2020; matrices from memory), so equal steps of |B| look equal, without colour too; it ends
    where dark flux lines are still visible.
    """
    from matplotlib.colors import ListedColormap

    share = np.linspace(0.0, 1.0, 256)
    lightness = 1.0 - 0.56 * share
    chroma = 0.15 * np.sin(0.5 * np.pi * share) ** 0.8
    hue = np.radians(215.0 + 75.0 * share)
    a, b = chroma * np.cos(hue), chroma * np.sin(hue)
    cones = (np.stack([lightness, a, b], axis=-1) @ OKLAB_TO_CONES.T) ** 3
    linear = np.clip(cones @ CONES_TO_RGB.T, 0.0, 1.0)
    # IEC 61966-2-1: the curve of sRGB.
    curved = np.where(linear <= 0.0031308, 12.92 * linear, 1.055 * linear ** (1 / 2.4) - 0.055)
    return ListedColormap(curved, name="field")


def _mesh(patch: Patch) -> Triangulation:
    from matplotlib.tri import Triangulation

    return Triangulation(patch.x / MILLI, patch.y / MILLI, patch.triangles)


def _shade(axes: Axes, picture: FieldPicture) -> Any:
    """|B| over every part; returns what the colour bar belongs to."""
    top = _largest(picture)
    found = None
    for patch in picture.patches:
        found = axes.tripcolor(
            _mesh(patch),
            patch.magnitude,
            shading="gouraud",
            cmap=colours(),
            vmin=0.0,
            vmax=top,
            rasterized=True,
        )
    return found


def _largest(picture: FieldPicture) -> float:
    """End of the colour scale, T: a round number."""
    values, areas = [], []
    for patch in picture.patches:
        corner = patch.triangles
        x, y = patch.x[corner], patch.y[corner]
        area = (x[:, 1] - x[:, 0]) * (y[:, 2] - y[:, 0]) - (x[:, 2] - x[:, 0]) * (y[:, 1] - y[:, 0])
        values.append(patch.magnitude[corner].mean(axis=1))
        areas.append(0.5 * np.abs(area))
    value, area = np.concatenate(values), np.concatenate(areas)
    order = np.argsort(value)
    reached = np.cumsum(area[order]) / area.sum()
    top = float(value[order][np.searchsorted(reached, SHARE_SHOWN)])
    return min(LARGEST_DENSITY, math.ceil(5.0 * top) / 5.0)


def _flux_lines(axes: Axes, picture: FieldPicture) -> float:
    """Lines of equal potential at equal steps; returns the step, Wb/m."""
    low = min(float(patch.potential.min()) for patch in picture.patches)
    high = max(float(patch.potential.max()) for patch in picture.patches)
    step = (high - low) / (LINES + 1)
    levels = low + step * np.arange(1, LINES + 1)
    for patch in picture.patches:
        if np.ptp(patch.potential) > 0.0:
            axes.tricontour(
                _mesh(patch),
                patch.potential,
                levels=levels,
                colors=LINE,
                linewidths=0.55,
                linestyles="solid",
            )
    return step


def _flux(step: float) -> str:
    return f"{step / MILLI:.3g} mWb" if step >= MILLI else f"{step * 1e6:.3g} µWb"


def _outline(axes: Axes, part: Outline, angle: float) -> None:
    style: dict[str, Any] = {"color": EDGE, "linewidth": 1.1}
    if part.part == "winding":  # not to be taken for a flux line
        style = {"color": "#B4652A", "linewidth": 0.9, "linestyle": (0, (1.5, 2.5)), "zorder": 1.5}
    turn = np.exp(1j * angle) if part.part in ROTATING else 1.0
    for loop in (part.outer, *part.holes):
        points = loop_points(loop) * turn
        axes.plot(points.real, points.imag, **style)


def loop_points(loop: Loop, step: float = math.radians(2.0)) -> NDArray[np.complex128]:
    """Corners x + j y, mm, of a closed polygon along a ring, its arcs in steps of `step` rad."""
    start = loop.vertices @ np.array([1.0, 1j])
    end = np.roll(start, -1)
    points: list[NDArray[np.complex128]] = []
    for a, b, bulge in zip(start, end, loop.bulges, strict=True):
        if bulge == 0.0:
            points.append(np.array([a]))
            continue
        included = 4.0 * math.atan(bulge)
        # Centre: from the middle of the chord, at its left for a counter-clockwise arc below pi.
        centre = 0.5 * (a + b) + 0.5j * (b - a) / math.tan(0.5 * included)
        count = max(1, math.ceil(abs(included) / step))
        points.append(centre + (a - centre) * np.exp(1j * included * np.arange(count) / count))
    return np.concatenate([*points, start[:1]])


def _poles(axes: Axes, picture: FieldPicture) -> None:
    """N and S on the magnets, by the pole that faces the gap."""
    sections = picture.sections
    poles = sections.family.poles
    radius = 0.5 * float(sections.core_radius[0] + sections.magnet_radius[0]) / MILLI
    for pole in range(poles):
        place = radius * np.exp(1j * (picture.angle + 2.0 * np.pi * pole / poles))
        axes.text(
            place.real,
            place.imag,
            "NS"[pole % 2],
            ha="center",
            va="center",
            fontsize=9,
            color=EDGE,
            bbox={"boxstyle": "circle,pad=0.15", "facecolor": "#FFFFFF", "linewidth": 0.0},
        )
