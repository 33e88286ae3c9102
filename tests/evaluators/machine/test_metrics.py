"""The registry of metrics says all there is to say about every metric."""

from __future__ import annotations

import re

import machines
import numpy as np
import pytest

from evaluators.analytic.evaluator import AnalyticEvaluator
from evaluators.machine.geometry.variables import VARIABLES
from evaluators.machine.metrics import METRIC, METRICS, Metric

SHORT = {"degC": "C", "r/min": "rpm"}
WITHOUT_SUFFIX = {"1", "money"}  # pure numbers, and the study's currency


def suffix(unit: str) -> str:
    """ "N m/L" is written Nm_L at the end of a name."""
    return "_" + SHORT.get(unit, unit.replace(" ", "").replace("/", "_"))


UNITS = {metric.unit for metric in METRICS} | {variable.unit for variable in VARIABLES}
SUFFIXES = {suffix(unit) for unit in UNITS - WITHOUT_SUFFIX}


def ends_like_a_unit(name: str) -> bool:
    return any(name.endswith(item) for item in SUFFIXES)


@pytest.mark.parametrize("metric", METRICS, ids=lambda metric: metric.name)
def test_every_metric_is_complete(metric: Metric) -> None:
    assert re.fullmatch(r"[a-z][A-Za-z0-9_]*", metric.name)
    assert metric.unit
    assert metric.group
    assert metric.source
    assert len(metric.definition) > 10
    assert not metric.definition.endswith(".")
    assert metric.smaller_is_better in (True, False, None)


@pytest.mark.parametrize("item", [*METRICS, *VARIABLES], ids=lambda item: item.name)
def test_names_end_with_their_unit(item: Metric) -> None:
    if item.unit in WITHOUT_SUFFIX:
        assert not ends_like_a_unit(item.name)
    else:
        assert item.name.endswith(suffix(item.unit))


def test_names_are_unique() -> None:
    names = [metric.name for metric in METRICS] + [variable.name for variable in VARIABLES]
    assert len(set(names)) == len(names)
    assert [METRIC[metric.name] for metric in METRICS] == list(METRICS)


def test_ranges_of_variables() -> None:
    for variable in VARIABLES:
        assert 0.0 < variable.lowest < variable.highest
        assert variable.lowest <= machines.DESIGN[variable.name] <= variable.highest
        low, high = machines.BOUNDS[variable.name]
        assert variable.lowest <= low < high <= variable.highest


def test_unsigned_metrics_are_not_negative() -> None:
    result = AnalyticEvaluator(machines.task()).evaluate(machines.scattered(20, seed=11))
    ok = result.status == "ok"
    assert ok.sum() > 10
    for metric in METRICS:
        if not getattr(metric, "signed", False):
            assert np.all(result.metrics[metric.name][ok] >= 0.0), metric.name


def test_shares_stay_below_one() -> None:
    result = AnalyticEvaluator(machines.task()).evaluate(machines.scattered(20, seed=12))
    ok = result.status == "ok"
    assert (result.metrics["efficiency"][ok] < 1.0).all()
    assert (result.metrics["efficiency"][ok] > 0.5).all()
