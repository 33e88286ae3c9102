"""``hovergap tolerance``: how many machines as built meet the limits."""

from __future__ import annotations

import click

from studies.commands.options import allow_program_option, time_limit_option, workers_options

NOTES = (
    "Each dimension scatters on its own; materials, fill and interference are shared by the "
    "machines of a lot. Latin hypercube sampling, seeded. Not included: a rotor out of centre, "
    "unround or unbalanced parts, unequal magnets, and what no metric tells.",
    "The stack length and the turns are those of the design. The current of each machine follows "
    "from the duty's torque, and the suspension current keeps its share of it.",
    "Replace the default tolerances by those of your drawings and suppliers before you rely on "
    "the yield.",
)


@click.command()
@click.argument("results_folder", metavar="RESULTS/STUDY", type=click.Path())
@click.argument("design", metavar="DESIGN_ID")
@click.option("--evaluator", default="", help="Use this evaluator instead of the study's.")
@click.option(
    "--scatter",
    "entries",
    metavar="NAME=TOLERANCE",
    multiple=True,
    help="Tolerance (half its width) of one source, such as tooth_width_mm=0.05 or "
    "magnet_remanence=3%; 0 takes it out; repeatable. The defaults are printed.",
)
@click.option("--only", is_flag=True, help="Only the sources given by --scatter.")
@click.option(
    "--distribution",
    type=click.Choice(["normal", "uniform"]),
    default="normal",
    show_default=True,
    help="Normal with the tolerance at three standard deviations, or uniform within it.",
)
@click.option(
    "--machines",
    type=click.IntRange(10, 1_000_000),
    help="By default 300 with the analytic evaluator, 40 with others; three evaluations each.",
)
@click.option("--lots", type=click.IntRange(2, 10_000), help="By default a tenth of the machines.")
@click.option("--seed", type=click.IntRange(0, 2**31 - 1), default=1, show_default=True)
@workers_options
@time_limit_option
@allow_program_option
@click.option("--json", "as_json", is_flag=True, help="Print JSON.")
@click.option("--output", type=click.Path(file_okay=False), help="Write tables to this folder.")
@click.option("--force", is_flag=True, help="Replace files that are there already.")
def tolerance(
    results_folder: str,
    design: str,
    evaluator: str,
    entries: tuple[str, ...],
    only: bool,
    distribution: str,
    machines: int | None,
    lots: int | None,
    seed: int,
    workers: int | None,
    cluster: str,
    time_limit_s: float | None,
    allow_program: bool,
    as_json: bool,
    output: str | None,
    force: bool,
) -> None:
    """Scatter a design and give its yield.

    Dimensions and materials scatter; the yield is the share of machines that meet all limits.
    """
    import json
    from pathlib import Path
    from typing import cast

    from studies.consent import announce_program
    from studies.errors import StudiesError
    from studies.inspection import chosen as designs
    from studies.running.evaluating import time_limit_of
    from studies.stored.layout import open_results
    from studies.tolerance import report
    from studies.tolerance.run import built_machines
    from studies.tolerance.scatter import Distribution, defaults, draw, overridden

    results = open_results(Path(results_folder))
    chosen = designs.choose_design(results, design, evaluator, allow_program)
    if allow_program:
        announce_program([chosen.problem], err=as_json)
    scatters = overridden(defaults(chosen.task.materials), entries)
    if only:
        scatters = tuple(item for item in scatters if item.reason == "given")
    if not scatters:
        msg = "nothing scatters: give at least one --scatter NAME=TOLERANCE above zero"
        raise StudiesError(msg)
    quick = chosen.problem.evaluator_name == designs.QUICK_EVALUATOR
    count = machines or (300 if quick else 40)
    drawn = draw(
        scatters,
        count,
        min(count, lots or max(10, count // 10)),
        seed,
        cast("Distribution", distribution),
    )
    limit = time_limit_of(results.study, chosen.problem, time_limit_s)
    with designs.dispatcher_for(chosen.problem, workers, limit, cluster) as dispatcher:
        result = report.tolerance_result(built_machines(chosen, drawn, dispatcher))
    if as_json:
        click.echo(json.dumps(report.tolerance_json(result), indent=2, allow_nan=False))
    else:
        click.echo(report.tolerance_text(result))
    if output is not None:
        from studies.export.files import json_file, text_file, write_folder

        files = [
            text_file(
                "machines.csv",
                report.machines_csv(result),
                "every machine with the deviations drawn, its metrics, and its margins (met at 0 "
                "or below)",
            ),
            json_file(
                "tolerance.json",
                report.tolerance_json(result),
                "yields with 95 % intervals, and the share of each limit's variance by source",
            ),
        ]
        title = f"Tolerance of {chosen.design} of study {chosen.results.study.name}"
        for path in write_folder(Path(output), files, title, list(NOTES), force):
            click.echo(str(path), err=as_json)
