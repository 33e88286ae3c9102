"""The screening evaluator behind the interface."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import fields, replace
from typing import cast

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic.model import AnalyticModel, Resolution
from evaluators.analytic.waveforms import waveforms
from evaluators.batching import Batch
from evaluators.interface import Capability, Evaluations, EvaluatorError, Waveform
from evaluators.machine.metrics import METRICS
from evaluators.machine.performance import performance
from evaluators.machine.task.task import Task

FloatArray = NDArray[np.float64]

FINEST = {"slot_modes": 32, "reach": 64, "highest_order": 1024, "positions": 360}
"""Largest settings: results stand long before, while memory grows with their product."""


class AnalyticEvaluator:
    """Closed-form fields of the slotted gap with saturation by describing functions.

    Settings: the fields of `evaluators.analytic.model.Resolution`.
    """

    name = "analytic"
    version = "1"
    capabilities = frozenset({Capability.SATURATION, Capability.WAVEFORMS})

    def __init__(self, task: Task, settings: Mapping[str, object] | None = None) -> None:
        self.task = task
        self.model = AnalyticModel(task, _resolution(dict(settings or {})))

    @property
    def metrics(self) -> tuple[str, ...]:
        """All metrics of the registry."""
        return tuple(metric.name for metric in METRICS)

    def evaluate(self, designs: Mapping[str, FloatArray]) -> Evaluations:
        """Evaluate n designs; see `evaluators.interface`."""
        batch = Batch(self.task, designs, self.metrics)
        if len(batch):
            field = self.model.solve(batch.sections, batch.exciting)
            done = performance(self.task, batch.sections, batch.exciting, field)
            batch.settle(np.arange(len(batch)), done.metrics, done.reasons)
        return batch.evaluations()

    def waveforms(self, design: Mapping[str, float]) -> tuple[Waveform, ...]:
        """Torque, cogging, force, EMF, tooth and yoke density over one turn.

        Raises
        ------
        ValueError
            If the design has no cross-section.
        """
        return waveforms(self.model, design)


def _resolution(settings: dict[str, object]) -> Resolution:
    known = {item.name for item in fields(Resolution)}
    default = Resolution()
    for name, value in settings.items():
        if name not in known:
            msg = (
                f"the analytic evaluator has no setting {name!r}; it has {', '.join(sorted(known))}"
            )
            raise EvaluatorError(msg)
        whole = isinstance(value, int) and not isinstance(value, bool)
        if not whole or not 1 <= cast("int", value) <= FINEST[name]:
            msg = f"setting {name} = {value!r} must be a whole number from 1 to {FINEST[name]}"
            raise EvaluatorError(msg)
        default = replace(default, **{name: cast("int", value)})
    return default
