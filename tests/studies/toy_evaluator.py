"""A quick invented evaluator for tests of the study room; its numbers follow no physics.

Settings: every call makes the file ``begun`` and sleeps for ``delay_s``; designs with a rotor
radius above ``invalid_above_mm`` are rows with a reason; only ``metrics`` are returned.
"""

from __future__ import annotations

import time
from collections.abc import Mapping
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from evaluators.interface import Capability, Evaluations, EvaluatorError, Status, Waveform
from evaluators.machine.metrics import METRICS
from evaluators.machine.task.task import Task

FloatArray = NDArray[np.float64]
SETTINGS = ("begun", "delay_s", "invalid_above_mm", "metrics")


class ToyEvaluator:
    name = "toy"
    version = "1"
    capabilities: frozenset[Capability] = frozenset()

    def __init__(self, task: Task, settings: Mapping[str, object]) -> None:
        unknown = sorted(set(settings) - set(SETTINGS))
        if unknown:
            msg = f"evaluator toy: there is no setting {unknown[0]!r}; known are {SETTINGS}"
            raise EvaluatorError(msg)
        self.task = task
        self.delay = float(settings.get("delay_s", 0.0))  # type: ignore[arg-type]
        self.begun = str(settings.get("begun", ""))
        self.invalid_above = float(settings.get("invalid_above_mm", 1e9))  # type: ignore[arg-type]
        wanted = settings.get("metrics", [item.name for item in METRICS])
        self.names = tuple(wanted)  # type: ignore[arg-type]

    @property
    def metrics(self) -> tuple[str, ...]:
        return self.names

    def evaluate(self, designs: Mapping[str, FloatArray]) -> Evaluations:
        if self.begun:
            Path(self.begun).touch()
        time.sleep(self.delay)
        radius = designs["rotor_radius_mm"]
        density = designs["current_density_A_mm2"]
        arc = designs["magnet_arc_ratio"]
        slots = self.task.winding.family.slots
        special = {
            # Copper wants large rotors and cost small ones, so that fronts hold both.
            "loss_copper_W": 200.0 * density**2 / radius,
            "loss_iron_W": radius,
            "loss_total_W": 200.0 * density**2 / radius + radius,
            "cost": radius**2 / density,
            "ripple_index": 1.0 + (arc - 0.8) ** 2 * slots + 0.01 * radius,
            "efficiency": 1.0 / (1.0 + 1e-4 * density**2),
            "tip_speed_m_s": radius * 1e-3 * self.task.duty.speed,
        }
        good = radius <= self.invalid_above
        metrics = {}
        for position, name in enumerate(self.names):
            values = special.get(name, 0.1 * (position + 1) * np.ones_like(radius))
            metrics[name] = np.where(good, values, np.nan)
        return Evaluations(
            metrics=metrics,
            status=np.where(good, Status.OK.value, Status.INVALID_GEOMETRY.value),
            reason=np.where(good, "", "the rotor is too large for the toy"),
        )

    def waveforms(self, design: Mapping[str, float]) -> tuple[Waveform, ...]:
        del design
        return ()


class FinerToyEvaluator(ToyEvaluator):
    """Another opinion: a tenth more loss, tips half as fast again."""

    name = "toy_finer"

    def evaluate(self, designs: Mapping[str, FloatArray]) -> Evaluations:
        found = super().evaluate(designs)
        factors = {"loss_total_W": 1.1, "tip_speed_m_s": 1.5}
        metrics = {name: values * factors.get(name, 1.0) for name, values in found.metrics.items()}
        return Evaluations(metrics, found.status, found.reason)


class BrokenToyEvaluator(ToyEvaluator):
    """A third party's mistake."""

    name = "toy_broken"

    def __init__(self, task: Task, settings: Mapping[str, object]) -> None:
        super().__init__(task, settings)
        raise LookupError("no licence\n for this machine")
