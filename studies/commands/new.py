"""``hovergap new``: a commented study to start from."""

from __future__ import annotations

from pathlib import Path

import click

from studies.commands.options import Quantity


@click.command()
@click.argument("study_file", metavar="STUDY.toml")
@click.option(
    "--power",
    type=Quantity("kW", 0.001, 1e5),
    default=11.0,
    show_default=True,
    help="Shaft power in kW.",
)
@click.option(
    "--speed",
    type=Quantity("r/min", 10.0, 900_000.0),
    default=48_000.0,
    show_default=True,
    help="Speed in r/min.",
)
@click.option(
    "--dc-link",
    type=Quantity("V", 5.0, 10_000.0),
    default=560.0,
    show_default=True,
    help="DC-link voltage in V.",
)
@click.option(
    "--overspeed",
    type=click.FloatRange(1.0, 2.0),
    default=1.2,
    show_default=True,
    help="Overspeed over the speed.",
)
@click.option(
    "--orientation",
    type=click.Choice(["horizontal", "vertical"]),
    default="horizontal",
    show_default=True,
    help="Of the shaft.",
)
def new(
    study_file: str, power: float, speed: float, dc_link: float, overspeed: float, orientation: str
) -> None:
    """Write a commented study sized from power, speed and DC link."""
    from studies.new_study.beginning import begin_study

    study = begin_study(Path(study_file), power, speed, dc_link, overspeed, orientation)
    click.echo(
        f"wrote {study_file}: {len(study.families)} families, "
        f"{study.search.evaluations_per_family:,} evaluations each.\n"
        f"Read its comments, then run: hovergap sweep {study_file}"
    )
