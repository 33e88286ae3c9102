"""Small pieces of HTML text; everything that comes from outside is escaped."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from html import escape

from studies.drawing.palette import Mark


def element(name: str, content: str, **attributes: str) -> str:
    """An element around `content`, which is HTML already; a trailing ``_`` of a name is dropped."""
    words = "".join(
        f' {key.rstrip("_").replace("_", "-")}="{escape(value)}"'
        for key, value in attributes.items()
    )
    return f"<{name}{words}>{content}</{name}>"


def paragraph(text: str, kind: str = "") -> str:
    """A paragraph of plain text."""
    return element("p", escape(text), **({"class_": kind} if kind else {}))


@dataclass(frozen=True)
class Cell:
    """A cell that holds HTML, or one shaded by a share between 0 and 1."""

    inner: str
    shade: float | None = None

    def html(self, heading: bool) -> str:
        """The cell as HTML."""
        if heading:
            return f'<th scope="row" class="words">{self.inner}</th>'
        if self.shade is not None:
            return f'<td class="shade" style="--share:{self.shade:.3f}">{self.inner}</td>'
        return f"<td>{self.inner}</td>"


Row = Sequence[str | Cell]


def table(
    head: Sequence[str],
    rows: Iterable[Row],
    caption: str = "",
    words: int = 1,
    full: bool = False,
) -> str:
    """A table of plain texts; the first cell of a row is its heading.

    Parameters
    ----------
    head, rows
        Plain text, escaped here. A row's cell may be a `Cell`.
    caption : str
    words : int
        How many columns from the left hold words, which are set to the left.
    full : bool
        Whether the table is as wide as its place.
    """

    def kind(column: int) -> str:
        return ' class="words"' if column < words else ""

    tops = "".join(
        f'<th scope="col"{kind(column)}>{escape(text)}</th>' for column, text in enumerate(head)
    )
    lines = []
    for row in rows:
        cells = []
        for column, text in enumerate(row):
            if isinstance(text, Cell):
                cells.append(text.html(column == 0))
            elif column == 0:
                cells.append(f'<th scope="row" class="words">{escape(text)}</th>')
            else:
                cells.append(f"<td{kind(column)}>{escape(text)}</td>")
        lines.append(f"<tr>{''.join(cells)}</tr>")
    said = f'<caption class="quiet">{escape(caption)}</caption>' if caption else ""
    size = ' class="full"' if full else ""
    return (
        '<div class="wide" tabindex="0" role="group" aria-label="Table, scrolls sideways">'
        f"<table{size}>{said}<thead><tr>{tops}</tr></thead><tbody>{''.join(lines)}</tbody></table>"
        "</div>"
    )


def swatch(mark: Mark, label: str) -> str:
    """The marker of a family."""
    return (
        f'<svg class="swatch" viewBox="-7 -7 14 14" role="img" aria-label="{escape(label)}">'
        f'<path d="{mark.path}" fill="{mark.colour}"/></svg>'
    )


def family_cell(mark: Mark, label: str) -> Cell:
    """Heading cell with the marker of a family and its name."""
    return Cell(f"{swatch(mark, 'marker of')} {escape(label)}")


def design_cell(design: str) -> Cell:
    """Cell with a design that shows its card."""
    if design == "-":
        return Cell(escape(design))
    said = escape(design)
    return Cell(f'<button type="button" class="design" data-design="{said}">{said}</button>')


def facts(pairs: Iterable[tuple[str, str]]) -> str:
    """A short list of terms with their values, plain text."""
    items = "".join(
        f"<div><dt>{escape(term)}</dt><dd>{escape(value)}</dd></div>" for term, value in pairs
    )
    return f'<dl class="facts-row">{items}</dl>'


def bullets(items: Iterable[str], kind: str = "") -> str:
    """A list of plain texts."""
    inner = "".join(f"<li>{escape(item)}</li>" for item in items)
    return element("ul", inner, **({"class_": kind} if kind else {}))
