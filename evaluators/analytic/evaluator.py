"""The screening evaluator behind the interface."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import fields, replace
from typing import cast

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic.model import AnalyticModel, Resolution
from evaluators.analytic.waveforms import waveforms
from evaluators.interface import Capability, Evaluations, EvaluatorError, Status, Waveform
from evaluators.machine.field import excitation
from evaluators.machine.geometry.cross_sections import batch_length, cross_sections
from evaluators.machine.metrics import METRICS
from evaluators.machine.performance import performance
from evaluators.machine.task.task import Task

FloatArray = NDArray[np.float64]

PER_MM2 = 1e6
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
        rows = batch_length(designs)
        task = self.task
        sections, valid, reasons = cross_sections(task.winding.family, designs, task.construction)
        result = {name: np.full(rows, np.nan) for name in self.metrics}
        reason = reasons.astype(object)
        status = np.full(rows, Status.INVALID_GEOMETRY.value, dtype=object)
        if valid.size:
            density = np.asarray(designs["current_density_A_mm2"], dtype=np.float64)[valid]
            exciting = excitation(sections, density * PER_MM2, task.duty, task.construction)
            field = self.model.solve(sections, exciting)
            done = performance(task, sections, exciting, field)
            values = np.array([done.metrics[name] for name in self.metrics])
            finite = np.all(np.isfinite(values), axis=0)
            status[valid] = np.where(finite, Status.OK.value, Status.FAILED.value)
            reason[valid] = np.where(
                finite | (done.reasons != ""), done.reasons, "a metric is not a finite number"
            )
            for name, column in zip(self.metrics, values, strict=True):
                result[name][valid] = np.where(finite, column, np.nan)
        return Evaluations(
            metrics=result, status=status.astype(np.str_), reason=reason.astype(np.str_)
        )

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
