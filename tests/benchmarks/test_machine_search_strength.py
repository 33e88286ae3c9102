"""The search beside published ones at equal evaluations, on a shipped machine study.

Run with ``-m benchmark -s``. Families, seeds, budgets and peers are chosen by the environment::

    MACHINE_FAMILIES=Q12p2s1 MACHINE_SEEDS=901 MACHINE_BUDGETS=1000,4000 MACHINE_PEERS=NSGA2,AGE2

No exact front is known here: ideal, nadir and the whole volume are those of the union of all
fronts found, so the figures of one run compare with each other only.
"""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator

import numpy as np
import pytest
from pymoo.algorithms.moo.age2 import AGEMOEA2
from pymoo.algorithms.moo.ctaea import CTAEA
from pymoo.algorithms.moo.nsga2 import NSGA2
from pymoo.algorithms.moo.nsga3 import NSGA3
from pymoo.core.problem import Problem as PymooProblem
from pymoo.util.ref_dirs import get_reference_directions

from optimizer.fronts import Front, hypervolume, non_dominated
from optimizer.problem import Outcome
from optimizer.search import DecompositionSearch
from studies.problem import MachineProblem, machine_problem
from studies.shipped.library import find_study

pytestmark = pytest.mark.benchmark

OURS = "ours"
FAILED = 1e6  # objective and margin of a design that failed, for searches that know no failures


def chosen(name: str, default: str) -> list[str]:
    return [word for word in os.environ.get(name, default).split(",") if word]


def directions(objectives: int) -> np.ndarray:
    parts = 99 if objectives == 2 else 12
    return get_reference_directions("das-dennis", objectives, n_partitions=parts)


PEERS: dict[str, Callable] = {
    "NSGA2": lambda _: NSGA2(pop_size=100),
    "NSGA3": lambda m: NSGA3(ref_dirs=directions(m)),
    "AGE2": lambda _: AGEMOEA2(pop_size=100),
    "CTAEA": lambda m: CTAEA(ref_dirs=directions(m)),
}


def run_ours(problem: MachineProblem, seed: int) -> Iterator[Outcome]:
    sizes = len(problem.objectives), len(problem.constraints)
    search = DecompositionSearch(problem.variables, *sizes, seed)
    while True:
        outcome = problem.evaluate(search.ask())
        search.tell(outcome)
        yield outcome


def run_peer(make: Callable, problem: MachineProblem, seed: int) -> Iterator[Outcome]:
    lower = np.array([v.lower for v in problem.variables])
    upper = np.array([v.upper for v in problem.variables])
    free = np.flatnonzero(lower < upper)
    count = len(problem.objectives)
    shown = PymooProblem(
        n_var=len(free),
        n_obj=count,
        n_ieq_constr=len(problem.constraints),
        xl=lower[free],
        xu=upper[free],
    )
    algorithm = make(count)
    algorithm.setup(shown, seed=seed, termination=("n_gen", 10**9), verbose=False)
    while True:
        population = algorithm.ask()
        x = np.tile(lower, (len(population), 1))
        x[:, free] = population.get("X")
        outcome = problem.evaluate(x)
        good = outcome.ok[:, None]
        population.set("F", np.where(good, outcome.objectives, FAILED))
        population.set("G", np.where(good, outcome.constraints, FAILED))
        for individual in population:
            individual.evaluated.update(("F", "G"))
        algorithm.tell(infills=population)
        yield outcome


def fronts_at(run: Iterator[Outcome], objectives: int, budgets: list[int]) -> list[np.ndarray]:
    """Front of all feasible designs among the first ``budgets`` evaluations."""
    front, done, found = Front(objectives), 0, []
    for outcome in run:
        good = np.flatnonzero(outcome.feasible)
        for budget in [b for b in budgets if done < b <= done + len(outcome)]:
            part = Front(objectives)
            part.replace(front.points.copy(), front.evaluations.copy())
            rows = good[good < budget - done]
            part.add(outcome.objectives[rows], done + rows)
            found.append(part.points.copy())
        front.add(outcome.objectives[good], done + good)
        done += len(outcome)
        if len(found) == len(budgets):
            break
    return found


def fronts_of(family: str, search: str, seed: int, budgets: list[int]) -> list[np.ndarray]:
    problem = machine_problem(find_study("compressor"), family)
    make = PEERS.get(search)
    run = run_peer(make, problem, seed) if make else run_ours(problem, seed)
    return fronts_at(run, len(problem.objectives), budgets)


def volumes_of(fronts: list[np.ndarray]) -> list[float]:
    """Hypervolume of each front over that of their union, whose nadir is 1 and reference 1.1."""
    points = np.concatenate(fronts)
    union = points[non_dominated(points)]
    low, span = union.min(axis=0), np.ptp(union, axis=0)
    corner = np.full(union.shape[1], 1.1)
    whole = hypervolume((union - low) / span, corner)
    return [hypervolume((front - low) / span, corner) / whole for front in fronts]


def test_hypervolume_on_a_machine_study_beside_other_searches() -> None:
    budgets = sorted(int(word) for word in chosen("MACHINE_BUDGETS", "1000,4000"))
    seeds = [int(word) for word in chosen("MACHINE_SEEDS", "901,902,903")]
    families = chosen("MACHINE_FAMILIES", "Q6p1s2,Q12p2s1,Q12p4s5")
    searches = [OURS, *chosen("MACHINE_PEERS", "NSGA2,NSGA3,AGE2,CTAEA")]
    volumes = np.zeros((len(families), len(searches), len(seeds), len(budgets)))
    for row, family in enumerate(families):
        fronts = [
            front
            for search in searches
            for seed in seeds
            for front in fronts_of(family, search, seed, budgets)
        ]
        volumes[row] = np.reshape(volumes_of(fronts), volumes.shape[1:])
    middle = np.median(volumes, axis=2)
    for place, budget in enumerate(budgets):
        print(f"\n{budget:,} evaluations, {len(seeds)} seeds: median hypervolume")
        print(" " * 9 + "".join(f"{search:>8}" for search in searches))
        for family, values in zip(families, middle[:, :, place], strict=True):
            print(f"{family:9}" + "".join(f"{value:8.3f}" for value in values))
        means = middle[:, :, place].mean(axis=0)
        print(f"{'mean':9}" + "".join(f"{value:8.3f}" for value in means))
        assert means[0] >= means[1:].max(), f"behind at {budget}"
