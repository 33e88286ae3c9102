"""Plain-text tables that stay readable in a terminal, a pipe and a log file; safe CSV."""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Iterable, Sequence
from textwrap import wrap

GAP = "  "
WIDEST = 110  # characters of a table before it is broken
LEAST_WORDS = 16  # characters of a column of words
# A spreadsheet runs a cell that starts with one of these as a formula (OWASP, "CSV Injection").
FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r")


def text_table(head: Sequence[str], rows: Iterable[Sequence[str]], left: int = 1) -> str:
    """Align `rows` under `head`; the first `left` columns to the left, the others to the right."""
    body = [list(map(str, row)) for row in rows]
    widths = [max(len(line[column]) for line in [list(head), *body]) for column in range(len(head))]

    def line(cells: Sequence[str]) -> str:
        padded = [
            cell.ljust(width) if column < left else cell.rjust(width)
            for column, (cell, width) in enumerate(zip(cells, widths, strict=True))
        ]
        return GAP.join(padded).rstrip()

    rule = GAP.join("-" * width for width in widths)
    return "\n".join([line(head), rule, *(line(row) for row in body)])


def wide_table(
    head: Sequence[str], rows: Iterable[Sequence[str]], left: int = 1, width: int = WIDEST
) -> str:
    """As `text_table`, broken into several below each other that repeat the left columns."""
    body = [list(row) for row in rows]
    blocks: list[list[int]] = [[]]
    for column in range(left, len(head)):
        trial = [*range(left), *blocks[-1], column]
        cells = [[line[item] for item in trial] for line in [list(head), *body]]
        if blocks[-1] and len(text_table(cells[0], cells[1:]).split("\n")[1]) > width:
            blocks.append([])
        blocks[-1].append(column)
    tables = []
    for block in blocks:
        chosen = [*range(left), *block]
        cells = [[line[item] for item in chosen] for line in [list(head), *body]]
        tables.append(text_table(cells[0], cells[1:], left))
    return "\n\n".join(tables)


def prose_table(
    head: Sequence[str], rows: Iterable[Sequence[str]], left: int = 1, width: int = WIDEST
) -> str:
    """As `text_table`, the last column in words: set to the left, broken into lines that fit."""
    body = [list(row) for row in rows]
    narrow = text_table(head[:-1], [row[:-1] for row in body], left).split("\n")
    room = max(width - len(narrow[1]) - len(GAP), LEAST_WORDS)
    cells = [wrap(row[-1], room, break_on_hyphens=False) or [""] for row in body]
    longest = max([len(head[-1]), *(len(line) for lines in cells for line in lines)])
    indent = " " * len(narrow[1])
    told = [f"{narrow[0].ljust(len(indent))}{GAP}{head[-1]}", f"{narrow[1]}{GAP}{'-' * longest}"]
    for start, lines in zip(narrow[2:], cells, strict=True):
        told.append(f"{start.ljust(len(indent))}{GAP}{lines[0]}")
        told += [f"{indent}{GAP}{line}" for line in lines[1:]]
    return "\n".join(line.rstrip() for line in told)


def number(value: float, digits: int = 4) -> str:
    """`value` with `digits` significant digits, without exponent in the usual range.

    A whole number, such as one of turns, stays one.
    """
    if not math.isfinite(value):
        return "-" if math.isnan(value) else str(value)
    if value == 0.0:
        return "0"
    size = math.floor(math.log10(abs(value)))
    if not -4 <= size < 9:
        return f"{value:.{digits - 1}e}"
    if float(value).is_integer():
        return f"{value:.0f}"
    return f"{value:.{max(0, digits - 1 - size)}f}"


def percent(share: float) -> str:
    """A share as per cent with one decimal; what rounds to nothing has no sign."""
    text = f"{100.0 * share:.1f} %"
    return "-" if math.isnan(share) else text.removeprefix("-") if text == "-0.0 %" else text


def csv_text(head: Sequence[str], rows: Iterable[Sequence[object]]) -> str:
    """Comma-separated values; text that a spreadsheet would run is made plain text."""
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerow([_cell(item) for item in head])
    writer.writerows([_cell(item) for item in row] for row in rows)
    return stream.getvalue()


def _cell(value: object) -> object:
    if isinstance(value, str) and value.startswith(FORMULA_STARTS):
        return f"'{value}"
    if isinstance(value, float) and not math.isfinite(value):
        return ""
    return value
