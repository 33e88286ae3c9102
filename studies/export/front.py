"""The fronts of a study as files: CSV, Parquet and a spreadsheet."""

from __future__ import annotations

import io

import pyarrow as pa
import pyarrow.parquet as pq

from studies.export.files import ExportedFile, text_file
from studies.export.front_table import FrontTable
from studies.export.spreadsheet import front_workbook
from studies.stored.layout import Results
from studies.tables import csv_text

CSV = "front.csv"
PARQUET = "front.parquet"
SPREADSHEET = "front.xlsx"


def front_files(results: Results, front: FrontTable) -> list[ExportedFile]:
    """The table in three formats."""
    described = (
        f"{front.table.num_rows} designs that no other of their family beats in every objective; "
    )
    return [
        text_file(CSV, csv_text(front.names, front.rows()), described + "comma-separated"),
        ExportedFile(
            PARQUET, _parquet(front.table), described + "unit and description in each column"
        ),
        ExportedFile(
            SPREADSHEET,
            front_workbook(results, front),
            described + "units as comments on the head, filters, notes and limits on sheets",
        ),
    ]


def _parquet(table: pa.Table) -> bytes:
    stream = io.BytesIO()
    pq.write_table(table, stream, write_page_checksum=True)
    return stream.getvalue()
