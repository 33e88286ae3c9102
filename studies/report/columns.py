"""The quantities a report can put on an axis: objectives, metrics, variables."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from evaluators.machine.geometry.variables import VARIABLES
from evaluators.machine.metrics import METRIC, METRICS
from studies.stored.families import matrix
from studies.study_file.crosschecks import Objective
from studies.study_file.sections import UNIT_TEXT

FloatArray = NDArray[np.float64]

UNITS = {"1": "", "degC": "°C", "um": "µm", "A/mm2": "A/mm²", "deg": "°", "W/cm2": "W/cm²"}


@dataclass(frozen=True)
class Column:
    """One quantity.

    Attributes
    ----------
    name, unit : str
        As stored; the unit is "" for a ratio.
    title : str
        For a reader.
    kind : str
        ``objective`` (a weighted sum that is no metric), ``metric`` or ``variable``.
    smaller_is_better : bool or None
    """

    name: str
    title: str
    unit: str
    kind: Literal["objective", "metric", "variable"]
    group: str
    definition: str
    smaller_is_better: bool | None


def title(name: str, unit: str) -> str:
    """A name without its unit suffix and with blanks: ``loss_total_W`` is "loss total"."""
    unit = UNITS.get(unit, unit) if unit == "degC" else unit
    suffixes = {unit, *(key for key, said in UNIT_TEXT.items() if said == unit)}
    suffixes |= {unit.replace("/", "_").replace(" ", ""), unit.replace(" ", "").replace("/", "_")}
    for suffix in sorted(suffixes - {"1", ""}, key=len, reverse=True):
        if name.endswith(f"_{suffix}"):
            name = name.removesuffix(f"_{suffix}")
            break
    if name.startswith("loss_"):
        name = f"{name.removeprefix('loss_')}_loss"
    words = name.replace("_", " ")
    return words.replace("emf", "EMF").replace("lift off", "lift-off")


def report_columns(
    objectives: Sequence[Objective], metrics: Sequence[str], currency: str
) -> tuple[Column, ...]:
    """Objectives that are sums, then metrics, then variables.

    Parameters
    ----------
    objectives : sequence of Objective
    metrics : sequence of str
        Names stored.
    currency : str
        Unit of money.
    """
    found = [
        Column(
            goal.name,
            goal.name.replace("_", " "),
            "",
            "objective",
            "objective",
            "weighted sum: " + " + ".join(f"{weight:g} {name}" for name, weight in goal.terms),
            not goal.maximise,
        )
        for goal in objectives
        if goal.name not in METRIC
    ]
    for metric in METRICS:
        if metric.name in metrics:
            unit = currency if metric.unit == "money" else UNITS.get(metric.unit, metric.unit)
            found.append(
                Column(
                    metric.name,
                    title(metric.name, metric.unit),
                    unit,
                    "metric",
                    metric.group,
                    metric.definition,
                    metric.smaller_is_better,
                )
            )
    found += [
        Column(
            variable.name,
            title(variable.name, variable.unit),
            UNITS.get(variable.unit, variable.unit),
            "variable",
            "design variable",
            variable.definition,
            None,
        )
        for variable in VARIABLES
    ]
    return tuple(found)


def values(
    table: pa.Table, columns: Sequence[Column], objectives: Sequence[Objective]
) -> FloatArray:
    """Values (n, columns), a maximised sum with its own sign; NaN where no such column is."""
    goals = {goal.name: goal for goal in objectives}
    found = np.full((table.num_rows, len(columns)), np.nan)
    for position, (column, name) in enumerate(zip(columns, stored_names(columns), strict=True)):
        if name in table.schema.names:
            found[:, position] = matrix(table, [name])[:, 0]
        if column.kind == "objective":
            found[:, position] *= goals[column.name].sign
    return found


def stored_names(columns: Sequence[Column]) -> list[str]:
    """Names of the archive's columns behind `columns`."""
    return [f"objective:{c.name}" if c.kind == "objective" else c.name for c in columns]
