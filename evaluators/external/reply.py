"""Reading what a program outside has answered; it is not trusted in anything."""

from __future__ import annotations

import json
import math
import os
import stat
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any, NoReturn

from evaluators.external.quantities import FIELD
from evaluators.external.wording import LONGEST_REASON, plain, quoted
from evaluators.machine.metrics import METRIC

FORMAT = "hovergap field reply"
FORMAT_VERSION = 1
KEYS = ("format", "format_version", "status", "reason", "field", "metrics", "notes")
LARGEST_REPLY = 1 << 20  # bytes; a full reply has below 4 kB
DEEPEST = 3  # levels of objects and lists
LARGEST_METRIC = 1e30


class ReplyError(ValueError):
    """The reply cannot be used; the text says why."""


@dataclass(frozen=True)
class Reply:
    """A checked reply.

    Attributes
    ----------
    reason : str
        Why the program could not solve the design; empty if it did.
    field : mapping of FieldSolution attribute to float
        SI; empty if none was asked for.
    metrics : mapping of metric name to float
        Those asked for.
    """

    reason: str
    field: Mapping[str, float]
    metrics: Mapping[str, float]


def reply_bytes(file: Path) -> bytes:
    """Content of the reply's file.

    Raises
    ------
    ReplyError
        If it is missing, no plain file or too large.
    """
    try:
        # Neither wait for a pipe's other end nor follow a link out of the working folder.
        handle = os.open(file, os.O_RDONLY | os.O_NONBLOCK | os.O_NOFOLLOW | os.O_CLOEXEC)
    except FileNotFoundError:
        msg = f"wrote no {file.name}"
        raise ReplyError(msg) from None
    except OSError as error:
        msg = f"left a {file.name} that cannot be opened: {(error.strerror or '').lower()}"
        raise ReplyError(msg) from None
    if not stat.S_ISREG(os.fstat(handle).st_mode):
        os.close(handle)
        msg = f"left a {file.name} that is no plain file"
        raise ReplyError(msg)
    with os.fdopen(handle, "rb") as stream:
        content = stream.read(LARGEST_REPLY + 1)
    if len(content) > LARGEST_REPLY:
        msg = f"wrote a {file.name} of more than {LARGEST_REPLY:,} bytes"
        raise ReplyError(msg)
    return content


def read_reply(content: bytes, field: bool, metrics: Sequence[str]) -> Reply:
    """Check a reply.

    Parameters
    ----------
    content : bytes
    field : bool
        Whether all field quantities are wanted.
    metrics : sequence of str
        Names of the metrics wanted.

    Raises
    ------
    ReplyError
        Naming the first thing that is wrong, as the end of a sentence about the program.
    """
    table = _parsed(content)
    for key in table:
        if key not in KEYS:
            msg = f"gave the unknown key {quoted(key)}; known are {', '.join(KEYS)}"
            raise ReplyError(msg)
    if table.get("format") != FORMAT:
        msg = f"gave format {quoted(table.get('format'))} instead of {FORMAT!r}"
        raise ReplyError(msg)
    version = table.get("format_version")
    if isinstance(version, bool) or version != FORMAT_VERSION:
        msg = f"gave format_version {quoted(version)} instead of {FORMAT_VERSION}"
        raise ReplyError(msg)
    status, reason = table.get("status"), table.get("reason", "")
    if status not in ("ok", "failed"):
        msg = f"gave status {quoted(status)} instead of 'ok' or 'failed'"
        raise ReplyError(msg)
    if not isinstance(reason, str):
        msg = f"gave reason {quoted(reason)} instead of text"
        raise ReplyError(msg)
    if status == "failed":
        said = plain(reason, LONGEST_REASON) or "the program could not solve it and gave no reason"
        return Reply(said, {}, {})
    found: dict[str, float] = {}
    if field:
        given = _numbers(table, "field", [item.key for item in FIELD])
        for item in FIELD:
            value = given[item.key]
            _check_range("field", item.key, value, item.lowest, item.highest)
            found[item.attribute] = item.factor * value
    elif table.get("field"):
        msg = "gave field quantities, which the settings do not ask for (field = false)"
        raise ReplyError(msg)
    own = _numbers(table, "metrics", metrics)
    for name, value in own.items():
        low = -LARGEST_METRIC if METRIC[name].signed else 0.0
        _check_range("metrics", name, value, low, LARGEST_METRIC)
    return Reply("", found, own)


def _parsed(content: bytes) -> dict[str, Any]:
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        msg = f"wrote a reply that is not UTF-8 text at byte {error.start + 1}"
        raise ReplyError(msg) from None
    try:
        table = json.loads(text, parse_constant=_no_constant, object_pairs_hook=_distinct)
    except ReplyError:
        raise
    except json.JSONDecodeError as error:
        what = plain(error.msg, 200).lower()
        msg = f"wrote a reply that is no JSON: {what} in line {error.lineno}"
        raise ReplyError(msg) from None
    except RecursionError:
        msg = "wrote a reply that is nested too deeply"
        raise ReplyError(msg) from None
    except ValueError:  # an integer of thousands of digits
        msg = "wrote a reply with a number of thousands of digits"
        raise ReplyError(msg) from None
    if not isinstance(table, dict):
        msg = "wrote a reply that is no JSON object"
        raise ReplyError(msg)
    stack: list[tuple[int, object]] = [(1, table)]
    while stack:
        depth, value = stack.pop()
        if isinstance(value, dict | list):
            if depth > DEEPEST:
                msg = f"wrote a reply nested deeper than {DEEPEST} levels"
                raise ReplyError(msg)
            items = value.values() if isinstance(value, dict) else value
            stack += [(depth + 1, item) for item in items]
    return table


def _no_constant(word: str) -> NoReturn:
    msg = f"wrote {word}, which is no number of JSON"
    raise ReplyError(msg)


def _distinct(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    table = dict(pairs)
    if len(table) < len(pairs):
        names = [name for name, _ in pairs]
        twice = next(name for name in names if names.count(name) > 1)
        msg = f"gave the key {quoted(twice)} twice"
        raise ReplyError(msg)
    return table


def _numbers(table: dict[str, Any], section: str, wanted: Sequence[str]) -> dict[str, float]:
    """Exactly the wanted numbers of a section."""
    given = table.get(section, {})
    if not isinstance(given, dict):
        msg = f"gave {section} {quoted(given)} instead of an object"
        raise ReplyError(msg)
    missing = [name for name in wanted if name not in given]
    if missing:
        more = f" and {len(missing) - 1} more" if len(missing) > 1 else ""
        msg = f"left out {section} {missing[0]}{more}"
        raise ReplyError(msg)
    for name in given:
        if name not in wanted:
            msg = f"gave {section} {quoted(name)}, which is not asked for"
            raise ReplyError(msg)
    return {name: _number(f"{section} {name}", given[name]) for name in wanted}


def _number(name: str, value: object) -> float:
    if isinstance(value, bool) or not isinstance(value, int | float):
        msg = f"gave {name} = {quoted(value)} instead of a number"
        raise ReplyError(msg)
    try:
        number = float(value)
    except OverflowError:
        number = math.inf
    if not math.isfinite(number):
        msg = f"gave {name} = {quoted(value)}, which is not a finite number"
        raise ReplyError(msg)
    return number


def _check_range(section: str, name: str, value: float, low: float, high: float) -> None:
    if not low <= value <= high:
        msg = f"gave {section} {name} = {value:g}, which must lie between {low:g} and {high:g}"
        raise ReplyError(msg)
