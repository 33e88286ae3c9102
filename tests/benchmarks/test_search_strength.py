"""How good the search is at equal evaluations beside published ones; run with ``-m benchmark -s``.

Every search delivers the front of all feasible designs it evaluated. Fresh seeds, other problems,
budgets or peers are chosen by the environment::

    STRENGTH_SEEDS=11,12 STRENGTH_BUDGETS=1000,4000 STRENGTH_PROBLEMS=mw1,tnk STRENGTH_PEERS=NSGA2

The default is a small part. Fronts to measure by are made here from the problems' own functions,
so no network is needed: test problems put distance from the front into one function of its own
(Ma and Wang, IEEE Trans. Evol. Comput. 23 (2019) 972-986; Fan et al., Evol. Comput. 28 (2020)
339-378), which is sampled here in place of the variables that make it. Problems of two variables
are sampled everywhere.
"""

from __future__ import annotations

import os
import time
from collections.abc import Callable, Iterator

import numpy as np
import pytest
from pymoo.algorithms.moo.age2 import AGEMOEA2
from pymoo.algorithms.moo.ctaea import CTAEA
from pymoo.algorithms.moo.nsga2 import NSGA2
from pymoo.algorithms.moo.nsga3 import NSGA3
from pymoo.algorithms.moo.sms import SMSEMOA
from pymoo.algorithms.moo.unsga3 import UNSGA3
from pymoo.problems import get_problem
from pymoo.problems.many.cdtlz import C1DTLZ1, C2DTLZ2, C3DTLZ4
from pymoo.util.ref_dirs import get_reference_directions
from scipy.stats import mannwhitneyu

from optimizer.fronts import Front, hypervolume, igd_plus, non_dominated
from optimizer.problem import Outcome, Variable
from optimizer.search import DecompositionSearch

pytestmark = pytest.mark.benchmark

OURS = "ours"
POSITIONS, DEPTHS = 1_500, 1_500  # samples along a front and away from it
DEEPEST = 2.0  # distance at which no part of a front lies any more
Run = Iterator[tuple[np.ndarray, np.ndarray]]  # objectives and constraints, batch by batch


def chosen(name: str, default: str) -> list[str]:
    return [word for word in os.environ.get(name, default).split(",") if word]


# ---- problems and what is to be found ---------------------------------------------------------


def made(name: str):
    """A problem by its name; a DASCMOP with its difficulty behind a dash."""
    own = {"c1dtlz1": C1DTLZ1, "c2dtlz2": C2DTLZ2, "c3dtlz4": C3DTLZ4}
    if name in own:
        return own[name]()
    base, _, difficulty = name.partition("-")
    return get_problem(base, int(difficulty)) if difficulty else get_problem(base)


PROBLEMS = [
    *("bnh", "srn", "tnk", "osy", "truss2d"),
    *(f"ctp{i}" for i in range(1, 9)),
    *("c1dtlz1", "c2dtlz2", "c3dtlz4"),
    *(f"dascmop{i}-{i}" for i in (1, 2, 3, 4, 7, 8, 9)),
    *(f"mw{i}" for i in range(1, 15)),
]


def evaluated(problem, x: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    with np.errstate(all="ignore"):
        found = problem.evaluate(x, return_values_of=["F", "G"], return_as_dictionary=True)
    return found["F"], found["G"].reshape(len(x), -1)


def best_of(problem, samples: Iterator[np.ndarray]) -> np.ndarray:
    """Front of the feasible ones of the samples."""
    front = np.zeros((0, problem.n_obj))
    for x in samples:
        objectives, constraints = evaluated(problem, x)
        # Closed forms lie on constraints, where rounding decides.
        good = (constraints <= 1e-9).all(axis=1) & np.isfinite(objectives).all(axis=1)
        front = np.concatenate([front, objectives[good]])
        front = np.unique(front[non_dominated(front)], axis=0)
    return front


def grid(problem) -> Iterator[np.ndarray]:
    """Two variables, sampled everywhere."""
    first = np.linspace(problem.xl[0], problem.xu[0], 2_000)
    second = np.linspace(problem.xl[1], problem.xu[1], 2_000)
    for part in np.array_split(first, 20):
        yield np.stack(np.meshgrid(part, second), axis=-1).reshape(-1, 2)


def distances(problem) -> Iterator[np.ndarray]:
    """Positions along the front, and distances from it put in place of the distance function."""
    name = type(problem).__name__
    least = 0.0 if name.startswith("DASCMOP") else 1.0
    shown = {"depth": np.zeros(0)}

    def distance(_x: np.ndarray) -> np.ndarray:
        return shown["depth"][:, None] if least == 0.0 else shown["depth"]

    for function in ("g1", "g2", "g3"):
        setattr(problem, function, distance)
    low, high = problem.xl[0], problem.xu[0]
    if problem.n_obj == 2:
        # MW10 crowds its front at the upper end by a power.
        even = np.linspace(0.0, 1.0, POSITIONS)
        positions = np.unique(np.concatenate([even, even ** (1.0 / problem.n_var)]))[:, None]
        depths = np.linspace(0.0, DEEPEST, DEPTHS)
    else:
        even = np.linspace(0.0, 1.0, 60)
        positions = np.stack(np.meshgrid(even, even), axis=-1).reshape(-1, 2)
        depths = np.linspace(0.0, DEEPEST, 401)
    for part in np.array_split(depths, 50):
        x = np.full((len(positions) * len(part), problem.n_var), 0.5)
        x[:, : problem.n_obj - 1] = low + np.repeat(positions, len(part), axis=0) * (high - low)
        shown["depth"] = least + np.tile(part, len(positions))
        yield x


def osyczka() -> Iterator[np.ndarray]:
    """The five pieces on which the front of OSY lies (Deb 2001, table 33; from memory).

    That no search gets past it is checked below.
    """
    t = np.linspace(0.0, 1.0, 1_000)
    one, none = np.ones_like(t), np.zeros_like(t)
    x1 = 4.056 + 0.944 * t
    yield np.column_stack([5 * one, one, 1 + 4 * t, none, 5 * one, none])
    yield np.column_stack([5 * one, one, 1 + 4 * t, none, one, none])
    yield np.column_stack([x1, (x1 - 2) / 3, one, none, one, none])
    yield np.column_stack([none, 2 * one, 1 + 2.732 * t, none, one, none])
    yield np.column_stack([t, 2 - t, one, none, one, none])


def reference(name: str) -> np.ndarray:
    problem = made(name)
    if "dtlz" in name:
        weights = get_reference_directions("das-dennis", 3, n_partitions=50)
        return np.asarray(problem._calc_pareto_front(weights))
    if name == "truss2d":
        return np.asarray(problem._calc_pareto_front())
    if name == "osy":
        return best_of(problem, osyczka())
    if problem.n_var == 2:
        return best_of(problem, grid(problem))
    return best_of(problem, distances(problem))


class Yardstick:
    """Figures of a front, with ideal and nadir of the reference at 0 and 1."""

    def __init__(self, name: str) -> None:
        self._low, high = (front := reference(name)).min(axis=0), front.max(axis=0)
        self._span = high - self._low
        scaled = (front - self._low) / self._span
        rows = np.linspace(0, len(scaled) - 1, min(len(scaled), 1_000)).astype(int)
        self._front = scaled[rows]
        self._corner = np.full(front.shape[1], 1.1)
        self._whole = hypervolume(scaled, self._corner)

    def figures(self, points: np.ndarray) -> tuple[float, float]:
        """Hypervolume over that of the reference, and IGD+ (inf without a feasible design)."""
        if not len(points):
            return 0.0, np.inf
        scaled = (points - self._low) / self._span
        volume = hypervolume(scaled, self._corner) / self._whole
        return volume, igd_plus(scaled, self._front)


# ---- searches ---------------------------------------------------------------------------------


def run_ours(problem, seed: int) -> Run:
    bounds = zip(problem.xl, problem.xu, strict=True)
    variables = [Variable(f"x{i}", float(a), float(b)) for i, (a, b) in enumerate(bounds)]
    search = DecompositionSearch(variables, problem.n_obj, problem.n_ieq_constr, seed)
    while True:
        objectives, constraints = evaluated(problem, search.ask())
        search.tell(Outcome(objectives, constraints))
        yield objectives, constraints


def run_peer(make: Callable, problem, seed: int) -> Run:
    algorithm = make(problem.n_obj)
    algorithm.setup(problem, seed=seed, termination=("n_gen", 10**9), verbose=False)
    while True:
        population = algorithm.ask()
        algorithm.evaluator.eval(problem, population)
        algorithm.tell(infills=population)
        yield population.get("F"), population.get("G")


def directions(objectives: int) -> np.ndarray:
    parts = 99 if objectives == 2 else 12
    return get_reference_directions("das-dennis", objectives, n_partitions=parts)


PEERS: dict[str, Callable] = {
    "NSGA2": lambda _: NSGA2(pop_size=100),
    "NSGA3": lambda m: NSGA3(ref_dirs=directions(m)),
    "UNSGA3": lambda m: UNSGA3(ref_dirs=directions(m)),
    "AGE2": lambda _: AGEMOEA2(pop_size=100),
    "CTAEA": lambda m: CTAEA(ref_dirs=directions(m)),
    "SMS": lambda _: SMSEMOA(pop_size=100),
}


def fronts_at(run: Run, objectives: int, budgets: list[int]) -> list[np.ndarray]:
    """Front of all feasible designs among the first ``budgets`` evaluations."""
    front, done, found = Front(objectives), 0, []
    for values, constraints in run:
        good = (constraints <= 0.0).all(axis=1)
        start = 0
        for budget in [b for b in budgets if done < b <= done + len(values)]:
            stop = budget - done
            rows = start + np.flatnonzero(good[start:stop])
            front.add(values[rows], done + rows)
            found.append(front.points.copy())
            start = stop
        rows = start + np.flatnonzero(good[start:])
        front.add(values[rows], done + rows)
        done += len(values)
        if len(found) == len(budgets):
            break
    return found


@pytest.mark.parametrize(
    ("name", "exact"),
    [
        ("mw2", 1.1**2 - 1.0 / 2.0),  # the line f1 + f2 = 1 in the unit box
        ("c1dtlz1", 1.1**3 - 1.0 / 6.0),  # the plane f1 + f2 + f3 = 1/2, scaled
        ("c3dtlz4", None),
    ],
)
def test_reference_fronts_have_the_volume_of_the_closed_form(name: str, exact: float | None):
    front = reference(name)
    low, high = front.min(axis=0), front.max(axis=0)
    if exact is None:
        # C3DTLZ4 (Jain and Deb, IEEE Trans. Evol. Comput. 18 (2014) 602-622): on its front each
        # point meets one of f_i^2 / 4 + the other squares = 1 and none falls below.
        squares = front**2
        sums = squares.sum(axis=1, keepdims=True) - 0.75 * squares
        assert np.abs(sums.min(axis=1) - 1.0).max() < 1e-9  # rounding
        return
    volume = hypervolume((front - low) / (high - low), np.full(front.shape[1], 1.1))
    # From below by half a step along the front: 1/1500 in two objectives, and in three 1/50
    # on each side of a simplex of area 1/2.
    assert exact - (0.001 if front.shape[1] == 2 else 0.02) < volume <= exact + 1e-12


def test_hypervolume_beside_other_searches() -> None:
    budgets = sorted(int(word) for word in chosen("STRENGTH_BUDGETS", "1000,4000"))
    seeds = [int(word) for word in chosen("STRENGTH_SEEDS", "901,902,903")]
    names = chosen("STRENGTH_PROBLEMS", "bnh,osy,ctp1,c2dtlz2,dascmop1-1,mw1,mw3,mw7,mw12")
    names = PROBLEMS if names == ["all"] else names
    peers = chosen("STRENGTH_PEERS", "NSGA2,NSGA3,AGE2,CTAEA")
    searches = [OURS, *peers]
    volumes = np.zeros((len(budgets), len(names), len(searches), len(seeds)))
    gaps = np.zeros_like(volumes)
    for row, name in enumerate(names):
        begin = time.perf_counter()
        measure, problem = Yardstick(name), made(name)
        for column, search in enumerate(searches):
            for turn, seed in enumerate(seeds):
                make = PEERS.get(search)
                run = run_peer(make, problem, seed) if make else run_ours(problem, seed)
                found = fronts_at(run, problem.n_obj, budgets)
                for place, points in enumerate(found):
                    figures = measure.figures(points)
                    volumes[place, row, column, turn], gaps[place, row, column, turn] = figures
        print(f"{name}: {time.perf_counter() - begin:.0f} s", flush=True)
    for place, budget in enumerate(budgets):
        show(budget, names, searches, volumes[place], gaps[place])
    # A front that is beaten is no yardstick; sampled ones lie behind the true ones by up to one
    # step of the grid, a thousandth, and linear pieces between samples are not dominated.
    beaten = [n for n, best in zip(names, volumes.max(axis=(0, 2, 3)), strict=True) if best > 1.01]
    assert not beaten
    means = np.median(volumes, axis=3).mean(axis=1)
    for place, budget in enumerate(budgets):
        assert means[place, 0] >= means[place, 1:].max(), f"behind at {budget}"


def show(
    budget: int, names: list[str], searches: list[str], volumes: np.ndarray, gaps: np.ndarray
) -> None:
    """Print medians, the ratio to the best peer, and how often a rank sum test tells them apart."""
    width = max(len(name) for name in names)
    head = "".join(f"{search:>8}" for search in searches)
    seeds = volumes.shape[2]
    print(f"\n{budget:,} evaluations, {seeds} seeds: median hypervolume; IGD+; ratio to best peer")
    print(f"{'':{width}}{head}  |{head}  | ratio")
    middle, gap = np.median(volumes, axis=2), np.median(gaps, axis=2)
    for row, name in enumerate(names):
        best = middle[row, 1:].max()
        ratio = f"{middle[row, 0] / best:.3f}" if best > 0.0 else "-"
        left = "".join(f"{value:8.3f}" for value in middle[row])
        right = "".join(f"{value:8.3f}" for value in gap[row])
        print(f"{name:{width}}{left}  |{right}  | {ratio}")
    means = "".join(f"{value:8.3f}" for value in middle.mean(axis=0))
    empty = "".join(f"{share:8.2f}" for share in (volumes == 0.0).mean(axis=(0, 2)))
    print(f"{'mean':{width}}{means}")
    print(f"{'zero':{width}}{empty}  share of runs that found nothing inside the box")
    for column, search in enumerate(searches[1:], start=1):
        better = worse = 0
        for row in range(len(names)):
            mine, other = volumes[row, 0], volumes[row, column]
            if (mine == other).all() or mannwhitneyu(mine, other).pvalue > 0.05:
                continue
            better += np.median(mine) > np.median(other)
            worse += np.median(mine) < np.median(other)
        print(f"against {search}: better on {better}, worse on {worse} of {len(names)}")
    if seeds < 4:
        print("(fewer than 4 seeds cannot tell two searches apart at 5 %)")
