"""How far the analytic and the finite-element evaluator differ, over random designs.

``python -m studies.agreement`` evaluates designs drawn evenly from the boxes of the shipped studies
with both and writes ``evaluators/AGREEMENT.md``.
"""

from __future__ import annotations

import hashlib
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.geometry.cross_sections import cross_sections
from evaluators.machine.metrics import METRIC
from optimizer.workers.dispatch import Dispatcher, single_threaded
from studies.inspection.chosen import evaluate_all
from studies.problem import MachineProblem, machine_problem
from studies.stored.identity import study_digest
from studies.study_file.definition import Study

FloatArray = NDArray[np.float64]
Columns = Mapping[str, FloatArray]

FIRST, SECOND = "analytic", "finite_element"
SEED = 20
BATCH = 64  # designs drawn at once
MOST_BATCHES = 40  # per family; a box with fewer good designs than that is no box to search
SAME = 1e-9  # relative; below it a metric does not depend on the evaluator
DERIVED = {
    "torque_per_length_Nm_m": ("torque_Nm", "stack_length_mm"),
    "force_per_length_N_m": ("force_N", "stack_length_mm"),
}
"""Further quantities: the first over the second, in units of a metre."""


@dataclass(frozen=True)
class Agreement:
    """One metric in one family.

    Attributes
    ----------
    median, ninth_decile : float
        Of |analytic - finite element| over |finite element|, or over the spread from first to
        ninth decile of the finite-element values where the metric may be negative.
    rank : float
        Spearman's rank correlation; NaN if a metric does not vary.
    """

    median: float
    ninth_decile: float
    rank: float


@dataclass(frozen=True)
class FamilyAgreement:
    """All metrics of one family.

    Attributes
    ----------
    drawn, compared : int
        Designs with a cross-section, and those that both evaluators could evaluate.
    only_first, only_second : int
        Designs only one of them could.
    """

    study: str
    family: str
    drawn: int
    compared: int
    only_first: int
    only_second: int
    metrics: Mapping[str, Agreement]

    @property
    def label(self) -> str:
        """Study and family."""
        return f"{self.study} {self.family}"


def family_agreement(
    study: Study, family: str, designs: int, dispatcher: Dispatcher, kept: Path | None = None
) -> FamilyAgreement:
    """Evaluate designs of one family with both evaluators until `designs` of them are compared.

    Parameters
    ----------
    study : Study
    family : str
    designs : int
    dispatcher : Dispatcher
        For the finite-element evaluator.
    kept : Path, optional
        Folder in which the finite-element values are kept, and found again.
    """
    problem = machine_problem(study, family)
    problems = [
        replace(problem, evaluator_name=name, evaluator_settings={}, _built={})
        for name in (FIRST, SECOND)
    ]
    pairs: list[tuple[Columns, Columns]] = []
    drawn, compared, alone = 0, 0, np.zeros(2, dtype=np.int64)
    with single_threaded():
        for number, x in enumerate(_designs(problem, family)):
            first = problems[0].evaluate(x)
            second = _kept(problems[1], x, dispatcher, _file(study, problems[1], x, number, kept))
            ok = (first.status == "ok", np.isfinite(second["loss_total_W"]))
            both = np.flatnonzero(ok[0] & ok[1])
            pairs.append(
                (
                    _with_derived({name: np.asarray(first.columns[name])[both] for name in second}),
                    _with_derived({name: values[both] for name, values in second.items()}),
                )
            )
            drawn += len(x)
            compared += both.size
            alone += (np.sum(ok[0] & ~ok[1]), np.sum(ok[1] & ~ok[0]))
            if compared >= designs:
                break
    columns = {
        name: tuple(np.concatenate([pair[side][name] for pair in pairs]) for side in (0, 1))
        for name in pairs[0][0]
    }
    return FamilyAgreement(
        study=study.name,
        family=family,
        drawn=drawn,
        compared=compared,
        only_first=int(alone[0]),
        only_second=int(alone[1]),
        metrics={name: agreement(name, a, b) for name, (a, b) in columns.items()},
    )


def agreement(name: str, first: FloatArray, second: FloatArray) -> Agreement:
    """Agreement of two evaluators in one metric, (n,) each; the second is the measure."""
    from scipy.stats import spearmanr

    difference = np.abs(first - second)
    if name in METRIC and METRIC[name].signed:
        low, high = np.quantile(second, [0.1, 0.9])
        size = np.full_like(second, high - low)
    else:
        size = np.abs(second)
    known = (size > 0.0) | (difference == 0.0)
    share = difference[known] / np.where(size > 0.0, size, 1.0)[known]
    rank = np.nan
    if np.ptp(first) > 0.0 and np.ptp(second) > 0.0:
        rank = float(spearmanr(first, second).statistic)
    if not share.size:
        return Agreement(np.nan, np.nan, rank)
    median, ninth = np.quantile(share, [0.5, 0.9])
    return Agreement(float(median), float(ninth), rank)


def _designs(problem: MachineProblem, family: str) -> Iterator[FloatArray]:
    """Batches (BATCH, v) of designs with a cross-section, even over the box."""
    seed = int.from_bytes(hashlib.sha256(family.encode()).digest()[:4], "big")
    generator = np.random.default_rng([SEED, seed])
    low = np.array([item.lower for item in problem.variables])
    high = np.array([item.upper for item in problem.variables])
    task = problem.task
    waiting = np.zeros((0, low.size))
    for _ in range(MOST_BATCHES):
        while len(waiting) < BATCH:
            x = generator.uniform(low, high, (BATCH, low.size))
            columns = {item.name: x[:, k] for k, item in enumerate(problem.variables)}
            _, valid, _ = cross_sections(task.winding.family, columns, task.construction)
            waiting = np.concatenate([waiting, x[valid]])
        yield waiting[:BATCH]
        waiting = waiting[BATCH:]


def _file(
    study: Study, problem: MachineProblem, x: FloatArray, number: int, folder: Path | None
) -> Path | None:
    """File of one batch; its name tells everything that decides the values."""
    if folder is None:
        return None
    family = problem.task.winding.family.id
    content = (study_digest(study), family, problem.evaluator.version, x.tolist())
    key = hashlib.sha256(repr(content).encode()).hexdigest()[:16]
    return folder / study.name / f"{family}-{number:02d}-{key}.npz"


def _kept(
    problem: MachineProblem, x: FloatArray, dispatcher: Dispatcher, file: Path | None
) -> Columns:
    """Metrics of the designs, NaN where they failed; from the file if it is there."""
    if file is not None and file.is_file():
        with np.load(file, allow_pickle=False) as stored:
            return {name: stored[name] for name in stored.files}
    outcome = evaluate_all(problem, x, dispatcher)
    found = {name: np.asarray(values, dtype=np.float64) for name, values in outcome.columns.items()}
    if file is not None:
        file.parent.mkdir(parents=True, exist_ok=True)
        draft = file.with_suffix(".draft.npz")
        np.savez(draft, **found)  # type: ignore[arg-type]
        draft.replace(file)
    return found


def _with_derived(metrics: Columns) -> Columns:
    derived = {
        name: metrics[over] / (1e-3 * metrics[under]) for name, (over, under) in DERIVED.items()
    }
    return {**derived, **metrics}


def unaffected(families: Sequence[FamilyAgreement]) -> list[str]:
    """Metrics that are the same with both evaluators in every family."""
    return [
        name
        for name in families[0].metrics
        if all(item.metrics[name].ninth_decile <= SAME for item in families)
    ]
