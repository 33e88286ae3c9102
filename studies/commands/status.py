"""``hovergap status``: how far the studies of a results folder are."""

from __future__ import annotations

import json
from typing import Any

import click


@click.command()
@click.argument("results_folder", metavar="RESULTS", type=click.Path(), default="results")
@click.option("--json", "as_json", is_flag=True, help="Print JSON.")
@click.pass_context
def status(context: click.Context, results_folder: str, as_json: bool) -> None:
    """Say how far each family of each study is.

    RESULTS is a folder of studies, or the folder of one study.
    """
    from pathlib import Path

    from studies.errors import ResultsError, StudiesError
    from studies.running.status import study_status
    from studies.stored.damage import report_damage
    from studies.stored.layout import STUDY_FILE, open_results, storage, studies_in
    from studies.stored.naming import search_name
    from studies.tables import percent, text_table

    root = Path(results_folder)
    with storage(root, "read"):
        single = (root / STUDY_FILE).is_file()
        folders = [root] if single or not root.is_dir() else studies_in(root)
    if not folders:
        msg = f"{root}: holds no results of a study yet; `hovergap sweep` makes some"
        raise ResultsError(msg)
    entries: list[dict[str, Any]] = []
    failures: list[str] = []
    for folder in folders:
        try:
            entries.append(study_status(open_results(folder)))
        except StudiesError as error:
            if single or len(folders) == 1:
                raise
            failures.append(str(error))  # one bad study must not hide the others
    if as_json:
        click.echo(json.dumps(entries, indent=2))
    for entry in [] if as_json else entries:
        click.echo(f"{entry['study']} in {entry['folder']}, {entry['state']}")
        rows = [
            [
                search_name(family["family"], family["search"]),
                f"{family['evaluations']:,}/{family['budget']:,}",
                percent(family["feasible"] / max(1, family["evaluations"])),
                f"{family['failed']:,}",
                str(family["front_size"]),
                family["state"],
            ]
            for family in entry["families"]
        ]
        several = any(family["search"] > 1 for family in entry["families"])
        first = "search" if several else "family"
        head = [first, "evaluations", "feasible", "failed", "front", "state"]
        click.echo(text_table(head, rows) + "\n")
    for text in failures:
        click.echo(text, err=True)
    damaged = [path for entry in entries for path in entry["damaged_parts"]]
    context.exit(max(report_damage(damaged), 2 if failures else 0))
