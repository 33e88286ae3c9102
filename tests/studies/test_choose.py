"""Rankings worked by hand, scenario prices against a new evaluation, decisions on disk."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest
from click.testing import Result

from studies.choice.candidates import Pool, candidate_pools
from studies.choice.decision import decide
from studies.choice.preferences import Criterion, Preferences, preferences, scenario_prices
from studies.choice.ranking import AUGMENTATION, achievement, scale_of
from studies.choice.store import store_decision
from studies.errors import ResultsError
from studies.problem import machine_problem
from studies.stored.layout import open_results

Run = Callable[..., Result]
Write = Callable[..., Path]

# loss, cost: A, B, C are a front with ideal (1, 2), nadir (4, 10); B beats D.
FRONT = np.array([[1.0, 10.0], [2.0, 4.0], [4.0, 2.0], [5.0, 5.0]])
A, B, C, D = range(4)


def pool(values: np.ndarray, family: str = "Q6p2s1", folder: str = "results/hand") -> Pool:
    results = SimpleNamespace(folder=Path(folder), study=None)
    rows = len(values)
    owner = np.zeros(rows, dtype=np.int64)
    return Pool(family, results, family, (family,), owner, np.arange(rows), values, rows, {})  # type: ignore[arg-type]


def wanted(
    loss: float = 1.0,
    cost: float = 1.0,
    aspirations: tuple[float | None, float | None] = (None, None),
    method: str = "achievement",
) -> Preferences:
    criteria = (
        Criterion("loss_total_W", "W", False, loss, aspirations[0]),
        Criterion("cost", "money", False, cost, aspirations[1]),
    )
    return Preferences(criteria, (), {}, method)  # type: ignore[arg-type]


def order(preference: Preferences) -> list[int]:
    decision = decide([pool(FRONT)], preference, 10)
    assert decision is not None
    return [int(item.design[-1]) for item in decision.ranked]


def test_scores_by_hand() -> None:
    scale = scale_of(FRONT)
    assert scale.ideal.tolist() == [1.0, 2.0]
    assert scale.nadir.tolist() == [4.0, 10.0]
    scores = achievement(FRONT, scale.ideal, np.ones(2), scale)
    # max of (z - ideal) / (3, 8), plus the small sum.
    by_hand = [
        1.0 + AUGMENTATION * 1.0,
        1.0 / 3.0 + AUGMENTATION * (1.0 / 3.0 + 0.25),
        1.0 + AUGMENTATION * 1.0,
        4.0 / 3.0 + AUGMENTATION * (4.0 / 3.0 + 3.0 / 8.0),
    ]
    assert scores == pytest.approx(by_hand, rel=1e-12)


def test_preferences_move_along_the_front() -> None:
    assert order(wanted())[0] == B
    assert order(wanted(cost=0.2))[0] == A  # A: 0.2, B: 1/3, C: 1
    assert order(wanted(loss=0.2))[0] == C
    assert order(wanted(aspirations=(4.0, 2.0)))[0] == C  # exactly what was aspired to
    assert order(wanted(aspirations=(1.0, 10.0)))[0] == A
    # Aspirations that B surpasses in both (by 1/6 and 1/4 of the range) and no other does.
    assert order(wanted(aspirations=(2.5, 6.0)))[0] == B
    assert D not in order(wanted())  # beaten by B in both


def test_a_weighted_sum_misses_the_dent_that_achievement_finds() -> None:
    # The middle one lies above the line of the ends: no weights of a sum make it the best.
    dent = np.array([[0.0, 1.0], [0.6, 0.6], [1.0, 0.0]])
    for weight in np.linspace(0.05, 3.0, 40):
        by_sum = decide([pool(dent)], wanted(loss=weight, method="sum"), 1)
        assert by_sum is not None
        assert by_sum.taken.design[-1] != "1"
    by_distance = decide([pool(dent)], wanted(), 1)
    assert by_distance is not None
    assert by_distance.taken.design[-1] == "1"


def test_the_trade_is_against_the_best_of_all_families() -> None:
    other = np.array([[0.8, 12.0], [3.0, 3.0]])
    decision = decide([pool(FRONT), pool(other, "Q12p4s5")], wanted(), 2)
    assert decision is not None
    assert decision.best.tolist() == [0.8, 2.0]
    assert decision.best_design == ("Q12p4s5-000000", "Q6p2s1-000002")
    shown = {item.design: decision.given_share(item) for item in decision.ranked}
    assert shown["Q6p2s1-000001"] == pytest.approx([2.0 / 0.8 - 1.0, 4.0 / 2.0 - 1.0])
    assert [item.place for item in decision.ranked] == sorted(i.place for i in decision.ranked)
    # A best value of nearly nothing gives no sensible per cent.
    near_zero = decide([pool(np.array([[1e-6, 1.0], [1.0, 0.5]]))], wanted(), 2)
    assert near_zero is not None
    assert np.isnan(near_zero.given_share(near_zero.ranked[0])[0])


def test_maximised_criteria_count_the_other_way() -> None:
    criteria = (
        Criterion("efficiency", "1", True, 1.0),
        Criterion("cost", "money", False, 1.0, aspiration=3.0),
    )
    values = np.array([[0.90, 3.0], [0.95, 5.0], [0.80, 2.9]])
    decision = decide([pool(values)], Preferences(criteria, (), {}, "achievement"), 3)
    assert decision is not None
    assert decision.best.tolist() == [0.95, 2.9]
    # Terms (0.95 - e)/0.15 and (c - 3)/2.1: 1/3 and 0; 0 and 0.95; 1 and -0.05.
    assert [item.design[-1] for item in decision.ranked] == ["0", "1", "2"]
    assert decision.given_away(decision.taken) == pytest.approx([0.05, 0.1])


def test_another_design_may_be_taken_if_it_is_a_candidate() -> None:
    decision = decide([pool(FRONT)], wanted(), 1, take="Q6p2s1-000002")
    assert decision is not None
    assert decision.taken.design == "Q6p2s1-000002"
    for name in ("Q6p2s1-000009", "Q12p4s5-000001", "Q6p2s1.2-000002"):
        with pytest.raises(ResultsError, match="not among the candidates"):
            decide([pool(FRONT)], wanted(), 1, take=name)
    with pytest.raises(ResultsError, match="is no design"):
        decide([pool(FRONT)], wanted(), 1, take="nonsense")
    # Two searches of the family have evaluations of the same number.
    rows = np.arange(len(FRONT))
    names = ("Q6p2s1", "Q6p2s1.2")
    several = replace(pool(FRONT), searches=names, owner=rows % 2, evaluations=rows // 2)
    for name, values in zip(("Q6p2s1-000001", "Q6p2s1.2-000001"), FRONT[2:4], strict=True):
        taken = decide([several], wanted(), 1, take=name)
        assert taken is not None
        assert taken.taken.design == name
        assert np.array_equal(taken.taken.values, values)
    both = [pool(FRONT), pool(FRONT, folder="results/other")]
    with pytest.raises(ResultsError, match="several studies"):
        decide(both, wanted(), 1, take="Q6p2s1-000001")
    other = decide(both, wanted(), 1, take="other/Q6p2s1-000001")
    assert other is not None
    assert other.taken.pool is both[1]


@pytest.fixture
def swept(hovergap: Run, write_study: Write) -> Path:
    write_study()
    done = hovergap("sweep", "small.toml", "--budget", "150", "--workers", "1")
    assert done.exit_code == 0, done.output
    return Path("results/small")


def test_command_ranks_every_stored_design_and_stores_the_decision(
    hovergap: Run, swept: Path
) -> None:
    done = hovergap(
        "choose", swept, "--aspire", "cost=40", "--weight", "ripple_index=0", "--at-most",
        "tip_speed_m_s=60", "--because", "fits <b>the</b>\nskid", "--json",
    )  # fmt: skip
    assert done.exit_code == 0, done.output
    content = json.loads(done.stdout)
    # Brute force over the archive, without the code under test.
    results = open_results(swept)
    rows = []
    for family in results.study.families:
        from studies.stored.families import stored_search

        rows += stored_search(results, family).reader.table().to_pylist()
    rows = [row for row in rows if row["feasible"] and row["tip_speed_m_s"] <= 60.0]
    assert sum(item["meet_all_limits"] for item in content["candidates"]) == len(rows)
    z = np.array([[row["loss_total_W"], row["cost"]] for row in rows])
    beaten = [np.any(np.all(z <= p, axis=1) & np.any(z < p, axis=1)) for p in z]
    front = z[~np.array(beaten)]
    span = np.ptp(front, axis=0)
    terms = (z - [front[:, 0].min(), 40.0]) / span
    scores = terms.max(axis=1) + AUGMENTATION * terms.sum(axis=1)
    best = rows[int(np.argmin(scores))]
    assert content["ranking"][0]["score"] == pytest.approx(scores.min())
    assert content["ranking"][0]["values"]["cost"] == best["cost"]
    stored = json.loads((swept / "decisions" / "decision-0001.json").read_text())
    assert stored == content
    text = (swept / "decisions" / "decision-0001.txt").read_text()
    assert "fits <b>the</b> skid" in text  # text stays text, on one line
    assert content["design"] in text
    assert "burst" in text

    again = hovergap("choose", swept)
    assert again.exit_code == 0
    assert (swept / "decisions" / "decision-0002.txt").is_file()
    assert json.loads((swept / "decisions" / "decision-0001.json").read_text()) == content
    dry = hovergap("choose", swept, "--no-store")
    assert dry.exit_code == 0
    assert len(list((swept / "decisions").iterdir())) == 4
    # Decisions beside the families disturb nothing else.
    assert hovergap("status", swept).exit_code == 0


def test_no_design_left_says_why_and_stores_nothing(hovergap: Run, swept: Path) -> None:
    done = hovergap("choose", swept, "--at-most", "cost=0.001")
    assert done.exit_code == 3
    assert "cost at most 0.001" in done.output
    assert not (swept / "decisions").exists()


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("--weight", "cosst=1"), "'cost'"),
        (("--weight", "cost"), "NAME=NUMBER"),
        (("--weight", "cost=nan"), "NAME=NUMBER"),
        (("--weight", "cost=-1"), "0 or more"),
        (("--weight", "cost=1", "--weight", "cost=2"), "twice"),
        (("--aspire", "turns_per_coil=5"), "limit it instead"),
        (("--aspire", "cost=5", "--method", "sum"), "no use for aspiration"),
        (("--at-most", "coolness=5"), "metric"),
        (("--price", "gold=5"), "known are"),
        (("--price", "magnet=5", "--market", "high"), "not both"),
        (
            ("--weight", "cost=0", "--weight", "loss_total_W=0", "--weight", "ripple_index=0"),
            "no criterion",
        ),
    ],
)
def test_wrong_preferences_are_refused_in_one_sentence(
    hovergap: Run, swept: Path, arguments: tuple[str, ...], words: str
) -> None:
    done = hovergap("choose", swept, *arguments)
    assert done.exit_code == 2, done.output
    assert words in done.output
    assert len(done.output.strip().splitlines()) == 1
    assert not (swept / "decisions").exists()


def test_scenario_prices_equal_a_new_evaluation(hovergap: Run, write_study: Write) -> None:
    write_study(('name = "toy"', 'name = "analytic"'), ("at_most = 70.0", "at_most = 500.0"))
    assert hovergap("sweep", "small.toml", "--budget", "15", "--workers", "1").exit_code == 0
    results = open_results(Path("results/small"))
    scenario = {"magnet": 400.0, "copper": 1.0}
    asked = preferences(results.study, {}, {}, {}, {}, scenario, "achievement")
    for found in candidate_pools([results], asked):
        problem = machine_problem(results.study, found.family)
        prices = scenario_prices(results.study.prices, scenario)
        task = replace(problem.task, prices=prices)
        problem = replace(problem, task=task, _built={})
        from studies.stored.families import stored_search

        reader = stored_search(results, found.family).reader
        rows = [reader.row(int(item)) for item in found.evaluations]
        x = np.array([[row[item.name] for item in problem.variables] for row in rows])
        outcome = problem.evaluate(x)
        cost = [item.name for item in asked.criteria].index("cost")
        # Rounding only: masses are taken from stored figures instead of being solved again.
        assert found.values[:, cost] == pytest.approx(outcome.columns["cost"], rel=1e-9)
        own = np.array([row["cost"] for row in rows])
        assert (np.abs(found.values[:, cost] / own - 1.0) > 0.01).all()


def test_prices_that_cannot_be_reproduced_are_refused(hovergap: Run, swept: Path) -> None:
    done = hovergap("choose", swept, "--price", "magnet=1")  # the toy's cost is invented
    assert done.exit_code == 2
    assert "cannot be worked out again" in done.output


def test_decisions_are_numbered_and_never_replaced(tmp_path: Path) -> None:
    first, text = store_decision(tmp_path, {"n": 1}, "one")
    assert (first.name, text.name) == ("decision-0001.json", "decision-0001.txt")
    # A text of the next number is there already, from a process that died between its two files.
    (tmp_path / "decisions" / "decision-0002.txt").write_text("orphan")
    second, _ = store_decision(tmp_path, {"n": 2}, "two")
    assert second.name == "decision-0003.json"
    assert (tmp_path / "decisions" / "decision-0002.txt").read_text() == "orphan"
    assert json.loads(first.read_text()) == {"n": 1}
    assert not [item for item in (tmp_path / "decisions").iterdir() if item.name[0] == "."]


def test_two_processes_that_count_alike_do_not_share_a_number(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    from studies.choice import store

    monkeypatch.setattr(store, "_numbers", lambda place: [])  # both saw an empty folder
    first, _ = store_decision(tmp_path, {"n": 1}, "one")
    second, text = store_decision(tmp_path, {"n": 2}, "two")
    assert (first.name, second.name) == ("decision-0001.json", "decision-0002.json")
    assert json.loads(first.read_text()) == {"n": 1}
    assert text.read_text() == "two"
