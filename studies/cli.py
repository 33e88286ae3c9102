"""The command ``hovergap``. Commands import what they need when they run, so help is quick."""

from __future__ import annotations

import os
import sys
from typing import Any

import click

from studies.commands.check import check
from studies.commands.choose import choose
from studies.commands.compare import compare
from studies.commands.export import export
from studies.commands.families import families
from studies.commands.field import field
from studies.commands.inspect import inspect
from studies.commands.materials import materials
from studies.commands.metrics import metrics
from studies.commands.new import new
from studies.commands.report import report
from studies.commands.resume import resume
from studies.commands.sensitivity import sensitivity
from studies.commands.sheet import sheet
from studies.commands.status import status
from studies.commands.sweep import sweep
from studies.commands.tolerance import tolerance
from studies.commands.verify import verify
from studies.commands.watch import watch
from studies.errors import EXIT_BAD_INPUT, EXIT_FAILED, EXIT_INTERRUPTED, StudiesError


class _Program(click.Group):
    """The group of commands; turns expected errors into one clear text and an exit code."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Commands in the order in which a user meets them."""
        del ctx
        return list(self.commands)

    def invoke(self, ctx: click.Context) -> Any:
        """Run the command; no expected error shows a traceback."""
        try:
            return super().invoke(ctx)
        except (click.ClickException, click.exceptions.Exit, click.Abort):
            raise
        except StudiesError as error:
            click.echo(str(error), err=True)
            ctx.exit(error.exit_code)
        except BrokenPipeError:
            # The reader of a pipe has gone (`| head`); nothing is left to say to it.
            os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
            ctx.exit(EXIT_FAILED)
        except KeyboardInterrupt:
            click.echo("stopped", err=True)
            ctx.exit(EXIT_INTERRUPTED)
        except Exception as error:
            expected = _expected(error)
            if expected is None:
                raise
            click.echo(expected[0], err=True)
            ctx.exit(expected[1])


def _expected(error: Exception) -> tuple[str, int] | None:
    """Sentence and exit code for an error that a lower room raised on purpose, else None."""
    from evaluators.interface import EvaluatorError
    from optimizer.errors import OptimizerError

    if isinstance(error, EvaluatorError):
        return str(error), EXIT_BAD_INPUT
    if isinstance(error, OptimizerError):
        return str(error), EXIT_FAILED
    if isinstance(error, OSError) and error.strerror:
        place = f"{error.filename}: " if error.filename else ""
        return f"{place}{error.strerror.lower()}", EXIT_FAILED
    return None


def _show_version(context: click.Context, parameter: click.Parameter, wanted: bool) -> None:
    del parameter
    if wanted:
        from studies.stored.layout import program_version

        click.echo(f"hovergap {program_version()}")
        context.exit()


@click.group(cls=_Program, context_settings={"help_option_names": ["-h", "--help"]})
@click.option(
    "--version",
    is_flag=True,
    is_eager=True,
    expose_value=False,
    callback=_show_version,
    help="Show the version.",
)
def main() -> None:
    """Search bearingless permanent-magnet machines: families, windings, cross-sections, fronts.

    Begin with `hovergap sweep compressor`, or write a study of your own with `hovergap new`.
    """


for _command in (
    new,
    check,
    sweep,
    resume,
    status,
    watch,
    compare,
    verify,
    report,
    sheet,
    field,
    inspect,
    choose,
    export,
    sensitivity,
    tolerance,
    families,
    metrics,
    materials,
):
    main.add_command(_command)
