"""Yield and contributors in words, JSON and CSV."""

from __future__ import annotations

from dataclasses import dataclass
from textwrap import fill
from typing import Any

import numpy as np
from numpy.typing import NDArray

from studies.study_file.crosschecks import Limit
from studies.tables import csv_text, number, percent, prose_table, text_table
from studies.tolerance.run import Machines
from studies.tolerance.statistics import Contributions, Yield, contributions, yield_of

FloatArray = NDArray[np.float64]

SHOWN = 3  # sources named for a limit
WORTH_NAMING = 0.01  # share of the variance
HARD_SPACE = "\N{NO-BREAK SPACE}"
SHARES = (
    "Share: how much of the scatter (as variance) would go if this source did not scatter, by a "
    "linear fit; in a sample shares need not add up to 100 %."
)


@dataclass(frozen=True)
class LimitResult:
    """How the machines stand against one limit."""

    limit: Limit
    met: Yield
    low: float
    middle: float
    high: float
    sources: Contributions


@dataclass(frozen=True)
class ToleranceResult:
    """Everything the commands print and store.

    Attributes
    ----------
    machines : Machines
    whole : Yield
        Of machines that meet all limits; one that could not be evaluated does not.
    failed : int
    limits : tuple of LimitResult
        The one with the smallest yield first.
    """

    machines: Machines
    whole: Yield
    failed: int
    limits: tuple[LimitResult, ...]


def tolerance_result(machines: Machines) -> ToleranceResult:
    """Work out yields and contributors."""
    outcome, draw = machines.outcome, machines.draw
    ok = outcome.ok
    found = []
    for column, limit in enumerate(machines.chosen.problem.limits):
        margins = outcome.constraints[:, column]
        values = np.asarray(outcome.columns[limit.metric])[ok]
        low, middle, high = (
            np.percentile(values, [2.5, 50.0, 97.5]) if values.size else np.full(3, np.nan)
        )
        found.append(
            LimitResult(
                limit=limit,
                met=yield_of(ok & (margins <= 0.0), draw.lot),
                low=float(low),
                middle=float(middle),
                high=float(high),
                sources=contributions(draw.deviations[ok], draw.sigma, values),
            )
        )
    found.sort(key=lambda item: item.met.share)
    return ToleranceResult(
        machines=machines,
        whole=yield_of(outcome.feasible, draw.lot),
        failed=int(np.count_nonzero(~ok)),
        limits=tuple(found),
    )


def strongest(result: ToleranceResult, item: LimitResult) -> list[tuple[str, float]]:
    """Sources of one limit's scatter that are worth naming, the largest share first."""
    names = [source.name for source in result.machines.draw.scatters]
    pairs = sorted(zip(names, item.sources.shares.tolist(), strict=True), key=lambda pair: -pair[1])
    return [(name, share) for name, share in pairs[:SHOWN] if share >= WORTH_NAMING]


def tolerance_text(result: ToleranceResult) -> str:
    """What a user reads in the terminal."""
    machines = result.machines
    draw, chosen = machines.draw, machines.chosen
    whole = result.whole
    lots = len(np.unique(draw.lot))
    parts = [
        f"{chosen.design} of study {chosen.results.study.name}: {whole.machines} machines in "
        f"{lots} lots, evaluator {chosen.problem.evaluator_name}.",
        f"Yield against all limits {percent(whole.share)} (95 % interval {percent(whole.low)} to "
        f"{percent(whole.high)})"
        + (
            f"; {result.failed} could not be evaluated and count as lost." if result.failed else "."
        ),
        "",
        _limit_table(result),
        "",
        "Scatter (normal scatter has its tolerance at three standard deviations):",
        fill("; ".join(item.text() for item in draw.scatters) + ".", 96),
        fill(
            "Length and turns of the design are held; the current follows the duty's torque "
            f"(length met to {100.0 * machines.length_error:.2g} %).",
            96,
        ),
    ]
    return "\n".join(parts)


def _limit_table(result: ToleranceResult) -> str:
    if not result.limits:
        return "The study has no limits, so every machine that can be evaluated passes."
    rows = [
        [
            item.limit.metric,
            item.limit.text().removeprefix(f"{item.limit.metric} "),
            percent(item.met.share),
            f"{number(item.low)} .. {number(item.high)}",
        ]
        for item in result.limits
    ]
    # A share stays in one line with its source.
    sources = [
        [
            item.limit.metric,
            ", ".join(
                f"{name}{HARD_SPACE}{percent(share).replace(' ', HARD_SPACE)}"
                for name, share in strongest(result, item)
            )
            or "does not vary",
        ]
        for item in result.limits
    ]
    table = text_table(["limit on", "limit", "met by", "95 % of machines"], rows)
    shares = prose_table(["limit on", "share of its variance by source"], sources)
    return f"{table}\n\n{shares.replace(HARD_SPACE, ' ')}\n{fill(SHARES, 96)}"


def tolerance_json(result: ToleranceResult) -> dict[str, Any]:
    """The result as values of JSON."""
    machines = result.machines
    draw, chosen = machines.draw, machines.chosen
    return {
        "format": "hovergap tolerance",
        "format_version": 1,
        "design": chosen.design,
        "study": chosen.results.study.name,
        "evaluator": chosen.problem.evaluator_name,
        "machines": result.whole.machines,
        "lots": len(np.unique(draw.lot)),
        "failed": result.failed,
        "yield": _yield(result.whole),
        "scatter": [
            {
                "name": item.name,
                "tolerance": item.tolerance,
                "standard_deviation": float(draw.sigma[column]),
                "relative": item.relative,
                "shared_by_lot": not item.by_machine,
                "reason": item.reason,
            }
            for column, item in enumerate(draw.scatters)
        ],
        "limits": [
            {
                "metric": item.limit.metric,
                item.limit.kind: item.limit.value,
                "yield": _yield(item.met),
                "percentile_2.5": _finite(item.low),
                "median": _finite(item.middle),
                "percentile_97.5": _finite(item.high),
                "mean": item.sources.mean,
                "standard_deviation": item.sources.deviation,
                "explained_linearly": item.sources.explained,
                "variance_share": {
                    source.name: float(share)
                    for source, share in zip(draw.scatters, item.sources.shares, strict=True)
                },
                "change_per_unit": {
                    source.name: float(slope)
                    for source, slope in zip(draw.scatters, item.sources.slopes, strict=True)
                },
            }
            for item in result.limits
        ],
        "length_error": machines.length_error,
    }


def _yield(value: Yield) -> dict[str, float]:
    return {"share": value.share, "low": value.low, "high": value.high}


def _finite(value: float) -> float | None:
    return value if np.isfinite(value) else None


def machines_csv(result: ToleranceResult) -> str:
    """Every machine with its deviations, metrics and margins."""
    machines = result.machines
    outcome, draw = machines.outcome, machines.draw
    metrics = list(outcome.columns)
    head = [
        "machine",
        "lot",
        "status",
        "meets_all_limits",
        *(f"deviation:{item.name}" for item in draw.scatters),
        *metrics,
        *(f"margin:{limit.name}" for limit in machines.chosen.problem.limits),
    ]
    rows = [
        [
            row + 1,
            int(draw.lot[row]) + 1,
            str(outcome.status[row]),
            bool(outcome.feasible[row]),
            *draw.deviations[row].tolist(),
            *(float(outcome.columns[name][row]) for name in metrics),
            *outcome.constraints[row].tolist(),
        ]
        for row in range(len(outcome))
    ]
    return csv_text(head, rows)
