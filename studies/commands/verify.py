"""``hovergap verify``: designs evaluated again by another evaluator."""

from __future__ import annotations

import click

from studies.commands.options import allow_program_option, time_limit_option, workers_options


@click.command()
@click.argument("results_folder", metavar="RESULTS/STUDY", type=click.Path())
@click.option(
    "--top",
    type=click.IntRange(1, 1_000_000),
    help="The designs of each front nearest to the ideal, and the best of each objective besides.  "
    "[default: 10]",
)
@click.option("--front", is_flag=True, help="All designs of the fronts instead.")
@click.option("--family", multiple=True, help="Only this family; repeatable.")
@click.option("--evaluator", default="finite_element", show_default=True, help="What verifies.")
@click.option(
    "--setting",
    "settings",
    metavar="NAME=VALUE",
    multiple=True,
    help="A setting of that evaluator, such as analysis=transient; repeatable.",
)
@workers_options
@time_limit_option
@allow_program_option
@click.pass_context
def verify(
    context: click.Context,
    results_folder: str,
    top: int | None,
    front: bool,
    family: tuple[str, ...],
    evaluator: str,
    settings: tuple[str, ...],
    workers: int | None,
    cluster: str,
    time_limit_s: float | None,
    allow_program: bool,
) -> None:
    """Evaluate stored designs again with another evaluator.

    Both values are kept side by side, with their deviation, beside the results. Ctrl-C keeps what
    is done; the same command goes on. `hovergap compare --verified` counts with them.
    """
    import shlex
    from pathlib import Path

    from studies import verification as room
    from studies.consent import announce_program
    from studies.errors import EXIT_NOTHING_FEASIBLE, StudiesError
    from studies.inspection.chosen import dispatcher_for
    from studies.running.evaluating import time_limit_of
    from studies.stored.damage import report_damage
    from studies.stored.layout import open_results

    if front and top is not None:
        msg = "--top and --front exclude each other: --front verifies every design of the fronts"
        raise StudiesError(msg)
    results = open_results(Path(results_folder))
    count = None if front else top or 10
    given = room.read_settings(settings)
    made = room.plans(results, family, evaluator, given, count, allow_program)
    if not any(len(plan) for plan in made.plans):
        click.echo(
            f"{results.folder}: no design meets all limits, so there is nothing to verify; "
            "`hovergap compare` says what comes nearest",
            err=True,
        )
        context.exit(report_damage(made.damaged) or EXIT_NOTHING_FEASIBLE)
    if allow_program:
        announce_program(plan.problem for plan in made.plans)
    again = ["hovergap", "verify", str(results.folder)]
    again += ["--front"] if front else ["--top", str(count)]
    again += [word for item in family for word in ("--family", item)]
    again += ["--evaluator", evaluator] if evaluator != "finite_element" else []
    again += [word for item in settings for word in ("--setting", item)]
    again += [] if time_limit_s is None else ["--time-limit", f"{time_limit_s:g}"]
    again += ["--allow-program"] if allow_program else []
    problem = made.plans[0].problem
    limit = time_limit_of(results.study, problem, time_limit_s)
    dispatcher = context.with_resource(dispatcher_for(problem, workers, limit, cluster))
    code = room.verify_all(results, made.plans, dispatcher, shlex.join(again))
    context.exit(code or report_damage(made.damaged))
