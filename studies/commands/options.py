"""Options that several commands share."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeVar

import click

Command = TypeVar("Command", bound=Callable[..., Any])


def allow_program_option(command: Command) -> Command:
    """The option ``--allow-program``."""
    option = click.option(
        "--allow-program",
        is_flag=True,
        help="Let the evaluator start the program that its settings name; never stored.",
    )
    return option(command)
