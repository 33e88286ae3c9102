"""Where designs are evaluated: in this process, in others of this machine, or on a cluster."""

from __future__ import annotations

import os

from evaluators.interface import installed
from optimizer.errors import ClusterError
from optimizer.workers.cluster import Cluster
from optimizer.workers.dispatch import Dispatcher, Serial
from optimizer.workers.pool import Pool
from studies.errors import StudiesError
from studies.problem import MachineProblem
from studies.study_file.definition import Study


def usable_workers() -> int:
    """Processors this process may use."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def dispatcher_of(study: Study, workers: int | None, cluster: str = "") -> Dispatcher:
    """What evaluates the designs of a study; parameters as of `made_dispatcher`."""
    return made_dispatcher(study.evaluator.name, workers, cluster, study.search.time_limit_s)


def made_dispatcher(
    evaluator: str, workers: int | None, cluster: str, time_limit_s: float | None
) -> Dispatcher:
    """What evaluates designs.

    Parameters
    ----------
    evaluator : str
        Name of the evaluator; a cluster's machines must have the same version of its package.
    workers : int or None
        Processes of this machine; None for one for each processor.
    cluster : str
        Address of a cluster's scheduler instead; empty for this machine.
    time_limit_s : float or None
        Longest time of one evaluation.

    Raises
    ------
    StudiesError
        If workers and cluster are both given, there is less than one worker, or the cluster
        cannot be reached.
    """
    if workers is not None and workers < 1:
        msg = f"workers is {workers}; at least 1 is wanted"
        raise StudiesError(msg)
    if cluster:
        if workers is not None:
            msg = (
                "workers and cluster exclude each other: a cluster has the workers that were "
                "started for it"
            )
            raise StudiesError(msg)
        found = installed().get(evaluator)
        package = found.dist.name if found is not None and found.dist is not None else ""
        try:
            return Cluster(cluster, time_limit_s, [package] if package else [])
        except ClusterError as error:
            raise StudiesError(str(error)) from None
    count = usable_workers() if workers is None else workers
    if time_limit_s is not None:
        return Pool(count, time_limit_s)
    return Serial() if count == 1 else Pool(count)


def time_limit_of(study: Study, problem: MachineProblem, given: float | None) -> float | None:
    """The time limit of one evaluation: the one given, or the study's for the study's evaluator.

    What is short for one evaluator may be long for another, so the study's limit says nothing
    about others.
    """
    if given is not None:
        return given
    own = problem.evaluator_name == study.evaluator.name
    return study.search.time_limit_s if own else None
