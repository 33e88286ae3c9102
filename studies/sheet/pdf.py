"""The sheet as PDF, set by Typst with the fonts it brings along."""

from __future__ import annotations

import json
import re
from html import escape
from importlib import resources
from typing import Any

import typst

from studies.drawing.svg import FONT
from studies.errors import StorageError
from studies.sheet.blocks import Block, Cautions, Drawing, Grid, Heading, Sheet, Text

PAGE_WIDTH = 178.0  # mm, between the margins of sheet.typ
TALLEST = 105.0  # mm of a drawing
PRINT_FONT = "Libertinus Serif"


def sheet_pdf(sheet: Sheet) -> bytes:
    """The whole sheet; the same sheet gives the same bytes.

    Raises
    ------
    StorageError
        If Typst refuses it.
    """
    template = resources.files("studies.sheet").joinpath("sheet.typ").read_bytes()
    content = {
        "title": sheet.title,
        "subtitle": sheet.subtitle,
        "footer": sheet.footer,
        "blocks": [_block(block) for block in sheet.blocks],
    }
    try:
        made = typst.compile(
            template,
            format="pdf",
            sys_inputs={"sheet": json.dumps(content)},
            ignore_system_fonts=True,
        )
    except typst.TypstError as error:
        msg = f"the sheet cannot be set as PDF: {error}"
        raise StorageError(msg) from None
    return bytes(made)


def _block(block: Block) -> dict[str, Any]:
    match block:
        case Heading(text):
            return {"kind": "heading", "text": text}
        case Text(text):
            return {"kind": "text", "text": text}
        case Cautions(items):
            return {"kind": "cautions", "items": list(items)}
        case Drawing(svg, caption, width):
            return {
                "kind": "drawing",
                "svg": svg.replace(escape(FONT), PRINT_FONT),
                "caption": caption,
                "width": width,
                "height": min(TALLEST, width * PAGE_WIDTH * _shape(svg)),
            }
        case Grid():
            return {
                "kind": "grid",
                "head": list(block.head),
                "rows": [list(row) for row in block.rows],
                "left": [block.left(column) for column in range(len(block.head))],
                "weights": list(block.weights) or [1.0] * len(block.head),
            }


def _shape(svg: str) -> float:
    """Height over width of a drawing."""
    match = re.search(r'viewBox="\S+ \S+ (\S+) (\S+)"', svg)
    if match is None:
        msg = "a drawing has no viewBox"
        raise ValueError(msg)
    return float(match[2]) / float(match[1])
