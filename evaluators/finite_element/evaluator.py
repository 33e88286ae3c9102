"""The finite-element evaluator behind the interface."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

import numpy as np
from numpy.typing import NDArray

from evaluators.batching import Batch
from evaluators.finite_element import analysis
from evaluators.finite_element.mesh.geometry import MeshError
from evaluators.finite_element.model import FieldModel
from evaluators.finite_element.outcome.waveforms import waveforms
from evaluators.finite_element.settings import read_settings
from evaluators.finite_element.solution.lanes import LANES
from evaluators.interface import Capability, Evaluations, Waveform
from evaluators.machine.field import Excitation, FieldSolution
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.metrics import METRICS
from evaluators.machine.performance import performance
from evaluators.machine.task.task import Task

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

NOT_CONVERGED = "the field did not converge within the allowed Newton iterations"


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
        batch = Batch(self.task, designs, self.metrics)
        for some in _lanes(len(batch)):
            for places, result in self._results(batch.sections, batch.exciting, some):
                if isinstance(result, str):
                    batch.fail(places, result)
                    continue
                # All lanes each time, so that no row depends on how many there are.
                lanes, kept = np.resize(places, LANES), slice(places.size)
                done = performance(
                    self.task,
                    batch.sections.rows(lanes),
                    batch.exciting.rows(lanes),
                    result.field,
                )
                metrics = {name: column[kept] for name, column in done.metrics.items()}
                reasons = np.where(result.converged, done.reasons, NOT_CONVERGED)
                batch.settle(places, metrics, reasons[kept])
        return batch.evaluations()

    def _results(
        self, sections: CrossSections, exciting: Excitation, places: IntArray
    ) -> Iterator[tuple[IntArray, analysis.Result | str]]:
        """Results of the designs at up to LANES `places`, or why there is none.

        A design that cannot be meshed is found by solving each one by itself.
        """
        padded = np.resize(places, LANES)
        current = exciting.rows(padded)
        try:
            solved = analysis.solve(self.model, sections.rows(padded), current)
        except MeshError as error:
            if places.size == 1:
                yield places, str(error)
                return
            for place in places:
                yield from self._results(sections, exciting, np.array([place]))
            return
        yield places, analysis.evaluate(solved, current)

    def field_solution(self, sections: CrossSections, exciting: Excitation) -> FieldSolution:
        """Field quantities of n cross-sections, (n,) each, without the metrics made of them.

        Raises
        ------
        MeshError
            If a design cannot be meshed.
        """
        parts = []
        for places in _lanes(len(sections)):
            for solved, result in self._results(sections, exciting, places):
                if isinstance(result, str):
                    raise MeshError(result)
                parts.append(result.field.rows(slice(solved.size)))
        return FieldSolution.joined(parts)

    def waveforms(self, design: Mapping[str, float]) -> tuple[Waveform, ...]:
        """Waveforms of one design over one turn of the rotor.

        Raises
        ------
        ValueError
            If the design has no cross-section.
        """
        return waveforms(self.model, design)


def _lanes(count: int) -> Iterator[IntArray]:
    """The places 0..count-1, LANES at a time."""
    for first in range(0, count, LANES):
        yield np.arange(first, min(first + LANES, count))
