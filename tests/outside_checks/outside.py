"""Checks against something outside the project, recorded for the page of checks.

A test file makes one `OutsideChecks` for its topic and calls it instead of asserting:

    check = OutsideChecks("losses")

    def test_skin_depth() -> None:
        check("skin depth of copper at 50 Hz", skin_depth(50.0, RHO), 9.3e-3, relative=0.01,
              why="two printed digits", source="common practice")

Every call asserts its tolerance and keeps the largest deviation; calls that differ in nothing but
their numbers, as those of a parametrized test do, make one row. `outside_plugin` writes the page.
"""

from __future__ import annotations

import math
import re
import sys
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np

# The order of the page.
TOPICS = {
    "winding": "Winding",
    "geometry": "Cross-section",
    "field": "Field",
    "force": "Torque and force",
    "losses": "Losses",
    "drive": "Inverter, turns and wire",
    "demagnetisation": "Demagnetisation and short circuit",
    "heat": "Heat",
    "mechanics": "Mechanics",
    "levitation": "Levitation",
    "materials": "Materials",
    "cost": "Cost",
    "external": "External evaluator",
    "search": "Search and its indicators",
    "archive": "Archive",
    "studies": "Studies and what is made of their results",
}

PLAIN = "abs."  # unit of an absolute deviation of a pure number

Key = tuple[str, str, str, str, str, str]


@dataclass
class Row:
    """One check: its words, and what all calls of it have found so far."""

    topic: str
    what: str
    allowed: str
    why: str
    source: str
    file: str
    line: int
    unit: str = ""
    slow: bool = False
    values: int = 0
    relative: float | None = None
    absolute: float | None = None
    lowest: float = math.inf
    highest: float = -math.inf


@dataclass
class Records:
    """Rows of a run, and the marks of the test that is running; kept by `outside_plugin`."""

    rows: dict[Key, Row] = field(default_factory=dict)
    slow: bool = False

    def kept(self, row: Row) -> Row:
        """The row of the same words that is kept from now on."""
        key = (row.topic, row.what, row.allowed, row.why, row.source, row.file)
        return self.rows.setdefault(key, row)


RECORDS = Records()


class OutsideChecks:
    """Checks of one topic.

    Parameters
    ----------
    topic
        One of `TOPICS`.
    source
        Where the expected values come from, for calls that do not say it themselves.
    """

    def __init__(self, topic: str, source: str = "") -> None:
        if topic not in TOPICS:
            msg = f"topic = {topic!r} must be one of {', '.join(TOPICS)}"
            raise ValueError(msg)
        self.topic = topic
        self.source = source

    def __call__(
        self,
        what: str,
        found: Any,
        expected: Any,
        *,
        relative: float = 0.0,
        absolute: float = 0.0,
        why: str,
        unit: str = "",
        source: str = "",
    ) -> None:
        """Assert that every value is within `relative` or `absolute` of what is expected.

        Parameters
        ----------
        what
            The quantity, in words; without numbers that change from call to call.
        found, expected
            Numbers or arrays of one shape, complex or real; `expected` may be a single number.
        relative, absolute
            Tolerance, as share of the expected value and in `unit`; the larger of both counts.
        why
            The reason for the tolerance.
        unit
            Of `absolute`; empty for pure numbers.
        source
            Where `expected` comes from.
        """
        __tracebackhide__ = True
        if not (relative > 0.0 or absolute > 0.0):
            msg = "a tolerance is missing: relative or absolute, or call same()"
            raise ValueError(msg)
        got, wanted = _pair(what, found, expected)
        with np.errstate(invalid="ignore", divide="ignore"):
            deviation = np.where(got == wanted, 0.0, np.abs(got - wanted))
            size = np.abs(wanted)
            tolerance = np.maximum(relative * size, absolute)
            by_size = relative * size >= absolute
            share = np.where(deviation == 0.0, 0.0, deviation / size)
        limits = [size_text(relative)] if relative > 0.0 else []
        limits += [with_unit(number(absolute), unit or PLAIN)] if absolute > 0.0 else []
        row = self._row(what, " or ".join(limits), why, source, unit)
        inside = np.isfinite(tolerance) & (deviation <= tolerance) | (deviation == 0.0)
        if not np.all(inside):
            worst = np.unravel_index(int(np.argmin(inside)), inside.shape)
            place = f" at {tuple(int(i) for i in worst)}" if worst else ""
            msg = (
                f"{what}{place}: found {got[worst].item()!r}, expected {wanted[worst].item()!r}; "
                f"deviation {deviation[worst]:.3g}, allowed {row.allowed} ({why}). "
                f"Source: {row.source}"
            )
            raise AssertionError(msg)
        row = RECORDS.kept(row)
        row.values += int(got.size)
        if np.any(by_size):
            row.relative = max(row.relative or 0.0, float(share[by_size].max()))
        if not np.all(by_size):
            row.absolute = max(row.absolute or 0.0, float(deviation[~by_size].max()))

    def within(
        self,
        what: str,
        found: Any,
        low: float,
        high: float,
        *,
        why: str,
        unit: str = "",
        source: str = "",
    ) -> None:
        """Assert that every value lies from `low` to `high`; either may be infinite."""
        __tracebackhide__ = True
        got = np.asarray(found, dtype=np.float64)
        _some(what, got)
        if math.isinf(low):
            limits = f"at most {with_unit(number(high, 4), unit)}"
        elif math.isinf(high):
            limits = f"at least {with_unit(number(low, 4), unit)}"
        else:
            limits = with_unit(f"{number(low, 4)} to {number(high, 4)}", unit)
        row = self._row(what, limits, why, source, unit)
        outside = ~((got >= low) & (got <= high))
        if np.any(outside):
            msg = f"{what}: found {got[outside][0]:.6g}, allowed {limits} ({why})"
            raise AssertionError(f"{msg}. Source: {row.source}")
        row = RECORDS.kept(row)
        row.values += int(got.size)
        row.lowest = min(row.lowest, float(got.min()))
        row.highest = max(row.highest, float(got.max()))

    def same(
        self, what: str, found: Any, expected: Any, *, why: str = "exact", source: str = ""
    ) -> None:
        """Assert equality, of whole numbers, words or truth values."""
        __tracebackhide__ = True
        got, wanted = _pair(what, found, expected)
        row = self._row(what, "none", why, source, "")
        if not np.array_equal(got, wanted):
            msg = f"{what}: found {found!r}, expected {expected!r}. Source: {row.source}"
            raise AssertionError(msg)
        row = RECORDS.kept(row)
        row.values += int(got.size)
        row.absolute = 0.0

    def _row(self, what: str, allowed: str, why: str, source: str, unit: str) -> Row:
        source = source or self.source
        for name, text in (("what", what), ("why", why), ("source", source)):
            if not text.strip():
                msg = f"{name} of an outside check is missing"
                raise ValueError(msg)
        caller = sys._getframe(2)
        file = Path(caller.f_code.co_filename).name
        line, slow = caller.f_lineno, RECORDS.slow
        return Row(self.topic, what, allowed, why, source, file, line, unit, slow)


def _pair(what: str, found: Any, expected: Any) -> tuple[Any, Any]:
    got, wanted = np.asarray(found), np.asarray(expected)
    _some(what, got)
    if wanted.shape not in ((), got.shape):
        msg = f"{what}: found values of shape {got.shape}, expected {wanted.shape}"
        raise AssertionError(msg)
    return got, np.broadcast_to(wanted, got.shape)


def _some(what: str, got: Any) -> None:
    if got.size == 0:
        msg = f"{what}: no value to compare, such a check cannot fail"
        raise AssertionError(msg)


def with_unit(text: str, unit: str) -> str:
    """The number and its unit, if it has one."""
    return f"{text} {unit}" if unit else text


def number(value: float, digits: int = 3) -> str:
    """The number to some digits, powers of ten as short as they can be."""
    return re.sub(r"e\+?(-?)0*", r"e\1", f"{value:.{digits}g}")


def size_text(share: float, digits: int = 3) -> str:
    """A share of the expected value: percent, or a power of ten where that says little."""
    return f"{number(100.0 * share, digits)} %" if share >= 1e-4 else number(share, digits)
