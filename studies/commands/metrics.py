"""``hovergap metrics``: what every evaluation returns, and what is varied."""

from __future__ import annotations

import json

import click


@click.command()
@click.option("--json", "as_json", is_flag=True, help="Print JSON.")
@click.option("--variables", is_flag=True, help="List the design variables instead.")
def metrics(as_json: bool, variables: bool) -> None:
    """List the metrics: name, unit, definition, source."""
    from dataclasses import asdict

    from evaluators.machine.geometry.variables import VARIABLES
    from evaluators.machine.metrics import METRICS
    from studies.tables import number, text_table

    if as_json:
        entries = [asdict(item) for item in (VARIABLES if variables else METRICS)]
        click.echo(json.dumps(entries, indent=2))
        return
    if variables:
        rows = [
            [item.name, item.unit, number(item.lowest), number(item.highest), item.definition]
            for item in VARIABLES
        ]
        head = ["variable", "unit", "lowest", "highest", "definition"]
        click.echo(text_table(head, rows, left=5))
        return
    better = {True: "smaller", False: "larger", None: "-"}
    groups = list(dict.fromkeys(metric.group for metric in METRICS))
    group = ""
    for metric in sorted(METRICS, key=lambda item: groups.index(item.group)):
        if metric.group != group:
            group = metric.group
            click.echo(f"{'' if group == groups[0] else chr(10)}{group}")
        unit = "ratio" if metric.unit == "1" else metric.unit
        click.echo(f"  {metric.name}  [{unit}]  better: {better[metric.smaller_is_better]}")
        click.echo(f"      {metric.definition}")
        click.echo(f"      source: {metric.source}")
