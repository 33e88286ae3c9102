"""Sensitivity as text and CSV."""

from __future__ import annotations

from textwrap import fill

import numpy as np

from evaluators.machine.metrics import METRIC
from studies.sensitivity.indices import DELTA_ROWS, Indices
from studies.sensitivity.study import Sensitivity, watched_values
from studies.tables import csv_text, number, text_table, wide_table

LARGE = 0.1  # half-width of a confidence interval above which the indices are called rough


def sensitivity_text(found: Sensitivity) -> str:
    """What a user reads in the terminal."""
    evaluator = found.chosen.problem.evaluator_name
    parts = [
        f"{found.chosen.design} of study {found.chosen.results.study.name}, one variable at a "
        f"time, evaluator {evaluator}:",
        _slopes(found),
        fill(
            "Per cent of change of the objective for one per cent of the variable, at the design. "
            "* the study fixes this variable; it was moved 10 % to both sides.",
            96,
        ),
    ]
    if found.failed:
        rows = sum(len(line.values) for line in found.lines)
        parts.append(f"{found.failed} of {rows} points could not be evaluated and are left out.")
    if found.indices is not None:
        parts += ["", indices_text(found.indices, found.objectives)]
    return "\n".join(parts)


def _slopes(found: Sensitivity) -> str:
    study = found.chosen.results.study
    rows = []
    for line in found.lines:
        values = watched_values(study, line.outcome)
        cells = [f"{line.variable}{'*' if line.fixed else ''}", number(line.values[line.at])]
        cells += [_signed(line.elasticity(values[name])) for name in found.objectives]
        rows.append(cells)
    return wide_table(["variable", "value", *found.objectives], rows)


def _signed(value: float) -> str:
    return "-" if np.isnan(value) else f"{value:+.2f}"


def counts_text(indices: Indices) -> str:
    """How many rows the indices rest on."""
    if indices.method == "sobol":
        return (
            f"{indices.evaluations:,} evaluations, {indices.dropped:,} dropped because they, or "
            "others of their block, failed."
        )
    used = min(indices.evaluations - indices.dropped, DELTA_ROWS)
    return (
        f"{indices.evaluations:,} stored designs, {indices.dropped:,} dropped because they failed; "
        f"{used:,} used, evenly spaced."
    )


def indices_text(indices: Indices, shown: tuple[str, ...]) -> str:
    """Indices of the shown metrics, the strongest variable first."""
    lines = [
        fill(f"Global indices ({indices.method}): {indices.basis}.", 96),
        counts_text(indices),
    ]
    for name in shown:
        row = indices.metrics.index(name)
        order = np.argsort(-indices.other[row], kind="stable")
        cells = [
            [
                indices.variables[k],
                f"{indices.first[row, k]:.3f}",
                f"{indices.first_confidence[row, k]:.3f}",
                f"{indices.other[row, k]:.3f}",
                f"{indices.other_confidence[row, k]:.3f}",
            ]
            for k in order
        ]
        head = [name, "first order", "+-", indices.other_name, "+-"]
        lines += ["", text_table(head, cells)]
    rows = [indices.metrics.index(name) for name in shown]
    rough = float(max(indices.first_confidence[rows].max(), indices.other_confidence[rows].max()))
    if rough > LARGE:
        remedy = " or raise --samples" if indices.method == "sobol" else ""
        lines.append(
            f"The 95 % intervals reach +-{rough:.2f}: trust the order of the strongest variables "
            f"only{remedy}."
        )
    return "\n".join(lines)


def lines_csv(found: Sensitivity) -> str:
    """Every point of every line with all metrics and margins."""
    outcomes = [line.outcome for line in found.lines]
    metrics = list(outcomes[0].columns)
    margins = found.chosen.problem.constraints
    head = [
        "variable",
        "value",
        "is_design",
        "status",
        "reason",
        *(f"objective:{name}" for name in found.objectives),
        *(name for name in metrics),
        *(f"margin:{name}" for name in margins),
    ]
    study = found.chosen.results.study
    rows: list[list[object]] = []
    for line in found.lines:
        goals = watched_values(study, line.outcome)
        for k, value in enumerate(line.values.tolist()):
            outcome = line.outcome
            rows.append(
                [
                    line.variable,
                    value,
                    k == line.at,
                    str(outcome.status[k]),
                    str(outcome.reason[k]),
                    *(float(goals[name][k]) for name in found.objectives),
                    *(float(outcome.columns[name][k]) for name in metrics),
                    *outcome.constraints[k].tolist(),
                ]
            )
    return csv_text(head, rows)


def indices_csv(indices: Indices) -> str:
    """One line for each metric and variable."""
    head = [
        "metric",
        "unit",
        "variable",
        "first_order",
        "first_order_confidence",
        indices.other_name,
        f"{indices.other_name}_confidence",
        "method",
    ]
    rows: list[list[object]] = []
    for row, name in enumerate(indices.metrics):
        unit = METRIC[name].unit if name in METRIC else ""
        rows += [
            [
                name,
                unit,
                variable,
                float(indices.first[row, k]),
                float(indices.first_confidence[row, k]),
                float(indices.other[row, k]),
                float(indices.other_confidence[row, k]),
                indices.method,
            ]
            for k, variable in enumerate(indices.variables)
        ]
    return csv_text(head, rows)
