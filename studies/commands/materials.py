"""``hovergap materials``: the materials a study can name."""

from __future__ import annotations

import json

import click


@click.command()
@click.option("--json", "as_json", is_flag=True, help="Print JSON.")
def materials(as_json: bool) -> None:
    """List the materials a study can name."""
    from evaluators.machine.materials.library import available, load
    from studies.study_file.convert import MATERIAL_KINDS
    from studies.tables import text_table

    kinds = list(dict.fromkeys(MATERIAL_KINDS.values()))
    rows = [
        (kind, name, load(kind, name).description) for kind in kinds for name in available(kind)
    ]
    if as_json:
        entries = [dict(zip(("kind", "name", "description"), row, strict=True)) for row in rows]
        click.echo(json.dumps(entries, indent=2, ensure_ascii=False))
        return
    click.echo(text_table(["kind", "name", "description"], rows, left=3))
