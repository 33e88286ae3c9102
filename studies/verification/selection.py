"""Which designs of the fronts are evaluated again, and by what."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from optimizer.fronts import normalise
from studies.comparison.numbers import Comparison, Member
from studies.errors import StudiesError
from studies.problem import MachineProblem

IntArray = NDArray[np.int64]


def nearest_and_extreme(comparison: Comparison, member: Member, count: int) -> IntArray:
    """Rows of a member's front: the `count` nearest to the ideal, and the best of each objective.

    Nearest on the common scale of all families, in the Euclidean sense.
    """
    points = member.stored.front_objectives
    if not len(points):
        return np.zeros(0, dtype=np.int64)
    scaled = normalise(points, comparison.ideal, comparison.nadir)
    nearest = np.argsort((scaled**2).sum(axis=1), kind="stable")[:count]
    return np.unique(np.concatenate([nearest, scaled.argmin(axis=0)])).astype(np.int64)


def read_settings(texts: Sequence[str]) -> dict[str, Any]:
    """Evaluator settings from ``NAME=VALUE``; the value as TOML writes it, or else plain text.

    Raises
    ------
    StudiesError
        If one has no name or no value, or a name comes twice.
    """
    found: dict[str, Any] = {}
    for text in texts:
        name, equals, value = text.partition("=")
        name = name.strip()
        if not equals or not name or not value.strip():
            msg = f"--setting {text!r}: write it as NAME=VALUE, for example refinement=2"
            raise StudiesError(msg)
        if name in found:
            msg = f"--setting {name} is given twice; give it once"
            raise StudiesError(msg)
        try:
            found[name] = tomllib.loads(f"value = {value}")["value"]
        except (tomllib.TOMLDecodeError, RecursionError, ValueError):
            found[name] = value.strip()
    return found


def verifying_problem(
    problem: MachineProblem, evaluator: str, settings: Mapping[str, Any], searched_by: str
) -> MachineProblem:
    """The problem of a family with the evaluator that verifies, checked.

    Parameters
    ----------
    problem : MachineProblem
        As it was searched.
    evaluator : str
        If it is the study's own, the study's settings count unless `settings` replaces them.
    settings : mapping
    searched_by : str
        Version of the evaluator that the archive was made with.

    Raises
    ------
    StudiesError
        If the same evaluator with the same settings made the archive, or it lacks a metric that
        limits or objectives need.
    evaluators.interface.EvaluatorError
        If it is not installed or rejects a setting.
    """
    own = evaluator == problem.evaluator_name
    wanted = {**(problem.evaluator_settings if own else {}), **settings}
    changed = replace(problem, evaluator_name=evaluator, evaluator_settings=wanted, _built={})
    changed.check()
    if own and wanted == problem.evaluator_settings and changed.evaluator.version == searched_by:
        msg = (
            f"the designs were searched with {evaluator} {searched_by} and the same settings, so "
            "there is nothing to verify; name another with --evaluator, or finer settings with "
            "--setting"
        )
        raise StudiesError(msg)
    return changed
