"""The contract between whoever searches and whatever evaluates a machine.

An evaluator is built once for a `Task` (one family with its duty, materials and prices) and then
receives batches of designs: batch in, batch out.

Contract, held by the conformance suite in `tests/evaluators/conformance.py`:

* Pure: the same designs give the same numbers, bit for bit, whatever was evaluated before; inputs
  are never modified.
* Batch: `designs` maps every name of `evaluators.machine.geometry.variables.VARIABLES` to an
  array (n,) in the unit its suffix states. The result has n rows in the same order.
* Failure is data: a design that is no real cross-section, or that the model cannot solve, is a row
  with a status other than ``ok``, a reason of one sentence, and NaN in every metric. An exception
  leaves `evaluate` only for a programming or calling error (a missing variable, unequal lengths).
* Complete: a row with status ``ok`` holds a finite number in every metric of `metrics`.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from enum import StrEnum
from importlib.metadata import EntryPoint, entry_points
from typing import Protocol, cast, runtime_checkable

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.task.task import Task

FloatArray = NDArray[np.float64]

ENTRY_POINT_GROUP = "hovergap.evaluators"


class Status(StrEnum):
    """What became of one evaluation; the words that stand in the archive."""

    OK = "ok"
    INVALID_GEOMETRY = "invalid geometry"
    FAILED = "failed"
    TIMED_OUT = "timed out"


class Capability(StrEnum):
    """What an evaluator can do beyond the metrics themselves."""

    SATURATION = "saturation"
    WAVEFORMS = "waveforms"
    EDDY_CURRENTS = "eddy currents"
    NONLINEAR_FORCE = "nonlinear force"


@dataclass(frozen=True)
class Evaluations:
    """Results of a batch of n designs.

    Attributes
    ----------
    metrics : mapping from metric name to array (n,)
        In the unit of the name's suffix; NaN in rows whose status is not ``ok``.
    status : array (n,) of str
        Values of `Status`.
    reason : array (n,) of str
        One sentence for a row that is not ``ok``, else empty.
    """

    metrics: Mapping[str, FloatArray]
    status: NDArray[np.str_]
    reason: NDArray[np.str_]

    def __post_init__(self) -> None:
        rows = self.status.shape
        if len(rows) != 1 or self.reason.shape != rows:
            msg = f"status {self.status.shape} and reason {self.reason.shape} must both be (n,)"
            raise ValueError(msg)
        wrong = [name for name, values in self.metrics.items() if values.shape != rows]
        if wrong:
            msg = f"metrics {', '.join(wrong)} must have shape {rows}"
            raise ValueError(msg)


@dataclass(frozen=True)
class Waveform:
    """One quantity of one design over rotor position (or over another stated axis)."""

    name: str
    unit: str
    axis: str
    positions: FloatArray
    values: FloatArray


@runtime_checkable
class Evaluator(Protocol):
    """A machine model bound to one task; see the module text for the contract."""

    name: str
    version: str
    capabilities: frozenset[Capability]

    @property
    def metrics(self) -> tuple[str, ...]:
        """Names of all metrics this evaluator returns, in the registry's order."""
        ...

    def evaluate(self, designs: Mapping[str, FloatArray]) -> Evaluations:
        """Evaluate n designs; arrays (n,) in, metrics (n,) out."""
        ...

    def waveforms(self, design: Mapping[str, float]) -> tuple[Waveform, ...]:
        """Waveforms of one design over one whole turn of the rotor."""
        ...


EvaluatorFactory = Callable[[Task, Mapping[str, object]], Evaluator]


class EvaluatorError(ValueError):
    """An evaluator is unknown, cannot be loaded, or does not accept its settings."""


class ConsentError(EvaluatorError):
    """An evaluator would start a program that the user has not allowed."""


@runtime_checkable
class StartsProgram(Protocol):
    """What an evaluator adds that starts a program named in its settings.

    A study file must not start programs on its own: such an evaluator starts nothing, and raises
    `ConsentError`, until `allow_program` was called.
    """

    @property
    def program(self) -> tuple[str, ...]:
        """The program and its arguments."""
        ...

    def allow_program(self) -> None:
        """Give the user's consent; raises `EvaluatorError` if there is no such program."""
        ...


def installed() -> dict[str, EntryPoint]:
    """Evaluators found by entry point, this package's own and third parties' alike."""
    return {point.name: point for point in entry_points(group=ENTRY_POINT_GROUP)}


def build(
    name: str,
    task: Task,
    settings: Mapping[str, object] | None = None,
    allow_program: bool = False,
) -> Evaluator:
    """Build the evaluator called `name` for `task`.

    Parameters
    ----------
    allow_program : bool
        The user's consent to start the program that the settings name, see `StartsProgram`.

    Raises
    ------
    EvaluatorError
        If no such evaluator is installed, it cannot be loaded, or it rejects a setting.
    """
    found = installed()
    if name not in found:
        known = ", ".join(sorted(found)) or "none; is hovergap installed?"
        msg = f"no evaluator is called {name!r}; installed are: {known}"
        raise EvaluatorError(msg)
    try:
        factory = cast("EvaluatorFactory", found[name].load())
        evaluator = factory(task, dict(settings or {}))
    except EvaluatorError:
        raise
    except Exception as error:  # others' code, which raises anything
        text = " ".join(f"{type(error).__name__}: {error}".split()).rstrip(": ")
        msg = f"the evaluator {name!r} ({found[name].value}) cannot be built: {text}"
        raise EvaluatorError(msg) from error
    if allow_program and isinstance(evaluator, StartsProgram):
        evaluator.allow_program()
    return evaluator
