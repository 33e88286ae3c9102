"""Verifying the families of a study one after the other."""

from __future__ import annotations

import shlex
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pyarrow as pa

from optimizer.errors import ClusterError
from optimizer.running.meter import Meter
from optimizer.workers.dispatch import Dispatcher
from studies.comparison.numbers import compare_families
from studies.errors import EXIT_FAILED, EXIT_OK
from studies.problem import machine_problem
from studies.running.interruption import Interruption
from studies.running.sweep import chosen_families
from studies.stored.layout import Results
from studies.verification.run import Plan, verify_family
from studies.verification.selection import nearest_and_extreme, verifying_problem
from studies.verification.text import VerifyLine, search_text


@dataclass(frozen=True)
class Plans:
    """What there is to do in each search, and parts of the archives that are damaged."""

    plans: tuple[Plan, ...]
    damaged: tuple[Path, ...]


def plans(
    results: Results,
    families: Sequence[str],
    evaluator: str,
    settings: Mapping[str, Any],
    count: int | None,
    allow_program: bool = False,
) -> Plans:
    """Choose the designs and build the evaluators.

    Parameters
    ----------
    results : Results
    families : sequence of str
        Empty for all.
    evaluator : str
    settings : mapping
        Of that evaluator.
    count : int or None
        Designs nearest to the ideal in each family, extremes besides; None for whole fronts.
    allow_program : bool
        The user's consent to start the program that the evaluator's settings name.

    Raises
    ------
    StudiesError
        If nothing is stored, a family is unknown, or the evaluator does not serve.
    evaluators.interface.EvaluatorError
        If the evaluator is not installed or rejects a setting.
    """
    wanted = chosen_families(results.study, families)
    comparison = compare_families([results])
    made = []
    damaged: list[Path] = []
    for member in comparison.members:
        stored = member.stored
        if stored.family not in wanted:
            continue
        rows, owners = stored.joined
        if count is not None and rows.num_rows:
            chosen = nearest_and_extreme(comparison, member, count)
            rows, owners = rows.take(pa.array(chosen)), tuple(owners[row] for row in chosen)
        problem = verifying_problem(
            machine_problem(results.study, stored.family, allow_program),
            evaluator,
            settings,
            str(stored.settings.get("evaluator_version", "")),
        )
        for search in stored.searches:
            own = rows.filter(pa.array([name == search.name for name in owners], pa.bool_()))
            made.append(Plan(search.name, search.folder, problem, own))
        damaged += stored.damaged
    return Plans(tuple(made), tuple(damaged))


def verify_all(results: Results, made: Sequence[Plan], dispatcher: Dispatcher, again: str) -> int:
    """Verify search after search and say how it went.

    Parameters
    ----------
    results : Results
    made : sequence of Plan
    dispatcher : Dispatcher
    again : str
        The command that goes on if this is stopped.

    Returns
    -------
    int
        Exit code: 0, 1 if a cluster was lost, or 128 plus a signal if stopped.

    Raises
    ------
    OptimizerError
        If the values cannot be stored or are in use.
    """
    made = [plan for plan in made if len(plan)]
    line = VerifyLine({plan.search: len(plan) for plan in made})
    meter = Meter(None, sum(map(len, made)))
    unfinished = len(made)
    lost = False
    with Interruption() as interruption:
        try:
            for plan in made:

                def progress(done: int, new: int, search: str = plan.search) -> None:
                    meter.evaluated(new)
                    line.show(search, done, meter.rate())

                meter.start()
                done = verify_family(plan, dispatcher, interruption, progress, line.say)
                line.finish(plan.search)
                line.say(f"{search_text(done, results.study)}\n")
                unfinished -= done.complete
                if interruption.asked:
                    break
        except KeyboardInterrupt:
            line.say("stopped at once; the designs in hand were given up")
        except ClusterError as error:
            line.say(str(error))
            lost = True
    if lost or (interruption.asked and unfinished):
        line.say(f"Everything verified so far is stored. Go on with:\n  {again}")
        return EXIT_FAILED if lost else interruption.exit_code
    command = shlex.join(["hovergap", "compare", str(results.folder), "--verified"])
    line.say(f"Compare the families by these values with: {command}")
    return EXIT_OK
