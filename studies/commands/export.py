"""``hovergap export``: files for others."""

from __future__ import annotations

import click


@click.command()
@click.argument("results_folder", metavar="RESULTS/STUDY", type=click.Path())
@click.argument("design", metavar="[DESIGN_ID]", required=False)
@click.option(
    "--output",
    "output",
    type=click.Path(file_okay=False),
    required=True,
    help="Folder to write into; made if it does not exist.",
)
@click.option("--force", is_flag=True, help="Replace files that are there already.")
@click.option(
    "--evaluator", default="", help="Take waveforms from this evaluator instead of the study's."
)
@click.pass_context
def export(
    context: click.Context,
    results_folder: str,
    design: str | None,
    output: str,
    force: bool,
    evaluator: str,
) -> None:
    """Write a design or the fronts for others.

    A design gives drawings, winding, materials, geometry and currents for a field solver, and
    the data of the suspension controller. Without DESIGN_ID the
    fronts of the study are written as CSV, Parquet and spreadsheet.
    """
    from pathlib import Path

    from studies.export.files import write_folder
    from studies.stored.damage import report_damage
    from studies.stored.layout import open_results

    results = open_results(Path(results_folder))
    damaged: tuple[str, ...] = ()
    if design is None:
        from studies.export.design import front_notes
        from studies.export.front import front_files
        from studies.export.front_table import front_table

        front = front_table(results)
        damaged = front.damaged
        files, notes = front_files(results, front), front_notes(results, front)
        title = f"Fronts of study {results.study.name}"
    else:
        from studies.export.design import design_files, design_notes
        from studies.inspection.chosen import choose_design

        chosen = choose_design(results, design, evaluator)
        files, notes = design_files(chosen), design_notes(chosen)
        title = f"Design {chosen.design} of study {results.study.name}"
        for text in chosen.broken_limits:
            click.echo(f"{chosen.design} breaks a limit: {text}", err=True)
    written = write_folder(Path(output), files, title, notes, force)
    for path in written:
        click.echo(str(path))
    click.echo("Read README.txt before anything is built from these files.")
    context.exit(report_damage(damaged))
