"""Studies written, loaded and searched."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from pathlib import Path
from threading import Lock

import pyarrow as pa

from optimizer.archive.lock import writer_lock
from optimizer.running.progress import Progress, Summary
from optimizer.workers.dispatch import Dispatcher
from studies.api.tables import Folder, table_of
from studies.new_study.beginning import begin_study
from studies.problem import MachineProblem
from studies.running import sweep as room
from studies.running.evaluating import dispatcher_of
from studies.running.spending import Spending
from studies.shipped.library import find_study
from studies.stored.layout import Results, create, open_results, save_request
from studies.stored.naming import split_search_name
from studies.study_file.definition import Study

Watch = Callable[[str, Progress], None]
Stop = Callable[[], bool]


def load_study(study: str | Path) -> Study:
    """Read and check a study file, or the shipped study of that name.

    Raises
    ------
    StudiesError
        If there is none; `StudyFileError` with every mistake if it is wrong.

    Examples
    --------
    >>> load_study("compressor").name
    'compressor'
    """
    return find_study(str(study))


def new_study(
    file: str | Path,
    power_kW: float = 11.0,
    speed_rpm: float = 48_000.0,
    dc_link_V: float = 560.0,
    overspeed_ratio: float = 1.2,
    orientation: str = "horizontal",
) -> Study:
    """Write a commented study to start from, sized from power, speed and DC link.

    Raises
    ------
    StudiesError
        If the file is there already, its name will not do, or no sensible machine comes out.
    """
    return begin_study(Path(file), power_kW, speed_rpm, dc_link_V, overspeed_ratio, orientation)


def sweep(
    study: Study | str | Path,
    results: Folder = "results",
    *,
    families: Sequence[str] = (),
    evaluations: int | None = None,
    searches: int | None = None,
    seed: int | None = None,
    workers: int | None = None,
    cluster: str = "",
    allow_program: bool = False,
    progress: Watch | None = None,
    stop: Stop | None = None,
) -> pa.Table:
    """Search families of a study and keep every evaluation, as ``hovergap sweep`` does.

    Parameters
    ----------
    study : Study, str or path
    results : path
        Folder in which the study gets a folder of its own.
    families : sequence of str
        Empty for all.
    evaluations, searches, seed : int, optional
        Evaluations of each search, independent searches of each family, and seed, instead of the
        study's.
    workers : int, optional
        Processes; by default one for each processor. The results do not depend on it.
    cluster : str
        Address of a Dask scheduler instead, whose workers evaluate.
    allow_program : bool
        Consent to start the program that the evaluator's settings name.
    progress : callable, optional
        Called with the name of the search (the family, or such as ``Q12p4s5.2``) and its
        `optimizer.running.progress.Progress` several times a second.
    stop : callable, optional
        Asked often; True lets the designs in hand finish, stores them and ends.

    Returns
    -------
    pyarrow.Table
        One row a search: family, search (its number), evaluations, new, feasible, failed,
        front_size, hypervolume, seconds, stopped, ended (why it got fewer evaluations than
        wanted, empty if it got them).

    Raises
    ------
    StudiesError, optimizer.errors.OptimizerError, evaluators.interface.EvaluatorError
        As the command says it.
    """
    wanted = study if isinstance(study, Study) else load_study(study)
    chosen = room.chosen_families(wanted, families)
    problems = room.problems_of(wanted, chosen, allow_program)
    request = room.request_of(wanted, chosen, evaluations, searches, seed)
    room.announced(wanted, chosen, request)
    with dispatcher_of(wanted, workers, cluster) as dispatcher:
        results_of_study = create(Path(results), wanted, request)
        return _search(results_of_study, problems, dispatcher, progress, stop)


def resume(
    folder: Folder,
    *,
    families: Sequence[str] = (),
    evaluations: int | None = None,
    searches: int | None = None,
    workers: int | None = None,
    cluster: str = "",
    allow_program: bool = False,
    progress: Watch | None = None,
    stop: Stop | None = None,
) -> pa.Table:
    """Go on with a sweep that was stopped, or extend it with more `evaluations` or `searches`.

    Parameters and result as of `sweep`; `folder` is the results folder of the study.
    """
    results = open_results(Path(folder))
    study = results.study
    chosen = room.chosen_families(study, families or results.request.families)
    problems = room.problems_of(study, chosen, allow_program)
    asked = results.request
    request = replace(
        asked,
        families=tuple(item for item in study.families if item in {*chosen, *asked.families}),
        evaluations_per_family=evaluations or asked.evaluations_per_family,
        searches_per_family=searches or asked.searches_per_family,
    )
    room.announced(study, chosen, request)
    results = save_request(results, request)
    with dispatcher_of(study, workers, cluster) as dispatcher:
        return _search(results, problems, dispatcher, progress, stop)


def _search(
    results: Results,
    problems: dict[str, MachineProblem],
    dispatcher: Dispatcher,
    progress: Watch | None,
    stop: Stop | None,
) -> pa.Table:
    turn = Lock()

    def show(search: str, state: Progress) -> None:
        if progress is not None:
            with turn:
                progress(search, state)

    searches = room.problems_of_searches(results, problems)
    with writer_lock(results.folder):
        spending = Spending(
            results,
            searches,
            lambda name, problem: room.search_settings(
                results, problem, split_search_name(name)[1]
            ),
            dispatcher,
            show,
            stop or _never,
        )
        found = dict(spending.searches())
    return table_of([_row(name, found[name]) for name in searches if name in found])


def _never() -> bool:
    return False


def _row(name: str, summary: Summary) -> dict[str, object]:
    family, search = split_search_name(name)
    names = ("evaluations", "new", "feasible", "failed", "front_size", "hypervolume", "seconds")
    return {
        "family": family,
        "search": search,
        **{item: getattr(summary, item) for item in names},
        "stopped": summary.stopped,
        "ended": summary.ended,
    }
