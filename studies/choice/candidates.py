"""Designs to choose from: everything stored that meets the limits, at the prices of a scenario."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from evaluators.machine.cost import active_material_cost
from evaluators.machine.geometry.cross_sections import cross_sections
from evaluators.machine.geometry.mass import active_masses
from evaluators.machine.geometry.variables import VARIABLE_NAMES
from studies.choice.preferences import Preferences, scenario_prices
from studies.errors import ResultsError
from studies.problem import margin
from studies.stored.families import StoredFamily, matrix, stored_families
from studies.stored.layout import Results
from studies.stored.naming import design_id
from studies.study_file.crosschecks import Limit

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

COST = "cost"
LENGTH = "stack_length_mm"
MASS = "mass_kg"
SAME_COST = 1e-6  # relative difference of a cost worked out again from the stored one


@dataclass(frozen=True)
class Pool:
    """Candidates of one family of one study.

    Attributes
    ----------
    label : str
        Family, with the folder of the study before it if several studies are compared.
    results : Results
    family : str
    searches : tuple of str
        Names of the family's searches.
    owner : array (n,) of int
        Which of them each candidate is of.
    evaluations : array (n,) of int
    values : array (n, criteria)
        In their own sense.
    feasible_before : int
        Designs that meet the study's own limits.
    best_limited : mapping of limit name to float
        Best value of each tightened limit's metric among those, NaN if there are none.
    """

    label: str
    results: Results
    family: str
    searches: tuple[str, ...]
    owner: NDArray[np.int64]
    evaluations: NDArray[np.int64]
    values: FloatArray
    feasible_before: int
    best_limited: dict[str, float]

    def design(self, row: int) -> str:
        """Id of a candidate."""
        return design_id(self.searches[self.owner[row]], int(self.evaluations[row]))


def candidate_pools(opened: Sequence[Results], wanted: Preferences) -> list[Pool]:
    """Candidates of every family stored.

    All evaluated designs count, not the stored fronts only: a tightened limit or another price
    can make a design the best that another one beat before.

    Raises
    ------
    ResultsError
        If nothing is stored, or a study lacks a metric that is asked for.
    """
    several = len(opened) > 1
    _check_alike(opened, wanted)
    pools = []
    for results in opened:
        for stored in stored_families(results):
            if any(item.reader.rows for item in stored.searches):
                label = f"{results.folder.name}/{stored.family}" if several else stored.family
                pools.append(_pool(label, results, stored, wanted))
    if not pools:
        msg = f"{opened[0].folder}: nothing is stored yet; `hovergap resume` searches it"
        raise ResultsError(msg)
    return pools


def _check_alike(opened: Sequence[Results], wanted: Preferences) -> None:
    """Criteria must mean the same in every study."""
    first = {goal.name: goal for goal in opened[0].study.objectives}
    for results in opened[1:]:
        other = {goal.name: goal for goal in results.study.objectives}
        for item in wanted.criteria:
            if first.get(item.name) != other.get(item.name):
                msg = (
                    f"{opened[0].folder} and {results.folder}: {item.name} is not the same "
                    "objective in both, so their designs cannot be ranked by it"
                )
                raise ResultsError(msg)


def _pool(label: str, results: Results, stored: StoredFamily, wanted: Preferences) -> Pool:
    study = results.study
    goals = {goal.name: goal for goal in study.objectives}
    limits = [*study.limits, *wanted.limits]
    needed = {limit.metric for limit in limits}
    needed |= {item.name for item in wanted.criteria if item.name not in goals}
    needed |= {metric for goal in study.objectives for metric, _ in goal.terms}
    if wanted.prices:
        needed |= {COST, LENGTH, MASS, *VARIABLE_NAMES}
    if wanted.market != "base":
        needed |= {COST, f"{COST}_{wanted.market}"}
    missing = sorted(needed - stored.columns)
    if missing:
        msg = (
            f"{stored.searches[0].folder}: {missing[0]} is not stored; its evaluator does not "
            "return it"
        )
        raise ResultsError(msg)
    table, owner = _evaluated(stored, sorted(needed))
    metrics = {name: matrix(table, [name])[:, 0] for name in sorted(needed)}
    if wanted.prices:
        metrics[COST] = _scenario_cost(results, stored, metrics, wanted)
    elif wanted.market != "base":
        metrics[COST] = metrics[f"{COST}_{wanted.market}"]
    own = _meets(metrics, study.limits, table.num_rows)
    kept = own & _meets(metrics, wanted.limits, table.num_rows)
    values = np.empty((table.num_rows, len(wanted.criteria)))
    for column, item in enumerate(wanted.criteria):
        if item.name in goals:
            terms = goals[item.name].terms
            values[:, column] = np.sum([w * metrics[name] for name, w in terms], axis=0)
        else:
            values[:, column] = metrics[item.name]
    best = {
        limit.name: _best(metrics[limit.metric][own], limit.kind == "at_most")
        for limit in wanted.limits
    }
    return Pool(
        label=label,
        results=results,
        family=stored.family,
        searches=tuple(item.name for item in stored.searches),
        owner=owner[kept],
        evaluations=table["evaluation"].to_numpy()[kept],
        values=values[kept],
        feasible_before=int(np.count_nonzero(own)),
        best_limited=best,
    )


def _evaluated(stored: StoredFamily, names: list[str]) -> tuple[pa.Table, NDArray[np.int64]]:
    """Evaluated designs of all searches, and which search each is of."""
    tables = []
    for item in stored.searches:
        table = item.reader.table(["evaluation", "status", *names])
        if table.num_rows:
            ok = np.asarray(table["status"].to_pylist()) == "ok"
            table = table.filter(pa.array(ok)).replace_schema_metadata(None)
        tables.append(table)
    owner = np.repeat(np.arange(len(tables)), [table.num_rows for table in tables])
    return pa.concat_tables([table for table in tables if table.num_columns]), owner


def _meets(metrics: dict[str, FloatArray], limits: Sequence[Limit], rows: int) -> BoolArray:
    met = np.ones(rows, dtype=np.bool_)
    for limit in limits:
        met &= margin(limit, metrics[limit.metric]) <= 0.0
    return met


def _best(values: FloatArray, smallest: bool) -> float:
    if not values.size:
        return float("nan")
    return float(values.min() if smallest else values.max())


def _scenario_cost(
    results: Results, stored: StoredFamily, metrics: dict[str, FloatArray], wanted: Preferences
) -> FloatArray:
    """Cost at the scenario's prices from stored dimensions and masses; no field is solved again.

    The copper is what the stored mass holds beside the parts that follow from the dimensions.

    Raises
    ------
    ResultsError
        If the stored cost cannot be reproduced at the study's own prices.
    """
    task = results.study.task(stored.family)
    batch = {name: metrics[name] for name in VARIABLE_NAMES}
    sections, valid, _ = cross_sections(task.winding.family, batch, task.construction)
    length = 1e-3 * metrics[LENGTH][valid]
    masses, _ = active_masses(task, sections, length, np.zeros_like(length))
    masses["copper"] = metrics[MASS][valid] - np.sum(list(masses.values()), axis=0)
    own = active_material_cost(masses, task.prices)
    known = metrics[COST][valid]
    if len(valid) < len(metrics[COST]) or np.any(np.abs(own - known) > SAME_COST * known):
        msg = (
            f"{stored.searches[0].folder}: the stored cost cannot be worked out again from the "
            "dimensions, so prices cannot be exchanged; sweep the study anew with this version"
        )
        raise ResultsError(msg)
    return active_material_cost(masses, scenario_prices(task.prices, wanted.prices))
