"""Fronts as CSV, Parquet and spreadsheet."""

from __future__ import annotations

import csv
import io
from collections.abc import Callable
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from click.testing import Result

from studies.export.front_table import FrontTable, front_table
from studies.export.spreadsheet import front_workbook
from studies.stored.layout import open_results
from studies.tables import csv_text

Run = Callable[..., Result]
Write = Callable[..., Path]

FORMULAS = ("=1+1", "+1", "-1+2", "@SUM(A1)", '=HYPERLINK("http://x")', "\t=1", "<b>bold</b>")


@pytest.fixture
def swept(hovergap: Run, write_study: Write) -> Path:
    write_study(('"an invented blower"', "'=cmd|\"/c calc\"!A1'"))
    done = hovergap("sweep", "small.toml", "--budget", "150", "--workers", "1")
    assert done.exit_code == 0, done.output
    return Path("results/small")


def test_the_three_formats_hold_the_same_rows(hovergap: Run, swept: Path) -> None:
    openpyxl = pytest.importorskip("openpyxl")
    assert hovergap("export", swept, "--output", "out").exit_code == 0
    results = open_results(swept)
    front = front_table(results)
    expected = [
        name
        for family in results.study.families
        for name in _front_of(swept, family)["design"].to_pylist()
    ]
    assert front.table["design"].to_pylist() == expected
    with Path("out/front.csv").open(newline="") as stream:
        rows = list(csv.DictReader(stream))
    table = pq.read_table("out/front.parquet", page_checksum_verification=True)
    book = openpyxl.load_workbook("out/front.xlsx")
    sheet = book["front"]
    head = [cell.value for cell in sheet[1]]
    assert head == front.names == table.schema.names == list(rows[0])
    assert sheet.max_row - 1 == table.num_rows == len(rows) == len(expected)
    cost = head.index("cost")
    values = table["cost"].to_pylist()
    assert [float(row["cost"]) for row in rows] == values
    assert [row[cost].value for row in sheet.iter_rows(min_row=2)] == pytest.approx(values)
    field = table.schema.field("rotor_radius_mm")
    assert field.metadata[b"unit"] == b"mm"
    assert b"outer radius of the rotor" in field.metadata[b"description"]


def _front_of(folder: Path, family: str) -> pa.Table:
    from studies.stored.families import stored_family

    stored = stored_family(open_results(folder), family)
    return stored.front.append_column("design", pa.array(stored.front_ids))


def test_the_spreadsheet_reads_like_one(hovergap: Run, swept: Path) -> None:
    openpyxl = pytest.importorskip("openpyxl")
    assert hovergap("export", swept, "--output", "out").exit_code == 0
    book = openpyxl.load_workbook("out/front.xlsx")
    sheet = book["front"]
    assert sheet.freeze_panes == "C2"
    assert sheet.auto_filter.ref.startswith("A1:")
    notes = {cell.value: cell.comment.text for cell in sheet[1] if cell.comment}
    assert "unit: mm" in notes["rotor_radius_mm"]
    assert "unit: EUR" in notes["cost"]
    assert "unit: m/s" in notes["tip_speed_m_s"]
    limits = [[cell.value for cell in row] for row in book["limits"].iter_rows()]
    assert limits[1] == ["tip_speed_m_s", "at_most", 70]
    words = " ".join(str(row[0].value) for row in book["notes"].iter_rows())
    assert "burst" in words
    for name in book.sheetnames:
        for row in book[name].iter_rows():
            # Also the study's description, which begins with "=" here.
            assert all(cell.data_type != "f" for cell in row)
            assert all(cell.hyperlink is None for cell in row)


def test_text_stays_text_in_every_format(swept: Path) -> None:
    openpyxl = pytest.importorskip("openpyxl")
    results = open_results(swept)
    honest = front_table(results).table.slice(0, 1)
    for text in FORMULAS:
        place = honest.schema.get_field_index("reason")
        field = honest.schema.field(place)
        nasty = FrontTable(honest.set_column(place, field, pa.array([text])), ())
        book = openpyxl.load_workbook(io.BytesIO(front_workbook(results, nasty)))
        cell = book["front"].cell(2, place + 1)
        assert cell.value == text
        assert cell.data_type == "s"
        written = next(csv.reader(io.StringIO(csv_text(["reason"], nasty.rows())).readlines()[1:]))
        # A spreadsheet runs what begins with these (OWASP, "CSV Injection").
        assert not written[place].startswith(("=", "+", "-", "@", "\t", "\r"))


def test_the_same_front_gives_the_same_bytes(hovergap: Run, swept: Path) -> None:
    assert hovergap("export", swept, "--output", "one").exit_code == 0
    assert hovergap("export", swept, "--output", "two").exit_code == 0
    for name in ("front.csv", "front.parquet", "front.xlsx", "README.txt"):
        assert Path("one", name).read_bytes() == Path("two", name).read_bytes()
