"""Errors of the study room: what a user reads instead of a traceback, and the exit codes."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

Path = tuple[str | int, ...]

EXIT_OK = 0
EXIT_FAILED = 1  # the work could not be done: disk, permission, damaged results
EXIT_BAD_INPUT = 2  # the user's file, names or options are wrong; also Click's usage errors
EXIT_NOTHING_FEASIBLE = 3  # everything ran, no design meets all limits
EXIT_INTERRUPTED = 130  # 128 + SIGINT, common practice of shells

LONGEST_QUOTE = 60


class StudiesError(Exception):
    """Base of errors this package raises on purpose: one clear text, one exit code."""

    exit_code = EXIT_BAD_INPUT


class ResultsError(StudiesError):
    """A results folder is missing, in use, damaged or another study's."""


class StorageError(StudiesError):
    """The operating system refused to read or write."""

    exit_code = EXIT_FAILED


@dataclass(frozen=True)
class Finding:
    """One mistake in a study file.

    Attributes
    ----------
    path : tuple of str and int
        Keys and list positions from the top of the file.
    problem : str
        What is wrong.
    remedy : str
        What would be right.
    line : int or None
        Counted from 1; None before it is looked up.
    """

    path: Path
    problem: str
    remedy: str = ""
    line: int | None = None

    def text(self, file: str) -> str:
        """``file:line: key: problem; remedy``."""
        place = file if self.line is None else f"{file}:{self.line}"
        key = f" {dotted(self.path)}:" if self.path else ""
        remedy = f"; {self.remedy}" if self.remedy else ""
        return f"{place}:{key} {self.problem}{remedy}"


class StudyFileError(StudiesError):
    """A study file is wrong; carries every finding."""

    def __init__(self, file: str, findings: Iterable[Finding]) -> None:
        self.file = file
        self.findings = tuple(findings)
        super().__init__("\n".join(finding.text(file) for finding in self.findings))


def dotted(path: Path) -> str:
    """A path as TOML writes it, list positions counted from 1 in brackets."""
    text = ""
    for part in path:
        if isinstance(part, int):
            text += f"[{part + 1}]"
        else:
            plain = part.replace("_", "").replace("-", "")
            word = part if plain.isascii() and plain.isalnum() else quoted(part)
            text += f".{word}" if text else word
    return text


def quoted(value: object) -> str:
    """`value` for a message: on one line, printable, not endless."""
    try:
        text = repr(value)
    except ValueError:  # an integer of more digits than Python prints
        text = "an integer of thousands of digits"
    return text if len(text) <= LONGEST_QUOTE else f"{text[: LONGEST_QUOTE - 3]}..."
