"""Problems and outcomes check themselves."""

from __future__ import annotations

import pickle
import subprocess
import sys

import numpy as np
import pytest

from optimizer.errors import OptimizerError, ProblemError
from optimizer.problem import (
    Column,
    Outcome,
    Variable,
    check_outcome,
    check_problem,
    failed_outcome,
    join_outcomes,
)
from optimizer.settings import Settings


@pytest.mark.parametrize(
    ("lower", "upper", "said"),
    [(2.0, 1.0, "lower bound 2.0 lies above"), (0.0, np.inf, "upper"), (np.nan, 1.0, "lower")],
)
def test_bounds_that_make_no_sense_are_refused(lower: float, upper: float, said: str) -> None:
    with pytest.raises(ProblemError, match=said) as caught:
        Variable("gap_mm", lower, upper)
    assert "gap_mm" in str(caught.value)
    assert isinstance(caught.value, OptimizerError)
    assert isinstance(caught.value, ValueError)


def test_equal_bounds_fix_a_variable() -> None:
    assert Variable("a", 1.0, 1.0).fixed
    assert not Variable("a", 1.0, 2.0).fixed


def test_a_row_with_nan_or_infinity_is_a_failed_row_with_a_reason() -> None:
    outcome = Outcome(
        np.array([[1.0], [np.nan], [1.0], [np.nan], [2.0]]),
        np.array([[0.0], [0.0], [np.inf], [np.nan], [1.0]]),
        np.array(["ok", "ok", "ok", "invalid geometry", "ok"]),
        np.array(["", "", "", "tooth too thin", ""]),
    )
    assert outcome.status.tolist() == ["ok", "failed", "failed", "invalid geometry", "ok"]
    assert outcome.reason.tolist() == [
        "",
        "an objective is not a finite number",
        "a constraint is not a finite number",
        "tooth too thin",
        "",
    ]
    assert outcome.feasible.tolist() == [True, False, False, False, False]


def test_lengths_that_disagree_are_refused() -> None:
    with pytest.raises(ProblemError, match="constraints has 1 rows, objectives have 2"):
        Outcome(np.zeros((2, 1)), np.zeros((1, 1)))
    with pytest.raises(ProblemError, match="column mass_kg has not one value a row"):
        Outcome(np.zeros((2, 1)), np.zeros((2, 0)), columns={"mass_kg": np.zeros((2, 2))})
    with pytest.raises(ProblemError, match="objectives have shape"):
        Outcome(np.zeros(2), np.zeros((2, 0)))


def test_rows_and_joining_are_inverse() -> None:
    outcome = Outcome(
        np.arange(6.0).reshape(3, 2), np.zeros((3, 0)), columns={"a": np.array(["x", "yy", "z"])}
    )
    joined = join_outcomes([outcome.rows(slice(0, 1)), outcome.rows(np.array([1, 2]))])
    assert np.array_equal(joined.objectives, outcome.objectives)
    assert joined.columns["a"].tolist() == ["x", "yy", "z"]
    back = pickle.loads(pickle.dumps(outcome))  # noqa: S301 -- as worker processes do
    assert back.columns["a"].tolist() == ["x", "yy", "z"]
    with pytest.raises(TypeError):
        outcome.columns["b"] = np.zeros(3)


def test_an_outcome_is_held_against_the_problem(plates) -> None:
    x = np.array([[1.0, 4.0, 0.0, 1.0]])
    good = plates.evaluate(x)
    assert check_outcome(plates, 1, good) is good
    with pytest.raises(ProblemError, match=r"objectives of shape \(1, 2\); \(2, 2\)"):
        check_outcome(plates, 2, good)
    short = Outcome(good.objectives, good.constraints, columns={"word": good.columns["word"]})
    with pytest.raises(ProblemError, match="missing: rest_mm2; not declared: none"):
        check_outcome(plates, 1, short)
    check_outcome(plates, 3, failed_outcome(plates, 3, "no reason"))


def test_a_problem_without_choice_or_with_a_name_twice_is_refused(plates) -> None:
    check_problem(plates)
    plates.objectives = ("near", "near")
    with pytest.raises(ProblemError, match="objective name near is used twice"):
        check_problem(plates)
    plates.objectives = ()
    with pytest.raises(ProblemError, match="at least one objective"):
        check_problem(plates)
    plates.objectives = ("near",)
    plates.columns = (Column("x_mm"),)
    with pytest.raises(ProblemError, match="column name x_mm"):
        check_problem(plates)
    plates.variables = (Variable("a", 1.0, 1.0),)
    with pytest.raises(ProblemError, match="at least one variable"):
        check_problem(plates)


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("budget", 0),
        ("seed", -1),
        ("chunk", 0),
        ("population", 2),
        ("budget", 1.5),
        ("seed", 2**63),
    ],
)
def test_settings_out_of_range_are_refused(name: str, value: object) -> None:
    with pytest.raises(ProblemError, match=f"{name} is"):
        Settings(**{"budget": 100, name: value})


def test_importing_the_problem_imports_no_heavy_library() -> None:
    # A study file is checked far more often than searched; these take most of a second.
    code = "import sys, optimizer.problem; print([m for m in ('pymoo', 'moocore', 'pyarrow',"
    code += " 'joblib', 'scipy') if m in sys.modules])"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
