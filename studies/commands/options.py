"""Options that several commands share."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeVar

import click

MOST_WORKERS = 256

Command = TypeVar("Command", bound=Callable[..., Any])


def allow_program_option(command: Command) -> Command:
    """The option ``--allow-program``."""
    option = click.option(
        "--allow-program",
        is_flag=True,
        help="Let the evaluator start the program that its settings name; never stored.",
    )
    return option(command)


def workers_options(command: Command) -> Command:
    """The options ``--workers`` and ``--cluster``."""
    workers = click.option(
        "--workers",
        type=click.IntRange(1, MOST_WORKERS),
        help="Processes; by default one for each processor. The results do not depend on it.",
    )
    cluster = click.option(
        "--cluster",
        metavar="ADDRESS",
        default="",
        help="Evaluate on the workers of the Dask scheduler at this address, or named in the file "
        "it has written; see README, Many machines.",
    )
    return workers(cluster(command))


def time_limit_option(command: Command) -> Command:
    """The option ``--time-limit``."""
    option = click.option(
        "--time-limit",
        "time_limit_s",
        metavar="SECONDS",
        type=click.FloatRange(0.01, 1e7),
        help="Longest time of one evaluation; by default the study's time_limit_s for the study's "
        "own evaluator, none for another.",
    )
    return option(command)
