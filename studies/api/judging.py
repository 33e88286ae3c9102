"""Choosing a design and testing it: rankings, sensitivity, tolerance, verification."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import Any

import pyarrow as pa

from studies.api.reading import verified
from studies.api.tables import Folder, Folders, opened, table_of, table_of_csv
from studies.choice.candidates import candidate_pools
from studies.choice.decision import decide
from studies.choice.preferences import Market, preferences
from studies.choice.preferences import Method as Ranking
from studies.errors import StudiesError
from studies.inspection.chosen import QUICK_EVALUATOR, Chosen, choose_design, dispatcher_for
from studies.running.evaluating import time_limit_of
from studies.sensitivity import study as sensitivity_room
from studies.sensitivity.indices import TooFewError
from studies.sensitivity.tables import indices_csv, lines_csv
from studies.stored.layout import open_results
from studies.tolerance import report as tolerance_room
from studies.tolerance.run import built_machines
from studies.tolerance.scatter import Distribution, defaults, draw, overridden
from studies.verification.all import plans as verification_plans
from studies.verification.run import verify_family

Numbers = Mapping[str, float]


def choose(
    folders: Folders,
    *,
    weights: Numbers | None = None,
    aspirations: Numbers | None = None,
    at_most: Numbers | None = None,
    at_least: Numbers | None = None,
    prices: Numbers | None = None,
    method: Ranking = "achievement",
    market: Market = "base",
    show: int = 3,
) -> pa.Table:
    """Rank all designs that meet the limits by preferences; nothing is stored.

    Parameters
    ----------
    folders : path or sequence of paths
    weights, aspirations : mapping of objective or metric to float
        Weight (1 unless given) and level that would satisfy (the best there is unless given).
    at_most, at_least : mapping of metric to float
        Further limits.
    prices : mapping of material to float
        Of a kilogram, instead of the study's.
    method : ``achievement`` or ``sum``
    market : ``low``, ``base`` or ``high``
    show : int
        Designs of each family.

    Returns
    -------
    pyarrow.Table
        place, design, study, family, score, each criterion's value and ``given_away:...`` against
        the best of all; empty if no design meets all limits.
    """
    results = opened(folders)
    wanted = preferences(
        results[0].study,
        dict(weights or {}),
        dict(aspirations or {}),
        dict(at_most or {}),
        dict(at_least or {}),
        dict(prices or {}),
        method,
        market,
    )
    decision = decide(candidate_pools(results, wanted), wanted, show)
    if decision is None:
        return table_of([], ["place", "design"])
    names = [criterion.name for criterion in wanted.criteria]
    rows = []
    for item in decision.ranked:
        given = decision.given_away(item).tolist()
        rows.append(
            {
                "place": item.place,
                "design": item.design,
                "study": item.pool.results.study.name,
                "family": item.pool.family,
                "score": item.score,
                **dict(zip(names, item.values.tolist(), strict=True)),
                **{f"given_away:{name}": value for name, value in zip(names, given, strict=True)},
            }
        )
    return table_of(rows)


def sensitivity(
    folder: Folder,
    design: str,
    *,
    indices: sensitivity_room.Method | None = None,
    points: int | None = None,
    samples: int = sensitivity_room.BASE_SAMPLES,
    seed: int = 1,
    evaluator: str = "",
    workers: int | None = None,
    cluster: str = "",
    time_limit_s: float | None = None,
    allow_program: bool = False,
) -> tuple[pa.Table, pa.Table]:
    """What a design depends on.

    Parameters
    ----------
    indices : ``sobol``, ``delta``, ``none`` or None
        Kind of the global indices; None for the usual one of the evaluator.
    points : int, optional
        Of each line.
    samples : int
        Base samples of Sobol indices, rounded up to a power of 2.
    workers, cluster, time_limit_s
        As of `verify`, but this process alone for the analytic evaluator.

    Returns
    -------
    lines : pyarrow.Table
        Each variable moved on its own: variable, value, metrics and margins.
    indices : pyarrow.Table
        metric, variable, indices with their confidence; empty for ``none``.
    """
    chosen = _chosen(folder, design, evaluator, allow_program)
    limit = time_limit_of(chosen.results.study, chosen.problem, time_limit_s)
    with dispatcher_for(chosen.problem, workers, limit, cluster) as dispatcher:
        try:
            found = sensitivity_room.sensitivity(
                chosen,
                dispatcher,
                points or sensitivity_room.default_points(chosen),
                indices or sensitivity_room.default_method(chosen),
                2 ** (samples - 1).bit_length(),
                seed,
            )
        except TooFewError as error:
            msg = f'{chosen.design}: {error}; or leave the indices out with indices="none"'
            raise StudiesError(msg) from None
    nothing = table_of([], ["metric", "variable"])
    second = table_of_csv(indices_csv(found.indices)) if found.indices else nothing
    return table_of_csv(lines_csv(found)), second


def tolerance(
    folder: Folder,
    design: str,
    *,
    scatter: Sequence[str] = (),
    only: bool = False,
    distribution: Distribution = "normal",
    machines: int | None = None,
    lots: int | None = None,
    seed: int = 1,
    evaluator: str = "",
    workers: int | None = None,
    cluster: str = "",
    time_limit_s: float | None = None,
    allow_program: bool = False,
) -> pa.Table:
    """Machines as built: one row a machine with deviations, metrics and margins.

    The yield is the mean of ``meets_all_limits``. `scatter` holds entries such as
    ``tooth_width_mm=0.05`` or ``magnet_remanence=3%``; `only` leaves out the default ones.
    `workers`, `cluster` and `time_limit_s` are as of `sensitivity`.
    """
    chosen = _chosen(folder, design, evaluator, allow_program)
    scatters = overridden(defaults(chosen.task.materials), scatter)
    if only:
        scatters = tuple(item for item in scatters if item.reason == "given")
    if not scatters:
        msg = "nothing scatters: give at least one entry of scatter above zero"
        raise StudiesError(msg)
    count = machines or (300 if chosen.problem.evaluator_name == QUICK_EVALUATOR else 40)
    drawn = draw(scatters, count, min(count, lots or max(10, count // 10)), seed, distribution)
    limit = time_limit_of(chosen.results.study, chosen.problem, time_limit_s)
    with dispatcher_for(chosen.problem, workers, limit, cluster) as dispatcher:
        result = tolerance_room.tolerance_result(built_machines(chosen, drawn, dispatcher))
    return table_of_csv(tolerance_room.machines_csv(result))


def verify(
    folder: Folder,
    *,
    evaluator: str = "finite_element",
    settings: Mapping[str, Any] | None = None,
    families: Sequence[str] = (),
    top: int | None = 10,
    workers: int | None = None,
    cluster: str = "",
    time_limit_s: float | None = None,
    allow_program: bool = False,
    stop: Callable[[], bool] | None = None,
) -> pa.Table:
    """Evaluate designs of the fronts again with another evaluator and store both values.

    Parameters
    ----------
    top : int or None
        Designs of each front nearest to the ideal, the best of each objective besides; None for
        whole fronts.
    workers : int, optional
        Processes; by default one for each processor.
    cluster : str
        Address of a Dask scheduler instead, whose workers evaluate.
    time_limit_s : float, optional
        Longest time of one evaluation; by default the study's for the study's own evaluator.
    stop : callable, optional
        Asked before each chunk; True ends with what is stored.

    Returns
    -------
    pyarrow.Table
        As of `studies.api.verified`, for this evaluator.
    """
    results = open_results(Path(folder))
    made = verification_plans(results, families, evaluator, settings or {}, top, allow_program)
    plans = [plan for plan in made.plans if len(plan)]
    if plans:
        limit = time_limit_of(results.study, plans[0].problem, time_limit_s)
        with dispatcher_for(plans[0].problem, workers, limit, cluster) as dispatcher:
            for plan in plans:
                verify_family(
                    plan, dispatcher, stop or _never, lambda done, new: None, lambda text: None
                )
    return verified(folder, evaluator)


def _never() -> bool:
    return False


def _chosen(folder: Folder, design: str, evaluator: str, allow_program: bool) -> Chosen:
    return choose_design(open_results(Path(folder)), design, evaluator, allow_program)
