"""Searching the families of a study, new or continued."""

from __future__ import annotations

import shlex
from collections.abc import Sequence
from pathlib import Path

from optimizer.archive.archive import is_archive
from optimizer.archive.durable import remove_leftovers
from optimizer.archive.identity import read_identity
from optimizer.archive.lock import writer_lock
from optimizer.errors import ClusterError
from optimizer.running.progress import Summary
from optimizer.settings import Settings
from optimizer.workers.dispatch import Dispatcher
from studies.consent import program_of, require_consent
from studies.errors import EXIT_FAILED, EXIT_NOTHING_FEASIBLE, EXIT_OK, StudiesError
from studies.problem import MachineProblem, machine_problem
from studies.running.infeasible import explain
from studies.running.interruption import Interruption
from studies.running.progress import ProgressLine, duration
from studies.running.spending import Spending
from studies.shipped.library import shipped
from studies.stored.identity import check_owner, labels_of
from studies.stored.layout import Request, Results, changes
from studies.stored.naming import (
    family_of,
    search_name,
    search_names,
    search_seed,
    split_search_name,
)
from studies.study_file.crosschecks import too_few_in_all
from studies.study_file.definition import Study
from studies.suggestions import suggest
from studies.tables import number, percent, text_table

SHIPPED_MARK = " (shipped)"


def chosen_families(study: Study, wanted: Sequence[str]) -> tuple[str, ...]:
    """Families asked for, in the order of the study; all if none was named.

    Raises
    ------
    StudiesError
        If the study has no such family.
    """
    for family in wanted:
        if family not in study.families:
            msg = f"the study {study.name} has no family {family!r}; " + suggest(
                family, study.families, f"it has {', '.join(study.families)}"
            )
            raise StudiesError(msg)
    return tuple(item for item in study.families if item in wanted or not wanted)


def counted(families: Sequence[str]) -> str:
    """The number of families in words."""
    return "1 family" if len(families) == 1 else f"{len(families)} families"


def announced(study: Study, families: Sequence[str], request: Request) -> str:
    """What is going to be searched, in words.

    Raises
    ------
    StudiesError
        If the study's total budget leaves each search too little.
    """
    searches = request.searches_per_family
    total = study.search.total_evaluations
    short = total and too_few_in_all(total, len(families), searches)
    if short:
        msg = f"search.total_evaluations {short[0]}; {short[1]}"
        raise StudiesError(msg)
    several = f", {searches} searches each" if searches > 1 else ""
    of_each = "of each search" if searches > 1 else "each"
    return (
        f"{study.name}: {counted(families)}{several}, {request.evaluations_per_family:,} "
        f"evaluations {of_each}"
    )


def request_of(
    study: Study,
    families: tuple[str, ...],
    evaluations: int | None,
    searches: int | None,
    seed: int | None,
) -> Request:
    """What a new sweep is asked for; what is None is taken from the study."""
    shipped = study.file.endswith(SHIPPED_MARK)
    return Request(
        origin=study.file if shipped else str(Path(study.file).absolute()),
        families=families,
        evaluations_per_family=evaluations or study.search.evaluations_per_family,
        seed=study.search.seed if seed is None else seed,
        searches_per_family=searches or study.search.searches_per_family,
    )


def problems_of(
    study: Study, families: Sequence[str], allow_program: bool = False
) -> dict[str, MachineProblem]:
    """Problems of the families, checked against their evaluator before anything is spent.

    Raises
    ------
    StudiesError
        If the evaluator lacks a metric, or would start a program without `allow_program`.
    """
    problems = {family: machine_problem(study, family, allow_program) for family in families}
    for problem in problems.values():
        problem.check()
        require_consent(problem)
    return problems


def search_families(
    results: Results, problems: dict[str, MachineProblem], dispatcher: Dispatcher
) -> int:
    """Search the families, each as often as is asked for, and say how it went.

    Returns
    -------
    int
        Exit code: 0, `EXIT_NOTHING_FEASIBLE`, `EXIT_FAILED` if a cluster was lost, or 128 plus a
        signal if stopped.

    Raises
    ------
    OptimizerError
        If the results cannot be written or are in use.
    ResultsError
        If an archive that is there belongs to another study.
    """
    families = tuple(problems)
    searches = problems_of_searches(results, problems)
    for name in searches:
        folder = results.search_folder(name)
        settings = read_identity(folder) if is_archive(folder) else None
        if settings is not None:
            check_owner(results, name, settings)
    line = ProgressLine(tuple(searches))
    summaries: dict[str, Summary] = {}
    lost = False
    with Interruption() as interruption, writer_lock(results.folder):
        remove_leftovers(results.folder)
        spending = Spending(
            results,
            searches,
            lambda name, problem: search_settings(results, problem, split_search_name(name)[1]),
            dispatcher,
            line.show,
            interruption,
        )
        try:
            for name, summary in spending.searches():
                summaries[name] = summary
                line.finish(name)
                line.say(_search_text(name, summary))
        except KeyboardInterrupt:
            line.say("stopped at once; the designs in hand were given up")
        except ClusterError as error:
            line.say(str(error))
            lost = True
        unfinished = [
            name
            for name in searches
            if name not in summaries
            or (
                summaries[name].evaluations < results.request.evaluations_per_family
                and not summaries[name].ended
            )
        ]
    if lost or (interruption.asked and unfinished):
        line.say(
            "Everything evaluated so far is stored. Go on with:\n  "
            + resume_command(results.folder, families, results.request.families)
            + (" --allow-program" if any(map(program_of, problems.values())) else "")
        )
        return EXIT_FAILED if lost else interruption.exit_code
    in_order = {name: summaries[name] for name in searches if name in summaries}
    return _closing(line, results, in_order)


def resume_command(folder: Path, families: tuple[str, ...], requested: tuple[str, ...]) -> str:
    """The command that goes on with these families."""
    words = ["hovergap", "resume", str(folder)]
    if families != requested:
        for family in families:
            words += ["--family", family]
    return shlex.join(words)


def changes_since_frozen(results: Results, file: str) -> list[str]:
    """What the user must know about the study file the results came from; empty if nothing.

    Parameters
    ----------
    results : Results
    file : str
        A study file given by the user, or empty for the one remembered.
    """
    name = file or results.request.origin
    if not name:
        return []
    if name.endswith(SHIPPED_MARK):
        known = shipped()
        item = known.get(name.removesuffix(SHIPPED_MARK))
        content = item.read_bytes() if item else None
    else:
        try:
            content = Path(name).read_bytes()
        except (OSError, ValueError) as error:
            if file:
                words = getattr(error, "strerror", None) or error
                msg = f"{file}: cannot be read: {words}"
                raise StudiesError(msg) from None
            return []  # the remembered file has gone, which is no reason to stop
    if content is None or content == results.study.content:
        return []
    return changes(results.study.content, content)


def problems_of_searches(
    results: Results, problems: dict[str, MachineProblem]
) -> dict[str, MachineProblem]:
    """The problem of each search that is asked for, by its name, in the order of searching."""
    names = search_names(tuple(problems), results.request.searches_per_family)
    return {name: problems[family_of(name)] for name in names}


def search_settings(results: Results, problem: MachineProblem, search: int = 1) -> Settings:
    """How one search of a family is made."""
    study, evaluator, family = results.study, problem.evaluator, problem.task.winding.family
    return Settings(
        budget=results.request.evaluations_per_family,
        seed=search_seed(results.request.seed, family, search),
        population=study.search.population,
        chunk=study.search.designs_per_call,
        evaluator=evaluator.name,
        evaluator_version=evaluator.version,
        labels=labels_of(study, search_name(family.id, search)),
    )


def _search_text(name: str, summary: Summary) -> str:
    text = (
        f"{name}: {summary.evaluations:,} evaluations ({summary.new:,} new in "
        f"{duration(summary.seconds)}), feasible "
        f"{percent(summary.feasible / max(1, summary.evaluations))}, failed {summary.failed:,}, "
        f"front {summary.front_size}"
    )
    if summary.hypervolume > 0.0:  # too few feasible designs span no box to measure it in
        text += f", hypervolume {number(summary.hypervolume)}"
    if summary.ended and summary.evaluations < summary.budget:
        text += f"\n{name}: ended early: {summary.ended}"
    for path in summary.damaged:
        text += (
            f"\n{name}: a part that is damaged or another study's was set aside as {path}; what "
            "it should hold was evaluated again"
        )
    return text


def _closing(line: ProgressLine, results: Results, summaries: dict[str, Summary]) -> int:
    rows = [
        [
            name,
            f"{item.evaluations:,}",
            percent(item.feasible / max(1, item.evaluations)),
            f"{item.failed:,}",
            str(item.front_size),
        ]
        for name, item in summaries.items()
    ]
    one_each = results.request.searches_per_family == 1
    head = ["family" if one_each else "search", "evaluations", "feasible", "failed", "front"]
    line.say("\n" + text_table(head, rows))
    families = dict.fromkeys(map(family_of, summaries))
    fertile = {family_of(name) for name, item in summaries.items() if item.feasible}
    barren = [family for family in families if family not in fertile]
    for family in barren:
        line.say("\n" + explain(results, family, 3 if len(barren) == 1 else 1))
    if not fertile:
        line.say(
            f"\nNo feasible design was found in any family. Every evaluation is stored in "
            f"{results.folder}; loosen a limit or widen the bounds."
        )
        return EXIT_NOTHING_FEASIBLE
    command = shlex.join(["hovergap", "compare", str(results.folder)])
    line.say(f"\nCompare the families with: {command}")
    return EXIT_OK
