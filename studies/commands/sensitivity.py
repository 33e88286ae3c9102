"""``hovergap sensitivity``: what a design's metrics depend on."""

from __future__ import annotations

import click

from studies.commands.options import allow_program_option, time_limit_option, workers_options


@click.command()
@click.argument("results_folder", metavar="RESULTS/STUDY", type=click.Path())
@click.argument("design", metavar="DESIGN_ID")
@click.option("--evaluator", default="", help="Use this evaluator instead of the study's.")
@click.option(
    "--points",
    type=click.IntRange(3, 1001),
    help="Points of each line; by default 11 with the analytic evaluator, 5 with others.",
)
@click.option(
    "--indices",
    "method",
    type=click.Choice(["sobol", "delta", "none"]),
    help="Global indices over the study's box: from new samples, from the stored designs, or "
    "none; by default new samples with the analytic evaluator, stored designs with others.",
)
@click.option(
    "--samples",
    type=click.IntRange(8, 2**20),
    default=64,
    show_default=True,
    help="Base samples of Sobol indices, rounded up to a power of 2; each costs two evaluations "
    "more than there are free variables.",
)
@click.option("--seed", type=click.IntRange(0, 2**31 - 1), default=1, show_default=True)
@workers_options
@time_limit_option
@allow_program_option
@click.option(
    "--output", type=click.Path(file_okay=False), help="Write tables and pictures to this folder."
)
@click.option("--force", is_flag=True, help="Replace files that are there already.")
def sensitivity(
    results_folder: str,
    design: str,
    evaluator: str,
    points: int | None,
    method: str | None,
    samples: int,
    seed: int,
    workers: int | None,
    cluster: str,
    time_limit_s: float | None,
    allow_program: bool,
    output: str | None,
    force: bool,
) -> None:
    """Show what a design depends on.

    Moves each variable of the design on its own, and weighs the variables over the whole box.
    """
    from pathlib import Path
    from typing import cast

    from studies.consent import announce_program
    from studies.errors import StudiesError
    from studies.export.files import write_folder
    from studies.inspection import chosen as designs
    from studies.running.evaluating import time_limit_of
    from studies.sensitivity import study as room
    from studies.sensitivity.indices import TooFewError
    from studies.sensitivity.tables import sensitivity_text
    from studies.stored.layout import open_results

    results = open_results(Path(results_folder))
    chosen = designs.choose_design(results, design, evaluator, allow_program)
    if allow_program:
        announce_program([chosen.problem], err=False)
    limit = time_limit_of(results.study, chosen.problem, time_limit_s)
    with designs.dispatcher_for(chosen.problem, workers, limit, cluster) as dispatcher:
        try:
            found = room.sensitivity(
                chosen,
                dispatcher,
                points or room.default_points(chosen),
                cast("room.Method", method or room.default_method(chosen)),
                2 ** (samples - 1).bit_length(),
                seed,
            )
        except TooFewError as error:
            msg = f"{chosen.design}: {error}; or leave the indices out with --indices none"
            raise StudiesError(msg) from None
    click.echo(sensitivity_text(found))
    if output is not None:
        from studies.sensitivity.output import sensitivity_files, sensitivity_notes

        title = f"Sensitivity of {chosen.design} of study {chosen.results.study.name}"
        files = sensitivity_files(found)
        for path in write_folder(Path(output), files, title, sensitivity_notes(found), force):
            click.echo(str(path))
