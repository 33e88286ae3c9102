"""``hovergap sweep``: search the families of a study."""

from __future__ import annotations

import click

from studies.commands.options import allow_program_option, workers_options

LARGEST_BUDGET = 10_000_000
MOST_SEARCHES = 100


@click.command()
@click.argument("study_file", metavar="STUDY.toml")
@click.option(
    "--results",
    "results_folder",
    type=click.Path(file_okay=False),
    default="results",
    show_default=True,
    help="Folder in which the study gets a folder of its own.",
)
@click.option("--family", "family", multiple=True, help="Search only this family; repeatable.")
@click.option(
    "--budget", type=click.IntRange(1, LARGEST_BUDGET), help="Evaluations of each search."
)
@click.option(
    "--searches",
    type=click.IntRange(1, MOST_SEARCHES),
    help="Independent searches of each family; several show how much of the order is chance.",
)
@workers_options
@allow_program_option
@click.option("--seed", type=click.IntRange(0, 2**31 - 1), help="Seed of the search.")
@click.pass_context
def sweep(
    context: click.Context,
    study_file: str,
    results_folder: str,
    family: tuple[str, ...],
    budget: int | None,
    searches: int | None,
    workers: int | None,
    cluster: str,
    allow_program: bool,
    seed: int | None,
) -> None:
    """Search every family of a study and keep every evaluation.

    STUDY.toml is a study file, or the name of a shipped study such as `compressor`. Ctrl-C ends
    the sweep with everything stored; `hovergap resume` goes on with it.
    """
    from pathlib import Path

    from studies.consent import announce_program
    from studies.running import sweep as room
    from studies.running.evaluating import dispatcher_of
    from studies.shipped.library import find_study
    from studies.stored.layout import create

    study = find_study(study_file)
    families = room.chosen_families(study, family)
    problems = room.problems_of(study, families, allow_program)
    request = room.request_of(study, families, budget, searches, seed)
    said = room.announced(study, families, request)
    dispatcher = context.with_resource(dispatcher_of(study, workers, cluster))
    results = create(Path(results_folder), study, request)
    if allow_program:
        announce_program(problems.values())
    click.echo(f"{said}, into {results.folder}")
    context.exit(room.search_families(results, problems, dispatcher))
