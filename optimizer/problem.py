"""What is searched, and what one batch of evaluations returns: arrays with names."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from optimizer.errors import ProblemError

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
IntArray = NDArray[np.int64]
TextArray = NDArray[np.str_]
AnyArray = NDArray[Any]

OK = "ok"
FAILED = "failed"
LARGEST_INTEGER = 2**31 - 1
COLUMN_KINDS = ("float64", "int64", "bool", "string")


@dataclass(frozen=True)
class Variable:
    """One searched quantity and its bounds; equal bounds fix it.

    Parameters
    ----------
    name : str
        Name of its archive column, with the unit as suffix.
    lower, upper : float
        Bounds, both included, in the unit of the suffix.
    integer : bool
        Whether only whole numbers are asked for; they are stored as floats all the same.

    Raises
    ------
    ProblemError
        If the name is empty, a bound is not finite or the bounds are reversed, or those of an
        integer are no whole numbers below 2^31 in size.
    """

    name: str
    lower: float
    upper: float
    integer: bool = False

    def __post_init__(self) -> None:
        if not self.name:
            msg = "a variable needs a name"
            raise ProblemError(msg)
        for label, value in (("lower", self.lower), ("upper", self.upper)):
            if not math.isfinite(value):
                msg = f"variable {self.name}: {label} bound {value} is not a finite number"
                raise ProblemError(msg)
        if self.lower > self.upper:
            msg = (
                f"variable {self.name}: lower bound {self.lower} lies above upper bound"
                f" {self.upper}; exchange them"
            )
            raise ProblemError(msg)
        for value in (self.lower, self.upper):
            if self.integer and (value != round(value) or abs(value) > LARGEST_INTEGER):
                msg = (
                    f"variable {self.name}: bound {value} of an integer is not a whole number"
                    f" from -{LARGEST_INTEGER} to {LARGEST_INTEGER}"
                )
                raise ProblemError(msg)

    @property
    def fixed(self) -> bool:
        """Whether the bounds leave no choice."""
        return self.lower == self.upper


@dataclass(frozen=True)
class Column:
    """What an archive column holds; stored beside it in every Parquet part.

    Parameters
    ----------
    name : str
        Column name, with the unit as suffix.
    unit : str
        Unit in words of the trade, empty for a plain number.
    role : str
        What the column is to the study, for example ``"metric"``.
    description : str
        One sentence.
    kind : str
        One of ``COLUMN_KINDS``. A failed row may hold NaN in a numeric column.
    """

    name: str
    unit: str = ""
    role: str = "metric"
    description: str = ""
    kind: str = "float64"

    def __post_init__(self) -> None:
        if not self.name:
            msg = "a column needs a name"
            raise ProblemError(msg)
        if self.kind not in COLUMN_KINDS:
            msg = f"column {self.name}: kind {self.kind!r} is none of {', '.join(COLUMN_KINDS)}"
            raise ProblemError(msg)


@dataclass(frozen=True, eq=False)
class Outcome:
    """What a batch of n designs gave.

    A row whose status is ``"ok"`` but whose objectives or constraints are not all finite is
    turned into a failed row that says so: nothing of it may steer the search.

    Parameters
    ----------
    objectives : (n, m) array
        All minimised.
    constraints : (n, k) array
        Dimensionless, feasible where <= 0.
    status : (n,) array of str
        ``"ok"``, or any other word for a row that failed. Default: all ``"ok"``.
    reason : (n,) array of str
        Why a row failed, empty where it did not. Default: all empty.
    columns : mapping of name to (n,) array
        What else is stored per row.

    Raises
    ------
    ProblemError
        If the lengths disagree.
    """

    objectives: FloatArray
    constraints: FloatArray
    status: TextArray = field(default_factory=lambda: np.zeros(0, dtype="U1"))
    reason: TextArray = field(default_factory=lambda: np.zeros(0, dtype="U1"))
    columns: Mapping[str, AnyArray] = field(default_factory=dict)

    def __post_init__(self) -> None:
        objectives = _matrix("objectives", self.objectives)
        rows = len(objectives)
        constraints = _matrix("constraints", self.constraints)
        if constraints.size == 0 and len(constraints) != rows:
            constraints = np.zeros((rows, 0))
        status = np.asarray(self.status, dtype=np.str_)
        reason = np.asarray(self.reason, dtype=np.str_)
        status = status if status.size or not rows else np.full(rows, OK)
        reason = reason if reason.size or not rows else np.full(rows, "")
        columns = {name: np.asarray(values) for name, values in self.columns.items()}
        lengths = {"constraints": len(constraints), "status": len(status), "reason": len(reason)}
        lengths |= {f"column {name}": len(v) if v.ndim == 1 else -1 for name, v in columns.items()}
        for label, length in lengths.items():
            if length != rows:
                found = "not one value a row" if length < 0 else f"{length} rows"
                msg = f"outcome: {label} has {found}, objectives have {rows} rows"
                raise ProblemError(msg)
        for text, values in (
            ("an objective is not a finite number", objectives),
            ("a constraint is not a finite number", constraints),
        ):
            bad = (status == OK) & ~np.isfinite(values).all(axis=1)
            if bad.any():
                status, reason = np.where(bad, FAILED, status), np.where(bad, text, reason)
        object.__setattr__(self, "objectives", objectives)
        object.__setattr__(self, "constraints", constraints)
        object.__setattr__(self, "status", status)
        object.__setattr__(self, "reason", reason)
        object.__setattr__(self, "columns", MappingProxyType(columns))

    def __len__(self) -> int:
        return len(self.objectives)

    def __getstate__(self) -> dict[str, Any]:
        # A mapping proxy does not pickle, and outcomes travel between processes.
        return {**self.__dict__, "columns": dict(self.columns)}

    def __setstate__(self, state: dict[str, Any]) -> None:
        for name, value in state.items():
            object.__setattr__(self, name, value)

    @property
    def ok(self) -> BoolArray:
        """Mask (n,) of the rows that were evaluated."""
        return np.asarray(self.status == OK)

    @property
    def feasible(self) -> BoolArray:
        """Mask (n,) of the rows that were evaluated and meet every constraint."""
        # A failed row may hold NaN, which no comparison accepts.
        return self.ok & (self.constraints <= 0.0).all(axis=1)

    def rows(self, chosen: Any) -> Outcome:
        """Return the chosen rows: a slice, a mask or indices."""
        return Outcome(
            self.objectives[chosen],
            self.constraints[chosen],
            self.status[chosen],
            self.reason[chosen],
            {name: values[chosen] for name, values in self.columns.items()},
        )


class Described(Protocol):
    """What an outcome consists of."""

    @property
    def objectives(self) -> tuple[str, ...]:
        """Names of the objectives, all minimised."""

    @property
    def constraints(self) -> tuple[str, ...]:
        """Names of the constraints, each feasible at <= 0."""

    @property
    def columns(self) -> tuple[Column, ...]:
        """Further columns every outcome carries."""


class Problem(Described, Protocol):
    """What the search needs to know; ``evaluate`` is pure and picklable.

    Pure means that the same ``x`` always gives the same outcome: an interrupted study evaluates
    a lost chunk again. The object is sent once to each worker process.
    """

    @property
    def variables(self) -> tuple[Variable, ...]:
        """Searched quantities in the order of the columns of ``x``."""

    def evaluate(self, x: FloatArray) -> Outcome:
        """Evaluate designs ``x`` (n, v) within the bounds."""


def names_of_columns(problem: Problem) -> list[str]:
    """Names of the variables and of the further columns, which share one table."""
    return [v.name for v in problem.variables] + [c.name for c in problem.columns]


def check_problem(problem: Problem) -> None:
    """Check names before anything is spent.

    Raises
    ------
    ProblemError
        If there is nothing to search or to minimise, or a name is used twice.
    """
    if not problem.objectives:
        msg = "a problem needs at least one objective"
        raise ProblemError(msg)
    if all(variable.fixed for variable in problem.variables):
        msg = "a problem needs at least one variable whose lower bound lies below its upper bound"
        raise ProblemError(msg)
    for label, names in (
        ("objective", problem.objectives),
        ("constraint", problem.constraints),
        ("column", names_of_columns(problem)),
    ):
        twice = sorted({name for name in names if names.count(name) > 1})
        if twice:
            msg = f"{label} name {twice[0]} is used twice; every {label} needs its own name"
            raise ProblemError(msg)


def check_outcome(problem: Problem, rows: int, outcome: Outcome) -> Outcome:
    """Return ``outcome`` if it answers ``rows`` designs of ``problem``.

    Raises
    ------
    ProblemError
        If a shape or a column is not what the problem declares.
    """
    wanted = {
        "objectives": (outcome.objectives.shape, (rows, len(problem.objectives))),
        "constraints": (outcome.constraints.shape, (rows, len(problem.constraints))),
    }
    for label, (found, right) in wanted.items():
        if found != right:
            msg = f"evaluate returned {label} of shape {found}; {right} is declared"
            raise ProblemError(msg)
    declared = {column.name for column in problem.columns}
    if declared != set(outcome.columns):
        missing = sorted(declared - set(outcome.columns)) or ["none"]
        extra = sorted(set(outcome.columns) - declared) or ["none"]
        msg = (
            "evaluate returned other columns than declared;"
            f" missing: {', '.join(missing)}; not declared: {', '.join(extra)}"
        )
        raise ProblemError(msg)
    return outcome


def failed_outcome(problem: Described, rows: int, reason: str, status: str = FAILED) -> Outcome:
    """Rows that failed for one reason: NaN numbers, empty texts, false flags."""
    blanks: dict[str, tuple[Any, Any]] = {"bool": (False, np.bool_), "string": ("", np.str_)}
    columns = {}
    for column in problem.columns:
        value, dtype = blanks.get(column.kind, (np.nan, np.float64))
        columns[column.name] = np.full(rows, value, dtype=dtype)
    return Outcome(
        np.full((rows, len(problem.objectives)), np.nan),
        np.full((rows, len(problem.constraints)), np.nan),
        np.full(rows, status),
        np.full(rows, reason),
        columns,
    )


def join_outcomes(outcomes: list[Outcome]) -> Outcome:
    """Put outcomes of one problem one below the other."""
    first = outcomes[0]
    return Outcome(
        np.concatenate([o.objectives for o in outcomes]),
        np.concatenate([o.constraints for o in outcomes]),
        np.concatenate([o.status for o in outcomes]),
        np.concatenate([o.reason for o in outcomes]),
        {n: np.concatenate([o.columns[n] for o in outcomes]) for n in first.columns},
    )


def _matrix(label: str, values: Any) -> FloatArray:
    matrix = np.asarray(values, dtype=np.float64)
    if matrix.ndim != 2:
        msg = f"outcome: {label} have shape {matrix.shape}; one row a design is wanted"
        raise ProblemError(msg)
    return matrix
