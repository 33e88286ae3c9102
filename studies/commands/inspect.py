"""``hovergap inspect``: one design in full."""

from __future__ import annotations

import json

import click


@click.command()
@click.argument("results_folder", metavar="RESULTS/STUDY", type=click.Path())
@click.argument("design", metavar="DESIGN_ID")
@click.option("--json", "as_json", is_flag=True, help="Print JSON.")
def inspect(results_folder: str, design: str, as_json: bool) -> None:
    """Print one design in full; DESIGN_ID is family and evaluation, as Q12p4s5-001234."""
    from pathlib import Path

    from studies.inspection.design import inspect_design, inspection_json
    from studies.inspection.engineering import engineering_json
    from studies.inspection.text import inspection_text
    from studies.stored.layout import open_results

    found = inspect_design(open_results(Path(results_folder)), design)
    if as_json:
        content = inspection_json(found) | {"engineering": engineering_json(found)}
        click.echo(json.dumps(content, indent=2, allow_nan=False))
    else:
        click.echo(inspection_text(found))
