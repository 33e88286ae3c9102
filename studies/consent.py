"""A study file starts no program on its own: the user's consent, for one command at a time."""

from __future__ import annotations

import shlex
from collections.abc import Iterable

import click

from evaluators.interface import StartsProgram
from studies.errors import StudiesError
from studies.problem import MachineProblem

LONGEST = 400  # characters of a command line that are shown


def program_of(problem: MachineProblem) -> str:
    """Command line of the program that evaluating would start, for a reader; empty for none."""
    evaluator = problem.evaluator
    if not isinstance(evaluator, StartsProgram):
        return ""
    line = shlex.join(evaluator.program)
    line = "".join(sign if sign.isprintable() else "?" for sign in line)
    return line if len(line) <= LONGEST else f"{line[: LONGEST - 3]}..."


def require_consent(problem: MachineProblem) -> None:
    """Refuse to evaluate where a program would be started without consent.

    Raises
    ------
    StudiesError
        Naming the program.
    """
    program = program_of(problem)
    if program and not problem.allow_program:
        msg = (
            f"the evaluator {problem.evaluator_name!r} would start this program, with all your "
            f"rights, for every design:\n  {program}\nIf you know and trust it, add "
            "--allow-program; consent is asked for again each time"
        )
        raise StudiesError(msg)


def announce_program(problems: Iterable[MachineProblem], err: bool = False) -> None:
    """Say which programs are going to be started."""
    for program in dict.fromkeys(program_of(problem) for problem in problems):
        if program:
            click.echo(f"starting for every design: {program}", err=err)
