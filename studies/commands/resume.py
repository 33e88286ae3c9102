"""``hovergap resume``: go on with a sweep."""

from __future__ import annotations

import click

from studies.commands.options import allow_program_option, workers_options
from studies.commands.sweep import LARGEST_BUDGET, MOST_SEARCHES


@click.command()
@click.argument("results_folder", metavar="RESULTS/STUDY", type=click.Path())
@click.option("--family", multiple=True, help="Only this family of the study; repeatable.")
@click.option(
    "--budget",
    type=click.IntRange(1, LARGEST_BUDGET),
    help="Evaluations of each search from now on; more than before extends the search.",
)
@click.option(
    "--searches",
    type=click.IntRange(1, MOST_SEARCHES),
    help="Independent searches of each family from now on; more than before adds searches.",
)
@workers_options
@allow_program_option
@click.option(
    "--study",
    "study_file",
    type=click.Path(),
    default="",
    help="Study file to hold against the stored copy; by default the one it was copied from.",
)
@click.pass_context
def resume(
    context: click.Context,
    results_folder: str,
    family: tuple[str, ...],
    budget: int | None,
    searches: int | None,
    workers: int | None,
    cluster: str,
    allow_program: bool,
    study_file: str,
) -> None:
    """Go on with a sweep that was stopped, or extend it with --budget and --searches.

    The stored copy of the study decides; what has changed in the study file since then is said.
    """
    from dataclasses import replace
    from pathlib import Path

    from studies.consent import announce_program
    from studies.running import sweep as room
    from studies.running.evaluating import dispatcher_of
    from studies.stored.layout import open_results, save_request

    results = open_results(Path(results_folder))
    study = results.study
    differing = room.changes_since_frozen(results, study_file)
    if differing:
        click.echo("The study file has changed since it was copied to the results:")
        for line in differing:
            click.echo(f"  {line}")
        click.echo(
            "Going on with the copy. To search the changed study, give it another name and sweep "
            "it.\n"
        )
    families = room.chosen_families(study, family or results.request.families)
    problems = room.problems_of(study, families, allow_program)
    dispatcher = context.with_resource(dispatcher_of(study, workers, cluster))
    asked = results.request
    wanted = tuple(item for item in study.families if item in families or item in asked.families)
    request = replace(
        asked,
        families=wanted,
        evaluations_per_family=budget or asked.evaluations_per_family,
        searches_per_family=searches or asked.searches_per_family,
    )
    said = room.announced(study, families, request)
    results = save_request(results, request)
    if allow_program:
        announce_program(problems.values())
    click.echo(f"{said}, in {results.folder}")
    context.exit(room.search_families(results, problems, dispatcher))
