"""Options that several commands share."""

from __future__ import annotations

import math
import re
from collections.abc import Callable
from pathlib import Path
from typing import Any, TypeVar, cast

import click

MOST_WORKERS = 256

Command = TypeVar("Command", bound=Callable[..., Any])


class Quantity(click.FloatRange):
    """A number within a range, in a unit that is not to be written.

    Parameters
    ----------
    unit : str
    low, high : float
    """

    def __init__(self, unit: str, low: float, high: float) -> None:
        super().__init__(low, high)
        self.unit = unit

    def convert(
        self, value: Any, param: click.Parameter | None, ctx: click.Context | None
    ) -> float:
        """The number, or a sentence that says how to write it."""
        try:
            found = float(value)
        except ValueError:
            found = math.nan
        if not math.isfinite(found):
            self.fail(
                f"{value!r} is no number; give it in {self.unit} without writing the unit"
                + self._example(value),
                param,
                ctx,
            )
        if not cast("float", self.min) <= found <= cast("float", self.max):
            self.fail(
                f"{found:g} {self.unit} is out of range; give {self.min:g} to {self.max:g}",
                param,
                ctx,
            )
        return found

    def _example(self, value: Any) -> str:
        """The number at the start of what was given, if its unit is the one wanted."""
        match = re.fullmatch(r"\s*([0-9.]+)\s*(\S+)\s*", str(value))
        same = match and match[2].lower() == self.unit.lower()
        return f", so {match[1]}" if match and same else ""


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


def file_option(*endings: str, default: str) -> Callable[[Command], Command]:
    """The option ``--output`` of a command that writes one file, a `Path` or None.

    Parameters
    ----------
    endings : str
        What the file's name may end with; the ending chooses the format.
    default : str
        The name that help tells for a file that is not named.
    """
    words = " or ".join(endings)

    def checked(
        context: click.Context, parameter: click.Parameter, value: str | None
    ) -> Path | None:
        del context, parameter
        if value is None:
            return None
        file = Path(value)
        if file.suffix.lower() not in endings:
            msg = f"{value!r} must end with {words}"
            raise click.BadParameter(msg)
        return file

    return click.option(
        "--output",
        type=click.Path(),
        callback=checked,
        help=f"File to write, {words}.  [default: {default}]",
    )
