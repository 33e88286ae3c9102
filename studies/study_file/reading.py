"""Bytes of a study file into plain tables, refusing what no study needs before anything is built.

Nothing in a study file is ever executed; the hostile file costs a bounded amount of work.
"""

from __future__ import annotations

import datetime
import math
import re
import stat
import tomllib
from pathlib import Path as FilePath
from typing import Any

from studies.errors import Finding, Path, StudiesError, StudyFileError, quoted
from studies.study_file.positions import Positions, line_of, positions

LARGEST_FILE = 256 * 1024  # bytes; a study of every family with every key is below 20 kB
DEEPEST = 6  # levels; the format itself needs 4
LARGEST_INTEGER = 2**53  # above it an integer is no longer exact as a floating-point number
SYNTAX_PLACE = re.compile(r"\s*\(at (?:line (\d+), column (\d+)|(end of document))\)$")

Table = dict[str, Any]


def read_bytes(file: FilePath) -> bytes:
    """Content of the file.

    Raises
    ------
    StudiesError
        If it is not there, not a plain file, not readable or absurdly large.
    """
    try:
        status = file.stat()
        if stat.S_ISDIR(status.st_mode):
            msg = f"{file}: is a folder; give the study file itself"
            raise StudiesError(msg)
        if not stat.S_ISREG(status.st_mode):
            msg = f"{file}: is not a plain file; give a study file in TOML"
            raise StudiesError(msg)
        if status.st_size > LARGEST_FILE:
            msg = (
                f"{file}: has {status.st_size:,} bytes; a study file has at most "
                f"{LARGEST_FILE:,} bytes"
            )
            raise StudiesError(msg)
        return file.read_bytes()
    except FileNotFoundError:
        msg = f"{file}: there is no such file; `hovergap new {file}` writes one to start from"
        raise StudiesError(msg) from None
    except (OSError, ValueError) as error:  # ValueError: a NUL character in the name
        words = getattr(error, "strerror", None) or str(error)
        msg = f"{quoted(str(file))}: cannot be read: {words}"
        raise StudiesError(msg) from None


def parse(content: bytes, file: str) -> tuple[Table, Positions]:
    """Tables and lines of a study file's content.

    Raises
    ------
    StudyFileError
        If the content is empty, no UTF-8, no TOML, nested too deeply, or holds a number that is
        none (NaN, infinity) or an integer beyond exactness.
    """
    text = _text(content, file)
    try:
        table = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise _syntax(str(error), text, file) from None
    except RecursionError:
        problem = "lists or tables are nested too deeply"
        raise StudyFileError(file, [Finding((), problem, f"{DEEPEST} levels do")]) from None
    except ValueError as error:  # an integer of thousands of digits
        finding = Finding((), f"a value cannot be read ({error})", "shorten it")
        raise StudyFileError(file, [finding]) from None
    findings = _unusable(table)
    lines = positions(text)
    if findings:
        placed = [
            Finding(item.path, item.problem, item.remedy, line_of(lines, item.path))
            for item in findings
        ]
        raise StudyFileError(file, placed)
    if not table:
        remedy = "`hovergap new FILE` writes a study to start from"
        raise StudyFileError(file, [Finding((), "the file holds no study: it is empty", remedy)])
    return table, lines


def _text(content: bytes, file: str) -> str:
    try:
        return content.decode("utf-8-sig").replace("\r\n", "\n")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        finding = Finding(
            (),
            f"byte {error.start + 1} (0x{content[error.start]:02x}) is not UTF-8 text",
            "save the file as UTF-8",
            line,
        )
        raise StudyFileError(file, [finding]) from None


def _syntax(words: str, text: str, file: str) -> StudyFileError:
    place = SYNTAX_PLACE.search(words)
    line: int | None = None
    remedy = "correct the TOML syntax on this line"
    if place:
        words = words[: place.start()]
        if place[3]:
            line = max(1, text.rstrip("\n").count("\n") + 1)
            words += " at the end of the file"
        else:
            line = int(place[1])
            words += f" at column {place[2]}"
    # tomllib quotes the offending characters, which may be unprintable or very long.
    return StudyFileError(file, [Finding((), f"not TOML: {_printable(words)}", remedy, line)])


def _printable(words: str) -> str:
    plain = "".join(sign if sign.isprintable() else "?" for sign in words)
    return plain if len(plain) <= 200 else f"{plain[:197]}..."


def _unusable(table: Table) -> list[Finding]:
    """Values no section of a study could use; the walk keeps its own stack."""
    findings: list[Finding] = []
    stack: list[tuple[Path, object]] = [((), table)]
    while stack:
        path, value = stack.pop()
        if isinstance(value, dict | list):
            if len(path) >= DEEPEST:
                findings.append(
                    Finding(path[:DEEPEST], "nested too deeply", f"{DEEPEST} levels do")
                )
                continue
            items = value.items() if isinstance(value, dict) else enumerate(value)
            stack += reversed([((*path, key), item) for key, item in items])
        elif isinstance(value, float) and not math.isfinite(value):
            findings.append(Finding(path, f"{value} is no quantity", "give a finite number"))
        elif isinstance(value, int) and abs(value) > LARGEST_INTEGER:
            problem = f"the integer {quoted(value)} is too large"
            findings.append(Finding(path, problem, "nothing in a study needs more than 2^53"))
        elif isinstance(value, datetime.date | datetime.datetime | datetime.time):
            problem = f"a date or time ({value}) means nothing here"
            findings.append(Finding(path, problem, "put it in quotes if it is meant as text"))
    return findings
