"""Files for others, written by one call."""

from __future__ import annotations

from pathlib import Path

from studies.api.tables import Folder, Folders, opened
from studies.export.design import design_files, design_notes, front_notes
from studies.export.files import write_folder
from studies.export.front import front_files
from studies.export.front_table import front_table
from studies.inspection.chosen import choose_design
from studies.report.build import report_html
from studies.report.collect import collect
from studies.running.evaluating import usable_workers
from studies.sheet.content import design_sheet
from studies.stored.layout import open_results, storage


def export_design(
    folder: Folder, design: str, output: Folder, *, evaluator: str = "", force: bool = False
) -> list[Path]:
    """Write drawings, winding, materials, geometry and controller data of one design.

    Parameters
    ----------
    folder : path
        Results folder of the study.
    design : str
        Such as ``Q12p4s5-001234``.
    output : path
        Folder to write into.
    evaluator : str
        Takes waveforms from another evaluator than the study's.
    force : bool
        Replace files that are there already.

    Returns
    -------
    list of Path
        Files written; read README.txt among them before anything is built.
    """
    chosen = choose_design(open_results(Path(folder)), design, evaluator)
    title = f"Design {chosen.design} of study {chosen.results.study.name}"
    return write_folder(Path(output), design_files(chosen), title, design_notes(chosen), force)


def export_fronts(folder: Folder, output: Folder, *, force: bool = False) -> list[Path]:
    """Write the fronts of a study as CSV, Parquet and spreadsheet; returns the files."""
    results = open_results(Path(folder))
    table = front_table(results)
    title = f"Fronts of study {results.study.name}"
    files = front_files(results, table)
    return write_folder(Path(output), files, title, front_notes(results, table), force)


def report(
    folders: Folders, file: str | Path, *, designs: int = 100, workers: int | None = None
) -> Path:
    """Write one HTML file that shows the fronts of one or several studies."""
    data = collect(opened(folders), designs)
    page = report_html(data, workers or usable_workers()).encode("utf-8")
    return _written(Path(file), page)


def sheet(folder: Folder, design: str, file: str | Path) -> Path:
    """Write a printable sheet of one design; the ending of `file` chooses .html or .pdf.

    Raises
    ------
    ValueError
        If the file has another ending.
    """
    path = Path(file)
    kind = path.suffix.lower()
    if kind not in (".html", ".pdf"):
        msg = f"file = {str(file)!r} must end with .html or .pdf"
        raise ValueError(msg)
    made = design_sheet(open_results(Path(folder)), design)
    if kind == ".pdf":
        from studies.sheet.pdf import sheet_pdf

        return _written(path, sheet_pdf(made))
    from studies.sheet.html import sheet_html

    return _written(path, sheet_html(made).encode("utf-8"))


def _written(path: Path, content: bytes) -> Path:
    with storage(path, "write"):
        path.write_bytes(content)
    return path
