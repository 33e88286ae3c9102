"""``hovergap field``: the field of one design as a picture."""

from __future__ import annotations

from pathlib import Path

import click

from studies.commands.options import file_option


@click.command()
@click.argument("results_folder", metavar="RESULTS/STUDY", type=click.Path())
@click.argument("design", metavar="DESIGN_ID")
@file_option(".png", ".svg", default="DESIGN_ID-field.png")
@click.option(
    "--angle",
    type=click.FloatRange(-3600.0, 3600.0),
    default=0.0,
    show_default=True,
    help="Rotor angle in degrees.",
)
@click.option("--no-load", is_flag=True, help="Magnets alone, without torque current.")
@click.option(
    "--force",
    "direction",
    type=click.FloatRange(-360.0, 360.0),
    metavar="DEG",
    help="Add the suspension current that commands a force in this direction.",
)
def field(
    results_folder: str,
    design: str,
    output: Path | None,
    angle: float,
    no_load: bool,
    direction: float | None,
) -> None:
    """Draw flux lines over the flux density of one design.

    The field is that of the finite-element evaluator, without induced currents: magnets and
    torque current at the duty. At angle 0 a north pole faces the first tooth.
    """
    from studies.drawing.field_view import draw_field
    from studies.stored.layout import open_results, storage

    drawn = draw_field(
        open_results(Path(results_folder)),
        design,
        angle,
        torque=not no_load,
        direction=direction,
        kind=output.suffix.lower().removeprefix(".") if output else "png",
    )
    file = output or Path(f"{drawn.design}-field.png")
    with storage(file, "write"):
        file.write_bytes(drawn.content)
    click.echo(f"wrote {file}")
