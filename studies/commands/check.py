"""``hovergap check``: is a study file right?"""

from __future__ import annotations

import click


@click.command()
@click.argument("study_file", metavar="STUDY.toml")
def check(study_file: str) -> None:
    """Check a study file and say what it would search.

    Every mistake is reported at once, with its line and with what would be right.
    """
    from studies.consent import program_of
    from studies.problem import machine_problem
    from studies.shipped.library import find_study
    from studies.tables import text_table

    study = find_study(study_file)
    program = ""
    for family in study.families:
        problem = machine_problem(study, family)
        problem.check()
        program = program_of(problem)
    click.echo(f"{study.name}: {study.description or 'no description'}")
    searches = study.search.searches_per_family
    several = f", {searches} searches each" if searches > 1 else ""
    of_each = "of each search" if searches > 1 else "each"
    click.echo(
        f"{len(study.families)} families{several}, {study.search.evaluations_per_family:,} "
        f"evaluations {of_each}, seed {study.search.seed}, evaluator {study.evaluator.name}"
    )
    if program:
        click.echo(f"a sweep starts, only with --allow-program, for every design: {program}")
    rows = []
    for winding in study.windings:
        bounds = study.bounds[winding.family.id].values()
        rows.append(
            [
                winding.family.id,
                str(winding.family.coil_pitch),
                f"{winding.torque_winding_factor:.3f}",
                f"{winding.suspension_winding_factor:.3f}",
                f"{winding.family.electrical_frequency(study.duty.speed):.0f}",
                str(sum(low < high for low, high in bounds)),
            ]
        )
    head = ["family", "coil pitch", "torque factor", "suspension factor", "Hz", "free variables"]
    click.echo("\n" + text_table(head, rows))
    if study.refused:
        click.echo(f"\n{len(study.refused)} combinations of the rule cannot be wound.")
    click.echo("\nobjectives")
    for goal in study.objectives:
        terms = " + ".join(
            metric if weight == 1.0 else f"{weight:g} * {metric}" for metric, weight in goal.terms
        )
        word = "maximise" if goal.maximise else "minimise"
        click.echo(f"  {word} {terms if terms == goal.name else f'{goal.name} = {terms}'}")
    click.echo("limits" if study.limits else "no limits")
    for limit in study.limits:
        click.echo(f"  {limit.text()}")
    click.echo("\nThe study is in order.")
