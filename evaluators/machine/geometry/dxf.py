"""The cross-section as a DXF drawing: a layer for each part, closed outlines, a scale check."""

from __future__ import annotations

import io
from typing import TYPE_CHECKING, Any

from evaluators.machine.geometry.outlines import Loop, Outline

if TYPE_CHECKING:
    from ezdxf.document import Drawing

VERSION = "R2010"
METRIC = 1  # $MEASUREMENT: metric hatch patterns and line types
LAYER_COLOURS = {
    "stator": 8,
    "slot": 9,
    "winding": 30,
    "magnet": 5,
    "sleeve": 92,
    "core": 252,
    "shaft": 7,
    "scale": 1,
    "notes": 1,
}
"""Layer of each part and its colour index; scale check and notes have layers of their own."""
TEXT_SHARE = 0.035  # text height over the outer radius
NOTE = "Calculated, not released for manufacture."


def dxf_bytes(
    parts: tuple[Outline, ...],
    title: str,
    facts: dict[str, str],
    hint: str = "",
    cautions: tuple[str, ...] = (),
) -> bytes:
    """Drawing in millimetres, rotor at angle 0, origin on the shaft axis.

    Every outline is a closed polyline with bulges; a part with a hole has a second closed polyline
    for it on the same layer. The dimension on the layer ``scale`` measures the stator's outside.

    Parameters
    ----------
    parts : tuple of Outline
    title : str
    facts : mapping of str to str
        Custom properties of the file.
    hint : str
        Added to the note that this is no released drawing.
    cautions : tuple of str
        Lines of their own below it.
    """
    from ezdxf import units
    from ezdxf.enums import TextEntityAlignment
    from ezdxf.filemanagement import new

    doc = new(VERSION, setup=True)
    doc.units = units.MM
    doc.header["$MEASUREMENT"] = METRIC
    doc.header["$LUNITS"] = 2  # decimal
    for name, value in facts.items():
        doc.header.custom_vars.append(name, value)
    for layer, colour in LAYER_COLOURS.items():
        doc.layers.add(layer, color=colour)
    space = doc.modelspace()
    for part in parts:
        for loop in (part.outer, *part.holes):
            space.add_lwpolyline(
                _points(loop), format="xyb", close=True, dxfattribs={"layer": part.part}
            )
    radius = max(abs(x) for part in parts for x in part.outer.vertices[:, 0].tolist())
    height = TEXT_SHARE * radius
    _scale_check(doc, radius, height)
    lines = (title, f"{NOTE} {hint}".rstrip(), *cautions)
    for above, text in enumerate(reversed(lines)):
        space.add_text(text, height=height, dxfattribs={"layer": "notes"}).set_placement(
            (0.0, radius * 1.1 + 1.6 * above * height), align=TextEntityAlignment.MIDDLE_CENTER
        )
    stream = io.StringIO()
    doc.write(stream)
    return stream.getvalue().encode(doc.output_encoding)


def _scale_check(doc: Drawing, radius: float, height: float) -> None:
    """A dimension across the stator: whoever imports the drawing sees at once if it is to scale."""
    style = {
        "dimtxt": height,
        "dimasz": height,
        "dimexe": 0.4 * height,
        "dimexo": 0.4 * height,
        "dimgap": 0.5 * height,
    }
    doc.modelspace().add_linear_dim(
        base=(0.0, -1.15 * radius),
        p1=(-radius, 0.0),
        p2=(radius, 0.0),
        dimstyle="EZDXF",
        override={**style, "dimdec": 3, "dimtad": 1, "dimscale": 1.0, "dimlfac": 1.0},
        dxfattribs={"layer": "scale"},
        text="<> mm outside, scale check",
    ).render()


def _points(loop: Loop) -> list[tuple[Any, ...]]:
    return [
        (x, y, bulge)
        for (x, y), bulge in zip(loop.vertices.tolist(), loop.bulges.tolist(), strict=True)
    ]
