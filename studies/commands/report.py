"""``hovergap report``: one HTML file with everything to decide by."""

from __future__ import annotations

from pathlib import Path

import click

from studies.commands.options import MOST_WORKERS


@click.command()
@click.argument("folders", metavar="RESULTS/STUDY...", nargs=-1, required=True, type=click.Path())
@click.option("--output", type=click.Path(), help="File to write.  [default: STUDY-report.html]")
@click.option(
    "--designs",
    type=click.IntRange(10, 1000),
    default=100,
    show_default=True,
    help="Designs of each front that get a card; larger fronts are thinned evenly.",
)
@click.option(
    "--workers",
    type=click.IntRange(1, MOST_WORKERS),
    help="Processes; by default one for each processor.",
)
@click.pass_context
def report(
    context: click.Context,
    folders: tuple[str, ...],
    output: str | None,
    designs: int,
    workers: int | None,
) -> None:
    """Write one HTML file that shows the fronts of one or several studies.

    The file needs no network and no other file: it can be mailed and opened anywhere.
    """
    from studies.report.build import report_html
    from studies.report.collect import collect
    from studies.running.evaluating import usable_workers
    from studies.stored.damage import report_damage
    from studies.stored.layout import open_results, storage

    distinct = dict.fromkeys(str(Path(folder)) for folder in folders)
    opened = [open_results(Path(folder)) for folder in distinct]
    data = collect(opened, designs)
    file = Path(output) if output else Path(f"{opened[0].study.name}-report.html")
    page = report_html(data, workers or usable_workers()).encode("utf-8")
    with storage(file, "write"):
        file.write_bytes(page)
    shown = sum(len(family.ids) for family in data.families)
    click.echo(f"wrote {file}: {shown} designs, {len(page) / 1e6:.1f} MB")
    damaged = [part for family in data.families for part in family.member.stored.damaged]
    context.exit(report_damage(damaged))
