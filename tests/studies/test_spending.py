"""How evaluations and time are spent on the families, and what is said when one ends early."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from click.testing import Result

from studies.running.spreading import Rows, prospects

Run = Callable[..., Result]
Write = Callable[..., Path]
Reader = Callable[[Path], list[dict[str, Any]]]

BUDGET = "evaluations_per_family = 200"
FOLDER = Path("results/small")


def states() -> dict[str, str]:
    from studies.running.status import study_status
    from studies.stored.layout import open_results

    return {
        item["family"]: item["state"] for item in study_status(open_results(FOLDER))["families"]
    }


def without_times(rows: list[dict[str, Any]]) -> list[dict[str, Any]]:
    own = ("time_s", "finished_at")
    return [{key: value for key, value in row.items() if key not in own} for row in rows]


def test_a_family_without_growth_ends_and_says_so(
    hovergap: Run, write_study: Write, rows: Reader
) -> None:
    keys = "evaluations_per_family = 5000\nstagnation_generations = 3\nstagnation_gain = 0.5"
    result = hovergap("sweep", write_study((BUDGET, keys)), "--workers", "1")
    assert result.exit_code == 0, result.output
    assert "Q6p2s1: ended early: hypervolume grew by" in result.output
    counts = {family: len(rows(FOLDER / family)) for family in ("Q6p2s1", "Q12p4s5")}
    assert all(0 < count < 5000 for count in counts.values())
    assert all(state.startswith("ended: hypervolume grew by") for state in states().values())
    said = hovergap("status", FOLDER)
    assert "complete" in said.output
    assert "in the last 3 generations" in said.output
    again = hovergap("resume", FOLDER, "--workers", "1")
    assert again.exit_code == 0, again.output
    assert "(0 new" in again.output
    assert {family: len(rows(FOLDER / family)) for family in counts} == counts


def test_a_family_with_nothing_feasible_is_given_up(hovergap: Run, write_study: Write) -> None:
    impossible = ("{ at_most = 70.0 }", "{ at_most = 1.0 }")
    keys = (BUDGET, "evaluations_per_family = 5000\nfeasible_within = 150")
    result = hovergap("sweep", write_study(impossible, keys), "--workers", "1")
    assert "ended early: no feasible design within 150 evaluations" in result.output
    assert "No feasible design was found in any family" in result.output
    assert states()["Q6p2s1"] == "ended: no feasible design within 150 evaluations"


def test_time_that_runs_out_is_given_again_on_resume(
    hovergap: Run, write_study: Write, rows: Reader
) -> None:
    slow = ('name = "toy"', 'name = "toy"\nsettings = { delay_s = 0.2 }')
    keys = (BUDGET, f"{BUDGET}\nwall_time_min = 0.01")
    result = hovergap("sweep", write_study(slow, keys), "--workers", "1")
    assert "ended early: its wall time of" in result.output
    assert any(state.startswith("begun: its wall time") for state in states().values())
    assert "to be continued" in hovergap("status", FOLDER).output
    for _ in range(20):  # each goes on by one call at least
        hovergap("resume", FOLDER, "--workers", "1")
        if set(states().values()) == {"complete"}:
            break
    assert set(states().values()) == {"complete"}
    assert [len(rows(FOLDER / family)) for family in ("Q6p2s1", "Q12p4s5")] == [200, 200]


def test_a_total_is_spent_and_interruptions_do_not_change_on_whom(
    hovergap: Run, write_study: Write, rows: Reader
) -> None:
    keys = (BUDGET, "evaluations_per_family = 900\ntotal_evaluations = 1000")
    file = write_study(keys)
    result = hovergap("sweep", file, "--workers", "1")
    assert result.exit_code == 0, result.output
    whole = {family: without_times(rows(FOLDER / family)) for family in ("Q6p2s1", "Q12p4s5")}
    # Rounds share by whole evaluations, so less than one a family and round is left.
    assert 1000 - 2 * 5 <= sum(map(len, whole.values())) <= 1000
    assert "ended early" in result.output
    assert all(state.startswith("ended: ") for state in states().values())
    # As if it had been interrupted after the first rounds: the rows there, not the rest.
    hovergap("sweep", file, "--results", "cut", "--budget", "250", "--workers", "1")
    hovergap("resume", "cut/small", "--budget", "900", "--workers", "1")
    for family, expected in whole.items():
        found = without_times(rows(Path("cut/small") / family))
        # A cut may have gone on where the whole did not, and has its rows besides.
        assert found[: len(expected)] == expected


def test_an_evaluation_that_hangs_is_a_row(hovergap: Run, write_study: Write, rows: Reader) -> None:
    slow = ('name = "toy"', 'name = "toy"\nsettings = { delay_s = 3600.0 }')
    # A call is evaluated whole, whatever the budget, and each row that hangs costs a process.
    limits = "evaluations_per_family = 2\ndesigns_per_call = 1\ntime_limit_s = 0.2"
    study = write_study(slow, (BUDGET, limits))
    result = hovergap("sweep", study, "--family", "Q6p2s1", "--workers", "2")
    assert result.exit_code != 0  # nothing feasible
    assert "Traceback" not in result.output
    found = [(row["status"], row["reason"]) for row in rows(FOLDER / "Q6p2s1")]
    assert found == [("timed out", "no answer within 0.2 s")] * 2


def test_the_limits_may_change_when_a_study_goes_on(hovergap: Run, write_study: Write) -> None:
    file = write_study((BUDGET, "evaluations_per_family = 60\nstagnation_generations = 3"))
    hovergap("sweep", file, "--workers", "1")
    stored = FOLDER / "study.toml"
    stored.write_text(
        stored.read_text().replace("stagnation_generations = 3", "feasible_within = 9")
    )
    result = hovergap("resume", FOLDER, "--budget", "120", "--workers", "1")
    assert result.exit_code == 0, result.output


@pytest.mark.parametrize(
    ("key", "said"),
    [
        ("total_evaluations = 150", "is too few for 2 families (got 150)"),
        ("stagnation_gain = 0.1", "has no effect without stagnation_generations"),
        ("stagnation_generations = 0", "stagnation_generations"),
        ("time_limit_s = -1.0", "time_limit_s"),
        ("time_limit_s = nan", "time_limit_s"),
        ("wall_time_min = inf", "wall_time_min"),
        ('feasible_within = "soon"', "feasible_within"),
    ],
)
def test_wrong_keys_are_found_before_anything_is_spent(
    hovergap: Run, write_study: Write, key: str, said: str
) -> None:
    result = hovergap("check", write_study((BUDGET, f"{BUDGET}\n{key}")))
    assert result.exit_code == 2, result.output
    assert said in result.output
    assert "Traceback" not in result.output


def test_a_damaged_note_is_no_note(hovergap: Run, write_study: Write) -> None:
    hovergap("sweep", write_study(), "--workers", "1")
    for text in ("{", "[]", json.dumps({"Q6p2s1": {"evaluations": "many"}}), "[" * 100_000):
        (FOLDER / "ended.json").write_text(text)
        assert set(states().values()) == {"complete"}


def line(values: np.ndarray, offset: float) -> np.ndarray:
    return np.column_stack([values, 1.0 - values]) + offset


def family(first: np.ndarray, second: np.ndarray, wanted: int = 100) -> Rows:
    """Half of the rows each; evaluations between are infeasible."""
    numbers = [np.arange(len(part)) + start for part, start in ((first, 0), (second, wanted // 2))]
    return Rows(np.concatenate(numbers), np.concatenate([first, second]), wanted)


def test_prospects_weigh_place_and_pace() -> None:
    t = np.linspace(0.0, 1.0, 11)
    leader = family(line(t, 0.0), line(t, 0.0))
    behind = family(line(t, 0.5), line(t, 0.499))  # gains next to nothing
    catching = family(line(t, 0.5), line(t, 0.1))  # gains much
    point = np.array([[-0.01, 1.0]])  # beside the leader's, so on the joint front
    beside = family(point, point)
    empty = family(np.zeros((0, 2)), np.zeros((0, 2)))
    rows = {
        "leader": leader,
        "behind": behind,
        "catching": catching,
        "beside": beside,
        "empty": empty,
    }
    most = dict.fromkeys(rows, 300)
    gone = prospects(rows, most)
    assert set(gone) == {"behind", "empty"}
    assert gone["empty"] == "no feasible design in 100 evaluations, other families have"
    assert gone["behind"].startswith("after 100 evaluations others dominate its whole front")
    # With nothing more to get, pace is of no use.
    assert set(prospects(rows, dict.fromkeys(rows, 100))) == {"behind", "catching", "empty"}
    assert prospects({"empty": empty}, most) == {}


def test_prospects_see_only_the_rows_they_were_asked_about() -> None:
    t = np.linspace(0.0, 1.0, 11)
    rows = family(line(t, 0.5), line(t, 0.1))
    assert rows.front(50).min() == pytest.approx(0.5)
    assert rows.front(100).min() == pytest.approx(0.1)
