"""Settings of the evaluator as a study gives them."""

from __future__ import annotations

import os
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from math import isfinite
from typing import Any, Literal, cast

from evaluators.external.wording import quoted
from evaluators.interface import EvaluatorError
from evaluators.machine.metrics import METRIC, METRICS

LONGEST_TIMEOUT_S = 30 * 24 * 3600.0
MOST_ARGUMENTS = 64
LONGEST_ARGUMENT = 4096
LONGEST_VERSION = 64
KEPT = ("failed", "all", "none")
Keep = Literal["failed", "all", "none"]


@dataclass(frozen=True)
class ExternalSettings:
    """How the program is run and what it returns.

    Attributes
    ----------
    program : tuple of str
        The program and its arguments; no shell reads them.
    timeout_s : float
        Time limit of one design.
    retries : int
        Further runs after one that crashed or left an unusable reply.
    concurrency : int or None
        Most runs at a time over all processes of this user on this machine; None for no limit.
    folder : str
        Where each design gets its working folder; empty for the system's temporary files.
    keep : str
        Which working folders stay: ``failed``, ``all`` or ``none``.
    kept_failures : int
        Most failed ones that one process leaves behind.
    field : bool
        Whether the program returns all field quantities, from which the metrics are made.
    metrics : tuple of str
        Metrics the program returns itself, instead of or beside those made from the field.
    drawing : bool
        Whether the program gets the cross-section as DXF, too.
    version : str
        Of the program, kept with every evaluation.
    """

    program: tuple[str, ...]
    timeout_s: float = 600.0
    retries: int = 0
    concurrency: int | None = None
    folder: str = ""
    keep: Keep = "failed"
    kept_failures: int = 20
    field: bool = True
    metrics: tuple[str, ...] = ()
    drawing: bool = False
    version: str = ""


def read_settings(settings: Mapping[str, object]) -> ExternalSettings:
    """Settings from a study's table.

    Raises
    ------
    EvaluatorError
        If one is unknown, missing or out of its range.
    """
    for name, value in settings.items():
        if name not in _CHECKS:
            msg = (
                f"the external evaluator has no setting {quoted(name)}; it has {', '.join(_CHECKS)}"
            )
            raise EvaluatorError(msg)
        wanted, check = _CHECKS[name]
        if not check(value):
            msg = f"setting {name} = {quoted(value)} must be {wanted}"
            raise EvaluatorError(msg)
    if "program" not in settings:
        msg = 'the external evaluator needs the setting program = ["/path/to/solver", ...]'
        raise EvaluatorError(msg)
    values: dict[str, Any] = dict(settings)
    for name in ("program", "metrics"):
        values[name] = tuple(values.get(name, ()))
    values["timeout_s"] = float(values.get("timeout_s", ExternalSettings.timeout_s))
    wanted_metrics = set(values["metrics"])
    values["metrics"] = tuple(item.name for item in METRICS if item.name in wanted_metrics)
    read = ExternalSettings(**values)
    if not read.field and not read.metrics:
        msg = "with field = false the setting metrics must name what the program returns"
        raise EvaluatorError(msg)
    return read


def _text(value: object, longest: int) -> bool:
    if not isinstance(value, str) or len(value) > longest:
        return False
    try:
        os.fsencode(value)
    except UnicodeEncodeError:
        return False
    return value.isprintable()


def _program(value: object) -> bool:
    return (
        isinstance(value, list | tuple)
        and 0 < len(value) <= MOST_ARGUMENTS
        and all(_text(item, LONGEST_ARGUMENT) for item in value)
        and bool(value[0])
    )


def _metrics(value: object) -> bool:
    return (
        isinstance(value, list | tuple)
        and all(isinstance(item, str) and item in METRIC for item in value)
        and len(set(cast("list[str]", value))) == len(value)
    )


def _whole(low: int, high: int) -> Callable[[object], bool]:
    def check(value: object) -> bool:
        return isinstance(value, int) and not isinstance(value, bool) and low <= value <= high

    return check


def _seconds(value: object) -> bool:
    if isinstance(value, bool) or not isinstance(value, int | float):
        return False
    return isfinite(value) and 0.01 <= value <= LONGEST_TIMEOUT_S


_CHECKS: dict[str, tuple[str, Callable[[object], bool]]] = {
    "program": (
        f"a list of at most {MOST_ARGUMENTS} printable texts, the program and its arguments",
        _program,
    ),
    "timeout_s": (f"a number of seconds from 0.01 to {LONGEST_TIMEOUT_S:.0f}", _seconds),
    "retries": ("a whole number from 0 to 10", _whole(0, 10)),
    "concurrency": ("a whole number from 1 to 1000", _whole(1, 1000)),
    "folder": ("the path of a folder", lambda value: _text(value, LONGEST_ARGUMENT)),
    "keep": (f"one of {', '.join(KEPT)}", lambda value: value in KEPT),
    "kept_failures": ("a whole number from 0 to 100000", _whole(0, 100_000)),
    "field": ("true or false", lambda value: isinstance(value, bool)),
    "metrics": ("a list of different metric names; `hovergap metrics` lists them", _metrics),
    "drawing": ("true or false", lambda value: isinstance(value, bool)),
    "version": (
        f"printable text of at most {LONGEST_VERSION} characters",
        lambda value: _text(value, LONGEST_VERSION),
    ),
}
