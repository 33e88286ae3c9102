"""``hovergap families``: which slot/pole families can be wound."""

from __future__ import annotations

import json

import click

DEFAULT_SLOTS = "6,12,18,24,30,36"
DEFAULT_POLE_PAIRS = "1-8"
SPANS = {"slots": (3, 360), "pole_pairs": (1, 60)}


def parse_numbers(context: click.Context, parameter: click.Parameter, value: str) -> list[int]:
    """Turn ``6,12,18`` or ``1-8``, or both mixed, into numbers in the order given, each once."""
    del context
    low, high = SPANS[str(parameter.name)]
    numbers: list[int] = []
    for part in value.split(","):
        first, dash, last = part.strip().partition("-")
        ends = [end.strip() for end in ([first, last] if dash else [first, first])]
        if not all(end.isascii() and end.isdigit() and len(end) <= 4 for end in ends):
            msg = f"{part!r} is no number; write 6,12,18 or 1-8"
            raise click.BadParameter(msg)
        start, stop = int(ends[0]), int(ends[1])
        if not low <= start <= stop <= high:
            msg = f"{part.strip()!r} must rise and lie between {low} and {high}"
            raise click.BadParameter(msg)
        numbers += [item for item in range(start, stop + 1) if item not in numbers]
    return numbers


@click.command()
@click.option(
    "--slots",
    callback=parse_numbers,
    default=DEFAULT_SLOTS,
    show_default=True,
    help="Numbers of slots to try.",
)
@click.option(
    "--pole-pairs",
    callback=parse_numbers,
    default=DEFAULT_POLE_PAIRS,
    show_default=True,
    help="Pole pairs of the torque field to try.",
)
@click.option("--speed", type=click.FloatRange(1.0, 1e6), help="Speed in r/min, for frequencies.")
@click.option("--refused", is_flag=True, help="Also say why the others cannot be wound.")
@click.option("--json", "as_json", is_flag=True, help="Print JSON.")
def families(
    slots: list[int], pole_pairs: list[int], speed: float | None, refused: bool, as_json: bool
) -> None:
    """List the slot/pole families that can be wound."""
    from evaluators.machine.winding.families import Refusal, enumerate_families
    from evaluators.machine.winding.winding import Winding
    from studies.study_file.convert import RPM
    from studies.tables import text_table

    results = enumerate_families(slots, pole_pairs)
    windings = [item for item in results if isinstance(item, Winding)]
    others = [item for item in results if isinstance(item, Refusal)]
    rows = []
    for winding in windings:
        family = winding.family
        row = {
            "family": family.id,
            "slots": family.slots,
            "pole_pairs": family.pole_pairs,
            "suspension_pole_pairs": family.suspension_pole_pairs,
            "coil_pitch": family.coil_pitch,
            "torque_winding_factor": float(winding.torque_winding_factor),
            "suspension_winding_factor": float(winding.suspension_winding_factor),
            "residual_voltage": float(winding.residual_voltage),
            "cogging_periods": family.cogging_periods,
            "no_load_force_order": family.no_load_force_order,
        }
        if speed is not None:
            row["electrical_frequency_Hz"] = family.electrical_frequency(speed * RPM)
        rows.append(row)
    if as_json:
        click.echo(json.dumps(rows, indent=2))
        return
    head = [
        "family",
        "coil pitch",
        "torque factor",
        "suspension factor",
        "residual voltage",
        "cogging periods",
        "force order",
    ] + (["frequency Hz"] if speed is not None else [])
    click.echo(
        text_table(
            head,
            [
                [
                    str(row["family"]),
                    str(row["coil_pitch"]),
                    f"{row['torque_winding_factor']:.3f}",
                    f"{row['suspension_winding_factor']:.3f}",
                    f"{row['residual_voltage']:.4f}",
                    str(row["cogging_periods"]),
                    str(row["no_load_force_order"]),
                ]
                + ([f"{row['electrical_frequency_Hz']:.0f}"] if speed is not None else [])
                for row in rows
            ],
        )
    )
    click.echo(f"\n{len(rows)} families can be wound, {len(others)} combinations cannot.")
    if refused:
        click.echo()
        for other in others:
            click.echo(other.reason)
