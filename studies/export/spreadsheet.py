"""The fronts as a workbook: a filterable sheet, the limits, and the cautions."""

from __future__ import annotations

import io
import math
from typing import TYPE_CHECKING, Any

from studies.export.front_table import FrontTable, heading
from studies.inspection.design import CAUTIONS
from studies.stored.layout import Results, program_version

if TYPE_CHECKING:
    from xlsxwriter.workbook import Workbook
    from xlsxwriter.worksheet import Worksheet

FIXED_COLUMNS = 2  # design and family stay in view
WIDEST_COLUMN = 24  # characters
SAFE = {
    # Text stays text: nothing a study or a material is called can become a formula or a link.
    "strings_to_formulas": False,
    "strings_to_urls": False,
    "strings_to_numbers": False,
    "in_memory": True,
}


def front_workbook(results: Results, front: FrontTable) -> bytes:
    """Bytes of the workbook; the same table gives the same bytes."""
    import xlsxwriter

    stream = io.BytesIO()
    book = xlsxwriter.Workbook(stream, SAFE)
    times = [item for item in front.table["finished_at"].to_pylist() if item is not None]
    properties: dict[str, Any] = {"title": f"Fronts of study {results.study.name}"}
    if times:
        properties["created"] = max(times).replace(tzinfo=None)
    book.set_properties(properties)
    _front_sheet(book, results, front)
    _limit_sheet(book, results)
    _note_sheet(book, results, front)
    book.close()
    return stream.getvalue()


def _front_sheet(book: Workbook, results: Results, front: FrontTable) -> None:
    sheet = book.add_worksheet("front")
    bold = book.add_format({"bold": True, "text_wrap": True, "valign": "top"})
    currency = results.study.prices.currency
    rows = front.rows()
    for column, name in enumerate(front.names):
        sheet.write_string(0, column, name, bold)
        note = heading(front, name, currency)
        if note:
            sheet.write_comment(0, column, note, {"x_scale": 2.2, "author": "hovergap"})
        sheet.set_column(column, column, min(WIDEST_COLUMN, max(9, len(name) + 2)))
    for line, row in enumerate(rows, start=1):
        for column, value in enumerate(row):
            _write(sheet, line, column, value)
    sheet.freeze_panes(1, FIXED_COLUMNS)
    sheet.autofilter(0, 0, len(rows), len(front.names) - 1)


def _write(sheet: Worksheet, line: int, column: int, value: object) -> None:
    if isinstance(value, bool):
        sheet.write_boolean(line, column, value)
    elif isinstance(value, int | float):
        if math.isfinite(value):
            sheet.write_number(line, column, value)
    elif value is not None:
        sheet.write_string(line, column, str(value))


def _limit_sheet(book: Workbook, results: Results) -> None:
    sheet = book.add_worksheet("limits")
    bold = book.add_format({"bold": True})
    for column, name in enumerate(("metric", "side", "limit")):
        sheet.write_string(0, column, name, bold)
    for line, limit in enumerate(results.study.limits, start=1):
        sheet.write_string(line, 0, limit.metric)
        sheet.write_string(line, 1, limit.kind)
        sheet.write_number(line, 2, limit.value)
    sheet.set_column(0, 0, 30)
    sheet.freeze_panes(1, 0)


def _note_sheet(book: Workbook, results: Results, front: FrontTable) -> None:
    sheet = book.add_worksheet("notes")
    wrap = book.add_format({"text_wrap": True, "valign": "top"})
    study = results.study
    lines = [
        f"Study {study.name}: {study.description}",
        f"Written by hovergap {program_version()}.",
        "Objectives and margins: columns objective:... hold the minimised value, columns "
        "margin:... are met at 0 or below.",
        *(f"Damaged and missing: {part}" for part in front.damaged),
        *CAUTIONS,
    ]
    sheet.set_column(0, 0, 110)
    for line, text in enumerate(lines):
        sheet.write_string(line, 0, text, wrap)
