"""``hovergap sheet``: one design on paper."""

from __future__ import annotations

from pathlib import Path

import click

from studies.commands.options import file_option


@click.command()
@click.argument("results_folder", metavar="RESULTS/STUDY", type=click.Path())
@click.argument("design", metavar="DESIGN_ID")
@file_option(".html", ".pdf", default="DESIGN_ID.html")
def sheet(results_folder: str, design: str, output: Path | None) -> None:
    """Write a printable sheet of one design, with what a colleague needs to check it by hand."""
    from studies.sheet.content import design_sheet
    from studies.stored.layout import open_results, storage

    made = design_sheet(open_results(Path(results_folder)), design)
    file = output or Path(f"{made.title.removeprefix('Design ')}.html")
    if file.suffix.lower() == ".pdf":
        from studies.sheet.pdf import sheet_pdf

        content = sheet_pdf(made)
    else:
        from studies.sheet.html import sheet_html

        content = sheet_html(made).encode("utf-8")
    with storage(file, "write"):
        file.write_bytes(content)
    click.echo(f"wrote {file}")
