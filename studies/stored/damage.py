"""One sentence for each damaged part met while reading."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

import click

from optimizer.archive.archive import open_archive
from studies.errors import EXIT_FAILED, EXIT_OK


def report_verified_damage(parts: Iterable[Path]) -> int:
    """Say which parts of verified values are damaged; exit code 1 if any is."""
    code = EXIT_OK
    for part in parts:
        click.echo(
            f"{part}: is damaged, so its verified values are missing above; "
            f"`hovergap verify {part.parents[2]}` sets it aside and verifies them again",
            err=True,
        )
        code = EXIT_FAILED
    return code


def report_damage(parts: Iterable[Path | str]) -> int:
    """Say what is wrong with parts; exit code 1 if there are any, because rows are missing then."""
    code = EXIT_OK
    for part in dict.fromkeys(map(Path, parts)):
        trouble = open_archive(part.parent).trouble(part) or "is damaged"
        click.echo(
            f"{part}: {trouble}, so its evaluations are missing above; "
            f"`hovergap resume {part.parent.parent}` sets it aside and evaluates them again",
            err=True,
        )
        code = EXIT_FAILED
    return code
