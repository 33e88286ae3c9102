"""The sheet as one HTML file, made to be printed."""

from __future__ import annotations

from html import escape
from importlib import resources

from studies.report.html import bullets, element
from studies.sheet.blocks import Block, Cautions, Drawing, Grid, Heading, Sheet, Text


def sheet_html(sheet: Sheet) -> str:
    """The whole page; it needs no other file and no network."""
    style = resources.files("studies.sheet").joinpath("sheet.css").read_text(encoding="utf-8")
    title = escape(sheet.title)
    return (
        '<!DOCTYPE html>\n<html lang="en"><head><meta charset="utf-8">'
        '<meta name="viewport" content="width=device-width, initial-scale=1">'
        '<meta http-equiv="Content-Security-Policy" content="default-src \'none\'; '
        "style-src 'unsafe-inline'; img-src data:\">"
        f'<link rel="icon" href="data:,"><title>{title}</title><style>{style}</style></head>'
        f"<body><header><h1>{title}</h1><p>{escape(sheet.subtitle)}</p></header><main>"
        + "\n".join(_block(block) for block in sheet.blocks)
        + f"</main><footer>{escape(sheet.footer)}</footer></body></html>\n"
    )


def _block(block: Block) -> str:
    match block:
        case Heading(text):
            return element("h2", escape(text))
        case Text(text):
            return element("p", escape(text))
        case Cautions(items):
            return bullets(items, "cautions")
        case Drawing(svg, caption, width):
            picture = element("div", svg, style=f"width:{100.0 * width:.0f}%")
            return element("figure", picture + element("figcaption", escape(caption)))
        case Grid():
            return _table(block)


def _table(grid: Grid) -> str:
    def cells(row: tuple[str, ...], tag: str) -> str:
        kinds = [' class="words"' if grid.left(column) else "" for column in range(len(row))]
        return "".join(
            f"<{tag}{kind}>{escape(text)}</{tag}>" for kind, text in zip(kinds, row, strict=True)
        )

    total = sum(grid.weights)
    columns = "".join(f'<col style="width:{100.0 * w / total:.1f}%">' for w in grid.weights)
    head = f"<thead><tr>{cells(grid.head, 'th')}</tr></thead>" if any(grid.head) else ""
    body = "".join(f"<tr>{cells(row, 'td')}</tr>" for row in grid.rows)
    return f"<table><colgroup>{columns}</colgroup>{head}<tbody>{body}</tbody></table>"
