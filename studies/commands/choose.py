"""``hovergap choose``: from preferences to one design."""

from __future__ import annotations

import click

LONGEST_REASON = 2000  # characters


@click.command()
@click.argument("folders", metavar="RESULTS/STUDY...", nargs=-1, required=True, type=click.Path())
@click.option(
    "--weight",
    "weights",
    metavar="NAME=NUMBER",
    multiple=True,
    help="Weight of an objective (1 unless given, 0 takes it out) or of a further metric.",
)
@click.option(
    "--aspire",
    "aspirations",
    metavar="NAME=VALUE",
    multiple=True,
    help="Level of an objective or metric that would satisfy; by default the best there is.",
)
@click.option("--at-most", metavar="METRIC=VALUE", multiple=True, help="A further upper limit.")
@click.option("--at-least", metavar="METRIC=VALUE", multiple=True, help="A further lower limit.")
@click.option(
    "--price",
    "prices",
    metavar="MATERIAL=PRICE",
    multiple=True,
    help="Price of a kilogram instead of the study's, such as magnet=150.",
)
@click.option(
    "--market",
    type=click.Choice(["low", "base", "high"]),
    default="base",
    show_default=True,
    help="Which of the study's price lists counts.",
)
@click.option(
    "--method",
    type=click.Choice(["achievement", "sum"]),
    default="achievement",
    show_default=True,
    help="Worst distance to the aspirations, or weighted sum.",
)
@click.option(
    "--show", type=click.IntRange(1, 100), default=3, show_default=True, help="Designs a family."
)
@click.option("--take", default="", metavar="DESIGN_ID", help="Decide for this design instead.")
@click.option("--because", default="", help="Your own reason, stored with the decision.")
@click.option("--no-store", is_flag=True, help="Only print; store no decision.")
@click.option("--json", "as_json", is_flag=True, help="Print JSON.")
@click.pass_context
def choose(
    context: click.Context,
    folders: tuple[str, ...],
    weights: tuple[str, ...],
    aspirations: tuple[str, ...],
    at_most: tuple[str, ...],
    at_least: tuple[str, ...],
    prices: tuple[str, ...],
    market: str,
    method: str,
    show: int,
    take: str,
    because: str,
    no_store: bool,
    as_json: bool,
) -> None:
    """Rank all designs by your preferences.

    Every evaluated design that meets the limits is ranked, not the fronts alone. The decision
    goes to RESULTS/STUDY/decisions, numbered; an older one is never replaced.
    """
    import json
    from datetime import UTC, datetime
    from pathlib import Path
    from typing import cast

    from studies.choice import text
    from studies.choice.candidates import candidate_pools
    from studies.choice.decision import decide
    from studies.choice.preferences import Market, Method, preferences, read_pairs
    from studies.choice.store import store_decision
    from studies.errors import EXIT_NOTHING_FEASIBLE, StudiesError
    from studies.stored.layout import open_results
    from studies.tables import number

    because = " ".join(because.split())
    if len(because) > LONGEST_REASON:
        msg = f"--because has {len(because):,} characters; at most {LONGEST_REASON:,} will do"
        raise StudiesError(msg)
    opened = [open_results(Path(folder)) for folder in dict.fromkeys(map(str, folders))]
    wanted = preferences(
        opened[0].study,
        read_pairs("--weight", weights),
        read_pairs("--aspire", aspirations),
        read_pairs("--at-most", at_most),
        read_pairs("--at-least", at_least),
        read_pairs("--price", prices),
        cast("Method", method),
        cast("Market", market),
    )
    pools = candidate_pools(opened, wanted)
    decision = decide(pools, wanted, show, take)
    if decision is None:
        click.echo("No stored design meets all limits.", err=True)
        for pool in pools:
            click.echo(f"{pool.label}: {text.empty_text(pool.feasible_before)}", err=True)
            for limit in wanted.limits if pool.feasible_before else ():
                best = number(pool.best_limited[limit.name])
                click.echo(f"  {limit.text()}: the best of them has {best}", err=True)
        context.exit(EXIT_NOTHING_FEASIBLE)
    when = datetime.now(UTC).isoformat(timespec="seconds")
    content = text.decision_json(decision, because, when)
    if as_json:
        click.echo(json.dumps(content, indent=2, allow_nan=False))
    else:
        click.echo(text.preferences_text(wanted) + "\n\n" + text.ranking_text(decision) + "\n")
        click.echo(f"Taken: {decision.taken.design}")
        for sentence in text.reasons(decision, because):
            click.echo(f"  {sentence}")
    if not no_store:
        folder = decision.taken.pool.results.folder
        page = text.decision_text(decision, because, when)
        for path in store_decision(folder, content, page):
            click.echo(str(path), err=as_json)
