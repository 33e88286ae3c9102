"""``hovergap compare``: families against each other."""

from __future__ import annotations

import json
from pathlib import Path

import click


@click.command()
@click.argument("folders", metavar="RESULTS/STUDY...", nargs=-1, required=True, type=click.Path())
@click.option("--json", "as_json", is_flag=True, help="Print JSON.")
@click.option("--csv", "csv_file", type=click.Path(), help="Write one line a family to this file.")
@click.option(
    "--front-csv", type=click.Path(), help="Write every design of all fronts to this file."
)
@click.option("--verified", is_flag=True, help="Count with verified values where there are any.")
@click.option("--verified-only", is_flag=True, help="Compare verified designs alone.")
@click.option("--verified-by", default="", help="The evaluator whose verified values count.")
@click.pass_context
def compare(
    context: click.Context,
    folders: tuple[str, ...],
    as_json: bool,
    csv_file: str | None,
    front_csv: str | None,
    verified: bool,
    verified_only: bool,
    verified_by: str,
) -> None:
    """Compare the families of one or several studies by their fronts."""
    from studies.comparison import text as comparison_text
    from studies.comparison.certainty import certainty_json, order_certainty
    from studies.comparison.numbers import as_json as comparison_json
    from studies.comparison.numbers import compare_families
    from studies.stored.damage import report_damage, report_verified_damage
    from studies.stored.layout import open_results
    from studies.stored.verified import VerifiedFamily, evaluator_for

    distinct = dict.fromkeys(str(Path(folder)) for folder in folders)
    opened = [open_results(Path(folder)) for folder in distinct]
    wanted = verified or verified_only or bool(verified_by)
    name = evaluator_for(opened, verified_by) if wanted else ""
    comparison = compare_families(opened, name, verified_only=verified_only)
    for member in comparison.members:
        member.stored.counts  # noqa: B018  all parts are read, so that damage shows
    if csv_file:
        _write(Path(csv_file), comparison_text.summary_csv(comparison))
    if front_csv:
        _write(Path(front_csv), comparison_text.front_csv(comparison))
    if as_json:
        content = comparison_json(comparison)
        content["certainty"] = certainty_json(order_certainty(comparison))
        click.echo(json.dumps(content, indent=2, allow_nan=False))
    else:
        click.echo(comparison_text.comparison_text(comparison))
    damaged = [part for member in comparison.members for part in member.stored.damaged]
    verified_damage = [
        part
        for member in comparison.members
        if isinstance(member.stored, VerifiedFamily)
        for part in member.stored.damaged_values
    ]
    context.exit(max(report_damage(damaged), report_verified_damage(verified_damage)))


def _write(file: Path, text: str) -> None:
    from studies.stored.layout import storage

    with storage(file, "write"):
        file.write_text(text, encoding="utf-8")
