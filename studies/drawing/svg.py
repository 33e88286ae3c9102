"""Small pieces of SVG text: numbers, paths of rings, escaped labels. Same input, same bytes."""

from __future__ import annotations

from collections.abc import Iterable
from html import escape

import numpy as np

from evaluators.machine.geometry.outlines import Loop, Outline

FONT = "system-ui, 'Segoe UI', 'Liberation Sans', Arial, sans-serif"


def number(value: float, digits: int = 3) -> str:
    """A coordinate with `digits` decimals, without trailing zeros or a negative zero."""
    text = f"{value:.{digits}f}".rstrip("0").rstrip(".")
    return "0" if text in ("-0", "") else text


def loop_path(loop: Loop) -> str:
    """Path data of one ring, as it lies (y upwards: draw it inside a mirrored group)."""
    vertices, bulges = loop.vertices, loop.bulges
    words = [f"M{number(vertices[0, 0])} {number(vertices[0, 1])}"]
    for index, bulge in enumerate(bulges):
        start, end = vertices[index], vertices[(index + 1) % len(vertices)]
        point = f"{number(end[0])} {number(end[1])}"
        if bulge == 0.0:
            words.append(f"L{point}")
            continue
        angle = 4.0 * np.arctan(abs(bulge))
        radius = number(float(np.hypot(*(end - start)) / 2.0 / np.sin(0.5 * angle)), 4)
        large = int(angle > np.pi)
        words.append(f"A{radius} {radius} 0 {large} {int(bulge > 0.0)} {point}")
    return "".join(words) + "Z"


def outline_path(outline: Outline) -> str:
    """Path data of a part with its holes; fill it by the even-odd rule."""
    return "".join(loop_path(loop) for loop in (outline.outer, *outline.holes))


def text(x: float, y: float, words: str, size: float, anchor: str = "start") -> str:
    """One line of text at `x`, `y` (y downwards), escaped."""
    aligned = "" if anchor == "start" else f' text-anchor="{anchor}"'
    return (
        f'<text x="{number(x)}" y="{number(y)}" font-size="{number(size)}"{aligned}>'
        f"{escape(words)}</text>"
    )


def line(x1: float, y1: float, x2: float, y2: float, extra: str = "") -> str:
    """A straight line."""
    return f'<line x1="{number(x1)}" y1="{number(y1)}" x2="{number(x2)}" y2="{number(y2)}"{extra}/>'


def picture(
    box: tuple[float, float, float, float], label: str, parts: Iterable[str], size: str = ""
) -> str:
    """A whole drawing: `box` is x, y, width, height; `label` is read out to who cannot see it."""
    frame = " ".join(number(item) for item in box)
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="{frame}"{size} role="img" '
        f'aria-label="{escape(label)}" font-family="{escape(FONT)}">' + "".join(parts) + "</svg>"
    )


def scale_bar_length(span: float) -> float:
    """The largest of 1, 2, 5, 10, ... that is no longer than a third of `span`."""
    decade = 10.0 ** np.floor(np.log10(span / 3.0))
    return float(max(step * decade for step in (1.0, 2.0, 5.0) if step * decade <= span / 3.0))
