"""``hovergap new``: a commented study to start from."""

from __future__ import annotations

from pathlib import Path

import click


@click.command()
@click.argument("study_file", metavar="STUDY.toml")
@click.option(
    "--power",
    type=click.FloatRange(0.001, 1e5),
    default=11.0,
    show_default=True,
    help="Shaft power in kW.",
)
@click.option(
    "--speed",
    type=click.FloatRange(10.0, 900_000.0),
    default=48_000.0,
    show_default=True,
    help="Speed in r/min.",
)
@click.option(
    "--dc-link",
    type=click.FloatRange(5.0, 10_000.0),
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
    from studies.crosschecks import check_name
    from studies.definition import study_from
    from studies.errors import StudiesError, StudyFileError
    from studies.template import study_text

    file = Path(study_file)
    name = file.name.removesuffix(".toml")
    wrong = check_name(name)
    if wrong or file.suffix != ".toml":
        problem = wrong[0].problem if wrong else "has no .toml ending"
        msg = (
            f"{study_file!r}: the file name, which names the study, {problem}; write for example "
            "blower.toml"
        )
        raise StudiesError(msg)
    text = study_text(name, power, speed, dc_link, overspeed, orientation)
    try:
        study = study_from(text.encode(), study_file)
    except StudyFileError as error:
        msg = (
            f"no sensible machine of {power:g} kW at {speed:g} r/min came out of the first-order "
            f"sizing:\n{error}"
        )
        raise StudiesError(msg) from None
    try:
        with file.open("x", encoding="utf-8") as stream:
            stream.write(text)
    except FileExistsError:
        msg = f"{study_file}: exists already and is left alone; choose another name"
        raise StudiesError(msg) from None
    click.echo(
        f"wrote {study_file}: {len(study.families)} families, "
        f"{study.search.evaluations_per_family:,} evaluations each.\n"
        f"Read its comments, then run: hovergap sweep {study_file}"
    )
