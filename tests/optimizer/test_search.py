"""The search on published problems with known fronts, and what it promises about its state."""

from __future__ import annotations

import json
import math

import numpy as np
import pytest
from outside import OutsideChecks

from optimizer.errors import ProblemError
from optimizer.fronts import hypervolume
from optimizer.problem import Outcome, Variable
from optimizer.search import DecompositionSearch, SearchState
from optimizer.search.weights import neighbourhoods, weight_vectors

check = OutsideChecks("search")
PUBLISHED = {
    "bnh": "Binh, Korn, Proc. MENDEL 1997, 176-182; integral of its front",
    "srn": "Srinivas, Deb, Evol. Comput. 2 (1994) 221-248; integral of its front",
    "dtlz2": "Deb et al., CEC 2002, 825-830: the eighth of the unit sphere in three objectives",
    "mw2": "Ma, Wang, IEEE Trans. Evol. Comput. 23 (2019) 972-986: the line f1 + f2 = 1, of which "
    "small separate pieces are feasible, in 15 multimodal variables",
}


def searched(evaluate, variables, shape, seed, budget, **options) -> DecompositionSearch:
    search = DecompositionSearch(variables, *shape, seed=seed, **options)
    while search.evaluations < budget:
        search.tell(evaluate(search.ask()))
    return search


def published(name: str):
    """One of pymoo's problems as (evaluate, variables, (objectives, constraints))."""
    from pymoo.problems import get_problem

    problem = get_problem(name)

    def evaluate(x: np.ndarray) -> Outcome:
        out = problem.evaluate(x, return_as_dictionary=True)
        limits = out["G"] if problem.n_ieq_constr else np.zeros((len(x), 0))
        return Outcome(out["F"], limits)

    bounds = zip(problem.xl, problem.xu, strict=True)
    variables = [Variable(f"x{i}", float(a), float(b)) for i, (a, b) in enumerate(bounds)]
    return evaluate, variables, (problem.n_obj, problem.n_ieq_constr)


def bnh_volume() -> float:
    # Binh and Korn, Proc. MENDEL 1997, 176-182. The front is x1 = x2 = t up to 3, then x2 = 3 and
    # x1 = t up to 5. Below (140, 50): integrals of (50 - f2) df1 over both pieces, and the strip
    # right of f1 = 136.
    first = 16.0 * (-(3.0**4) / 2.0 + 20.0 * 27.0 / 3.0)
    second = -8.0 * (23.0 * 4.0 - 460.0 - 4.0 + 40.0 / 3.0)
    return first + second + 4.0 * 46.0


def srn_volume() -> float:
    # Srinivas and Deb, Evol. Comput. 2 (1994) 221-248: least 2 + (x1 - 2)^2 + (x2 - 1)^2 and
    # 9 x1 - (x2 - 1)^2 within x1^2 + x2^2 <= 225 and x1 - 3 x2 + 10 <= 0. Both gradients oppose
    # each other at x1 = -2.5, the piece that is published. The front goes on at both its ends
    # along the constraints: the line from where it is nearest to (2, 1), and the circle up to
    # the least f2. The volume below (250, 0) is that of a fine sampling.
    on_line = np.linspace(1.1, -2.5, 10_001)
    inside = np.linspace(2.5, math.sqrt(218.75), 10_001)
    angle = np.linspace(math.asin(math.sqrt(218.75) / 15.0), math.pi / 2.0, 10_001)[:-1]
    x1 = np.concatenate([on_line, np.full(10_001, -2.5), -15.0 * np.cos(angle)])
    x2 = np.concatenate([(on_line + 10.0) / 3.0, inside, 15.0 * np.sin(angle)])
    f1, f2 = 2.0 + (x1 - 2.0) ** 2 + (x2 - 1.0) ** 2, 9.0 * x1 - (x2 - 1.0) ** 2
    return hypervolume(np.column_stack([f1, f2]), [250.0, 0.0])


@pytest.mark.parametrize("seed", [11, 12, 13])
@pytest.mark.parametrize(
    ("name", "budget", "corner", "exact", "least"),
    [
        ("bnh", 1_000, [140.0, 50.0], bnh_volume(), 0.99),
        ("srn", 1_000, [250.0, 0.0], srn_volume(), 0.98),
        ("dtlz2", 4_000, [1.1] * 3, 1.331 - math.pi / 6.0, 0.92),
        pytest.param("mw2", 20_000, [1.1] * 2, 1.21 - 0.5, 0.65, marks=pytest.mark.slow),
    ],
)
def test_published_fronts_are_found(name, budget, corner, exact, least, seed) -> None:
    search = searched(*published(name), seed, budget)
    share = hypervolume(search.front.points, corner) / exact
    check.within(
        f"share of the exact hypervolume of {name.upper()} after {budget} evaluations",
        share,
        least,
        1.0 + 1e-4,
        why="a hundred evenly spread points on a line miss about one part in a hundred; twelve "
        "other seeds gave at least .996 (BNH), .990 (SRN), .941 (DTLZ2) and .71 (MW2); more "
        "than 1 is only left by the steps of a sampled front",
        source=PUBLISHED[name],
    )


def test_bnh_volume_equals_a_sum_over_the_front() -> None:
    t = np.linspace(0.0, 5.0, 20_001)
    second = np.minimum(t, 3.0)
    front = np.column_stack([4.0 * t**2 + 4.0 * second**2, (t - 5.0) ** 2 + (second - 5.0) ** 2])
    # Steps of f1 are below .05 of 136, so the stairs miss less than .05 x 50 of 5285.
    got = hypervolume(front, [140.0, 50.0])
    assert bnh_volume() - 2.5 < got < bnh_volume()


@pytest.mark.parametrize("seed", [11, 12, 13])
def test_a_single_objective_with_constraints_is_minimised(seed) -> None:
    # Problem G08 of Koziel and Michalewicz, Evol. Comput. 7 (1999) 19-44: best -0.0958250.
    def evaluate(x: np.ndarray) -> Outcome:
        a, b = x.T
        value = -(np.sin(2 * np.pi * a) ** 3) * np.sin(2 * np.pi * b) / (a**3 * (a + b))
        return Outcome(value[:, None], np.column_stack([a**2 - b + 1, 1 - a + (b - 4) ** 2]))

    variables = [Variable("a", 1e-3, 10.0), Variable("b", 1e-3, 10.0)]
    search = searched(evaluate, variables, (1, 2), seed, 6_000)
    assert len(search.front) == 1
    check(
        "best value of G08, one objective with constraints",
        search.front.points[0, 0],
        -0.0958250,
        absolute=2e-7,
        why="the published digits end there",
        source="Koziel, Michalewicz, Evol. Comput. 7 (1999) 19-44",
    )


def test_four_objectives_find_the_simplex() -> None:
    # f = share * (1 + d): the front is the simplex, which leaves out 1/4! of the corner 1.1^4.
    def evaluate(x: np.ndarray) -> Outcome:
        share = x[:, :4] / np.maximum(x[:, :4].sum(axis=1, keepdims=True), 1e-9)
        return Outcome(share * (1.0 + ((x[:, 4:] - 0.3) ** 2).sum(axis=1))[:, None], x[:, :1] - 2)

    variables = [Variable(f"x{i}", 0.0, 1.0) for i in range(8)]
    search = searched(evaluate, variables, (4, 1), 13, 4_000)
    share = hypervolume(search.front.points, [1.1] * 4) / (1.1**4 - 1.0 / 24.0)
    check.within(
        "share of the exact hypervolume of a simplex in four objectives",
        share,
        0.975,
        1.0,
        why="a finite set on a three-dimensional front; ten other seeds gave .981 to .984",
        source="1.1^4 less 1/4!, closed form",
    )


def test_the_same_seed_gives_the_same_designs_and_another_seed_others(plates) -> None:
    def asked(seed: int) -> list[bytes]:
        search = DecompositionSearch(plates.variables, 2, 1, seed)
        made = []
        for _ in range(8):
            x = search.ask()
            assert np.array_equal(search.ask(), x)  # asking again changes nothing
            made.append(x.tobytes())
            search.tell(plates.evaluate(x))
        return made

    assert asked(5) == asked(5)
    assert not set(asked(5)) & set(asked(6))


@pytest.mark.parametrize("generations", [0, 1, 7])
@pytest.mark.parametrize("pending", [False, True])
def test_a_search_goes_on_from_its_state_bit_for_bit(failing_plates, generations, pending) -> None:
    problem = failing_plates

    def new() -> DecompositionSearch:
        return DecompositionSearch(problem.variables, 2, 1, seed=9)

    first = new()
    for _ in range(generations):
        first.tell(problem.evaluate(first.ask()))
    if pending:
        first.ask()
    state = first.state()
    second = new()
    # As it comes back from a file: only what JSON holds, only plain arrays.
    second.restore(SearchState(state.arrays, json.loads(json.dumps(state.values))))
    for _ in range(5):
        x = first.ask()
        assert np.array_equal(second.ask(), x)
        first.tell(problem.evaluate(x))
        second.tell(problem.evaluate(x))
    assert np.array_equal(first.front.points, second.front.points)
    assert np.array_equal(first.front.evaluations, second.front.evaluations)


def test_designs_stay_in_their_bounds_and_fixed_ones_keep_their_value(plates) -> None:
    search = DecompositionSearch(plates.variables, 2, 1, seed=2)
    for _ in range(30):
        x = search.ask()
        for column, variable in zip(x.T, plates.variables, strict=True):
            assert (column >= variable.lower).all()
            assert (column <= variable.upper).all()
        search.tell(plates.evaluate(x))
    with pytest.raises(ProblemError, match="bounds differ"):
        DecompositionSearch([Variable("a", 1.0, 1.0)], 2, 0, seed=1)


def mixed(x: np.ndarray) -> Outcome:
    """A count n, a width y and a flag: odd counts need y >= 1/2, and the flag is best unset."""
    count, y, flag = x.T
    far = (y - 0.3) ** 2 + flag
    objectives = np.column_stack([count + far, 10.0 - count + far])
    return Outcome(objectives, np.where(count % 2 == 1, 0.5 - y, -1.0)[:, None])


MIXED = (
    Variable("count", 0, 10, integer=True),
    Variable("y", 0.0, 1.0),
    Variable("flag", 0, 1, integer=True),
)


@pytest.mark.parametrize("seed", [11, 12, 13])
def test_a_front_of_mixed_variables_is_found_whole(seed) -> None:
    search = searched(mixed, MIXED, (2, 1), seed, 3_000)
    # For each count the least of (y - 0.3)^2: zero for even ones, 0.2^2 at y = 1/2 for odd ones.
    count = np.arange(11)
    exact = np.column_stack([count, 10 - count]) + np.where(count % 2 == 1, 0.04, 0.0)[:, None]
    found = search.front.points
    for point in exact:
        assert (found >= point - 1e-12).all(axis=1).any()  # rounding
        # (y - 0.3)^2 falls below 1e-3 within 0.03 of the best even y, 0.003 of the best odd one.
        assert np.abs(found - point).max(axis=1).min() < 1e-3


def test_integers_are_whole_take_every_value_and_resume_bit_for_bit() -> None:
    search = DecompositionSearch(MIXED, 2, 1, seed=3)
    seen = set()
    for _ in range(6):
        x = search.ask()
        assert (x[:, [0, 2]] == np.round(x[:, [0, 2]])).all()
        assert (x >= 0.0).all()
        assert (x <= [10.0, 1.0, 1.0]).all()
        seen |= set(x[:, 0])
        search.tell(mixed(x))
    assert seen == set(range(11))
    again = DecompositionSearch(MIXED, 2, 1, seed=3)
    again.restore(search.state())
    assert np.array_equal(again.ask(), search.ask())


def test_integer_designs_are_not_asked_twice_while_others_are_left() -> None:
    variables = [Variable(f"n{i}", -3, 8, integer=True) for i in range(3)]
    search = DecompositionSearch(variables, 2, 0, seed=5)
    members = np.zeros((0, 3))
    for _ in range(8):
        x = search.ask()
        assert len(np.unique(np.concatenate([members, x]), axis=0)) == len(members) + len(x)
        search.tell(Outcome(np.column_stack([x[:, 0], -x[:, 0]]) + x[:, 1:2] ** 2, x[:, :0]))
        # Members stand at the middle of the share of each of the 12 values.
        members = np.unique(np.floor(search.state().arrays["unit"] * 12) - 3, axis=0)


def test_integers_of_which_all_were_asked_do_not_stop_the_search() -> None:
    search = DecompositionSearch([Variable("n", 0, 4, integer=True)], 1, 0, seed=5)
    for _ in range(5):
        x = search.ask()
        search.tell(Outcome((x - 2.0) ** 2, x[:, :0]))
    assert search.front.points.tolist() == [[0.0]]


@pytest.mark.parametrize("bounds", [(0.5, 3.0), (0.0, 2.5), (0.0, 2.0**40)])
def test_an_integer_needs_whole_bounds_of_moderate_size(bounds) -> None:
    with pytest.raises(ProblemError, match="not a whole number"):
        Variable("n", *bounds, integer=True)


@pytest.mark.parametrize("seed", [11, 12, 13])
def test_a_tiny_feasible_region_is_found_and_filled(seed) -> None:
    # A ball of radius 0.02 in four variables of the unit box: 0.02^4 pi^2 / 2, that is 8e-7 of
    # it. Its front is the arc of that radius in the first two variables.
    centre, radius = np.array([0.63, 0.27, 0.41, 0.58]), 0.02

    def evaluate(x: np.ndarray) -> Outcome:
        out = ((x - centre) ** 2).sum(axis=1) / radius**2 - 1.0
        return Outcome(x[:, :2], out[:, None])

    variables = [Variable(f"x{i}", 0.0, 1.0) for i in range(4)]
    search = searched(evaluate, variables, (2, 1), seed, 2_000)
    # Eight other seeds were there after 880 to 1,480 evaluations; at random it takes a million.
    assert len(search.front) > 0
    while search.evaluations < 4_000:
        search.tell(evaluate(search.ask()))
    # Below the centre: a quarter of the disc. Eight other seeds found .797 of it at least.
    exact = math.pi * radius**2 / 4.0
    share = hypervolume(search.front.points, centre[:2]) / exact
    assert 0.75 < share < 1.0


def test_failed_rows_enter_nothing(failing_plates) -> None:
    # A failed row of this problem claims -1e9, below everything that is possible.
    search = searched(failing_plates.evaluate, failing_plates.variables, (2, 1), 4, 4_000)
    state = search.state()
    assert search.front.points.min() >= 0.0
    assert state.arrays["objectives"].min() >= 0.0
    # The front still is found: x^2 and (x - 2)^2 for x from .5 to 2. Below (5, 5): the integral
    # of (5 - (x - 2)^2) 2x dx over the front, and the strip right of f1 = 4.
    x = np.linspace(0.5, 2.0, 4001)
    exact = np.trapezoid((5.0 - (x - 2.0) ** 2) * 2.0 * x, x) + 5.0
    got = hypervolume(search.front.points, [5.0, 5.0])
    assert 0.985 * exact < got < exact + 1e-6  # a finite set; one row in five is lost


def test_failures_do_not_stretch_the_scale_of_violations(plates) -> None:
    search = DecompositionSearch(plates.variables, 2, 1, seed=4)
    outcome = plates.evaluate(search.ask())
    outcome.constraints[:10] = 1e9
    failed = np.where(np.arange(len(outcome)) < 10, "failed", "ok")
    search.tell(Outcome(outcome.objectives, outcome.constraints, failed))
    assert search.state().arrays["largest_violation"][0] <= 1.5  # 0.5 - x with x >= -1


def test_a_first_generation_of_failures_is_followed_by_another_sample(plates) -> None:
    search = DecompositionSearch(plates.variables, 2, 1, seed=4)
    first = search.ask()
    nothing = np.full((search.size, 2), np.nan)
    search.tell(Outcome(nothing, nothing[:, :1], np.full(search.size, "failed")))
    second = search.ask()
    assert not np.array_equal(first, second)
    # Again one design in each of N slices of x, as a Latin hypercube has.
    slices = np.floor((second[:, 0] + 1.0) / 4.0 * search.size)
    assert sorted(slices) == list(range(search.size))
    search.tell(plates.evaluate(second))
    assert len(search.front) > 0


def test_one_good_row_is_enough_to_go_on(plates) -> None:
    search = DecompositionSearch(plates.variables, 2, 1, seed=4)
    outcome = plates.evaluate(search.ask())
    status = np.where(np.arange(search.size) == 17, "ok", "failed")
    search.tell(Outcome(outcome.objectives, outcome.constraints, status))
    for _ in range(20):
        search.tell(plates.evaluate(search.ask()))
    assert len(search.front) > 50


def test_telling_what_was_not_asked_is_refused(plates) -> None:
    search = DecompositionSearch(plates.variables, 2, 1, seed=4)
    with pytest.raises(ProblemError, match="0 were asked for"):
        search.tell(plates.evaluate(np.ones((search.size, 4))))
    search.ask()
    with pytest.raises(ProblemError, match=f"3 outcomes were told, {search.size} were asked for"):
        search.tell(plates.evaluate(np.ones((3, 4))))


@pytest.mark.parametrize(
    ("objectives", "size"), [(1, 40), (2, 40), (3, 36), (4, 84), (5, 126), (7, 112), (10, 65)]
)
def test_weights_lie_on_the_simplex_and_differ(objectives: int, size: int) -> None:
    weights = weight_vectors(objectives)
    # Das and Dennis: (h + m - 1) over h vectors; two layers from six objectives on.
    assert weights.shape == (size, objectives)
    assert np.allclose(weights.sum(axis=1), 1.0, rtol=0, atol=1e-12)  # rounding
    assert (weights > 0.0).all()
    if objectives > 1:
        assert len(np.unique(weights.round(9), axis=0)) == size
    order = neighbourhoods(weights)
    assert np.array_equal(order[:, 0], np.arange(size))
    assert (np.sort(order, axis=1) == np.arange(size)).all()


def test_neighbours_are_the_nearest_weights() -> None:
    weights = weight_vectors(3, 50)
    order = neighbourhoods(weights)
    distance = np.linalg.norm(weights[:, None] - weights[None], axis=2)
    ordered = np.take_along_axis(distance, order, axis=1)
    assert (np.diff(ordered, axis=1) > -1e-6).all()  # equal distances may differ in rounding
