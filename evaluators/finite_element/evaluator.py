"""The finite-element evaluator behind the interface."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import fields

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element import analysis
from evaluators.finite_element.mesh.geometry import MeshError
from evaluators.finite_element.model import FieldModel
from evaluators.finite_element.outcome.waveforms import waveforms
from evaluators.finite_element.settings import read_settings
from evaluators.finite_element.solution.lanes import LANES
from evaluators.interface import Capability, Evaluations, Status, Waveform
from evaluators.machine.field import Excitation, FieldSolution, excitation
from evaluators.machine.geometry.cross_sections import CrossSections, batch_length, cross_sections
from evaluators.machine.metrics import METRICS
from evaluators.machine.performance import performance
from evaluators.machine.task.task import Task

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

PER_MM2 = 1e6


class FiniteElementEvaluator:
    """Nonlinear 2-D finite elements over the turn, `LANES` designs at a time.

    Settings: see `evaluators.finite_element.settings`.
    """

    name = "finite_element"
    version = "1"
    capabilities = frozenset(
        {
            Capability.SATURATION,
            Capability.WAVEFORMS,
            Capability.EDDY_CURRENTS,
            Capability.NONLINEAR_FORCE,
        }
    )

    def __init__(self, task: Task, settings: Mapping[str, object] | None = None) -> None:
        self.task = task
        self.settings = dict(settings or {})
        self.model = FieldModel(task, read_settings(self.settings))

    def __reduce__(self) -> tuple[object, ...]:
        # The tables of the model are made again where they arrive.
        return FiniteElementEvaluator, (self.task, self.settings)

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
        density = np.asarray(designs["current_density_A_mm2"], dtype=np.float64)[valid]
        exciting = excitation(sections, density * PER_MM2, task.duty, task.construction)
        for first in range(0, valid.size, LANES):
            chosen = np.arange(first, min(first + LANES, valid.size))
            padded = np.resize(chosen, LANES)
            row = valid[chosen]
            part, current = sections.rows(padded), _rows(exciting, padded)
            try:
                fields_of_batch = analysis.solve(self.model, part, current)
            except MeshError as error:
                status[row] = Status.FAILED.value
                reason[row] = str(error)
                continue
            found = analysis.evaluate(fields_of_batch, current)
            done = performance(task, part, current, found.field)
            values = np.array([done.metrics[name] for name in self.metrics])[:, : chosen.size]
            words = done.reasons[: chosen.size].astype(object)
            words[~found.converged[: chosen.size]] = (
                "the field did not converge within the allowed Newton iterations"
            )
            good = np.all(np.isfinite(values), axis=0) & (words == "")
            words[~good & (words == "")] = "a metric is not a finite number"
            status[row] = np.where(good, Status.OK.value, Status.FAILED.value)
            reason[row] = words
            for name, column in zip(self.metrics, values, strict=True):
                result[name][row] = np.where(good, column, np.nan)
        return Evaluations(
            metrics=result, status=status.astype(np.str_), reason=reason.astype(np.str_)
        )

    def field_solution(self, sections: CrossSections, exciting: Excitation) -> FieldSolution:
        """Field quantities of n cross-sections, (n,) each, without the metrics made of them."""
        parts = []
        for first in range(0, len(sections), LANES):
            padded = np.resize(np.arange(first, min(first + LANES, len(sections))), LANES)
            current = _rows(exciting, padded)
            solved = analysis.solve(self.model, sections.rows(padded), current)
            parts.append(analysis.evaluate(solved, current).field)
        return FieldSolution(
            **{
                item.name: np.concatenate([getattr(part, item.name) for part in parts])[
                    : len(sections)
                ]
                for item in fields(FieldSolution)
                if getattr(parts[0], item.name) is not None
            }
        )

    def waveforms(self, design: Mapping[str, float]) -> tuple[Waveform, ...]:
        """Waveforms of one design over one turn of the rotor.

        Raises
        ------
        ValueError
            If the design has no cross-section.
        """
        return waveforms(self.model, design)


def _rows(exciting: Excitation, rows: IntArray) -> Excitation:
    return Excitation(torque=exciting.torque[rows], suspension=exciting.suspension[rows])
