"""The analytic evaluator keeps the contract of all evaluators."""

from __future__ import annotations

import pytest
from conformance import EvaluatorConformance
from machines import FAMILIES

from evaluators.analytic.evaluator import AnalyticEvaluator
from evaluators.machine.task.task import Task


@pytest.mark.parametrize("numbers", FAMILIES, ids=str, scope="class")
class TestAnalytic(EvaluatorConformance):
    name = "analytic"
    bad_settings = (
        {"no_such_setting": 1},
        {"slot_modes": 0},
        {"slot_modes": 10**9},
        {"reach": 2.5},
        {"positions": True},
        {"highest_order": "many"},
    )

    def build(self, task: Task) -> AnalyticEvaluator:
        return AnalyticEvaluator(task)
