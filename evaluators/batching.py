"""What every evaluator does around its field: designs in, `Evaluations` out."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from evaluators.interface import Evaluations, Status
from evaluators.machine.field import Excitation, excitation
from evaluators.machine.geometry.cross_sections import CrossSections, batch_length, cross_sections
from evaluators.machine.task.task import Task

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]
ObjectArray = NDArray[np.object_]

PER_MM2 = 1e6
NOT_FINITE = "a metric is not a finite number"


class Batch:
    """Designs on their way to `Evaluations`.

    Those that are no cross-section are decided from the start. The k others, told by their place
    0..k-1 among themselves, are for the evaluator to `settle` or to `fail`.

    Parameters
    ----------
    task : Task
    designs : mapping of variable name to array (n,)
    metrics : tuple of str
        Metrics that the evaluator returns.

    Attributes
    ----------
    sections : CrossSections
        Of the k designs.
    exciting : Excitation
        Currents of the k designs.
    valid : array (k,)
        Their rows among all.

    Raises
    ------
    ValueError
        If a variable is missing or the arrays are not equally long.
    """

    def __init__(
        self, task: Task, designs: Mapping[str, FloatArray], metrics: tuple[str, ...]
    ) -> None:
        rows = batch_length(designs)
        self.sections: CrossSections
        self.sections, self.valid, reasons = cross_sections(
            task.winding.family, designs, task.construction
        )
        density = np.asarray(designs["current_density_A_mm2"], dtype=np.float64)[self.valid]
        self.exciting: Excitation = excitation(
            self.sections, density * PER_MM2, task.duty, task.construction
        )
        self._metrics = {name: np.full(rows, np.nan) for name in metrics}
        self._status = np.full(rows, Status.INVALID_GEOMETRY.value, dtype=object)
        self._reason = reasons.astype(object)

    def __len__(self) -> int:
        return int(self.valid.size)

    def fail(self, places: int | IntArray, reason: str, status: Status = Status.FAILED) -> None:
        """Decide designs that the model cannot evaluate."""
        self._status[self.valid[places]] = status.value
        self._reason[self.valid[places]] = reason

    def settle(
        self,
        places: IntArray,
        metrics: Mapping[str, FloatArray],
        reasons: ObjectArray | NDArray[np.str_],
    ) -> None:
        """Decide designs by their `metrics`; failed are those with a reason or without a number.

        Metrics and reasons are arrays (places,).
        """
        rows = self.valid[places]
        columns = {name: metrics[name] for name in self._metrics}
        finite = np.all([np.isfinite(column) for column in columns.values()], axis=0)
        words = np.where(finite | (reasons != ""), reasons, NOT_FINITE)
        good = words == ""
        self._status[rows] = np.where(good, Status.OK.value, Status.FAILED.value)
        self._reason[rows] = words
        for name, column in columns.items():
            self._metrics[name][rows] = np.where(good, column, np.nan)

    def evaluations(self) -> Evaluations:
        """All designs as they were decided."""
        return Evaluations(
            metrics=self._metrics,
            status=self._status.astype(np.str_),
            reason=self._reason.astype(np.str_),
        )


def one_machine(task: Task, design: Mapping[str, float]) -> tuple[CrossSections, Excitation]:
    """Cross-section and currents of one design.

    Raises
    ------
    ValueError
        If it has no cross-section.
    """
    batch = {name: np.array([float(value)]) for name, value in design.items()}
    sections, valid, reasons = cross_sections(task.winding.family, batch, task.construction)
    if not valid.size:
        raise ValueError(str(reasons[0]))
    density = batch["current_density_A_mm2"] * PER_MM2
    return sections, excitation(sections, density, task.duty, task.construction)
