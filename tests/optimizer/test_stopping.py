"""Rules that end a run early: by the rows alone, so that interruptions change nothing."""

from __future__ import annotations

import time

import numpy as np
import pytest

from optimizer.archive.archive import open_archive
from optimizer.errors import ProblemError
from optimizer.problem import Outcome
from optimizer.running.runner import run
from optimizer.running.stopping import StopRules
from optimizer.settings import Settings

STILL = StopRules(stagnation_generations=6, stagnation_gain=0.002)


def settings(budget: int = 6_000) -> Settings:
    return Settings(budget=budget, seed=5, population=100)


def test_a_front_that_grows_no_more_ends_the_run_where_its_volume_says(tmp_path, plates) -> None:
    volumes: dict[int, float] = {}
    for generations in range(1, 31):
        summary = run(plates, tmp_path / "known", settings(100 * generations))
        volumes[generations] = summary.hypervolume
    summary = run(plates, tmp_path / "ruled", settings(), rules=STILL)
    # The same rule from the figures of runs that end after each generation.
    still = [g for g in range(7, 31) if 0.0 < volumes[g] <= 1.002 * volumes[g - 6]]
    assert summary.evaluations == 100 * still[0]
    assert not summary.stopped
    gain = 100.0 * (volumes[still[0]] / volumes[still[0] - 6] - 1.0)
    assert summary.ended == f"hypervolume grew by {gain:.2g} % in the last 6 generations"


@pytest.mark.parametrize("snapshot", [True, False])
def test_interruptions_do_not_move_the_end(tmp_path, plates, rows_of, snapshot) -> None:
    whole = run(plates, tmp_path / "whole", settings(), rules=STILL)
    for budget in (130, 420, 700, 6_000, 6_000):
        pieces = run(plates, tmp_path / "pieces", settings(budget), rules=STILL)
        if not snapshot:
            (tmp_path / "pieces" / "state.npz").unlink()
    assert pieces.ended == whole.ended != ""
    assert pieces.new == 0
    assert rows_of(tmp_path / "pieces").equals(rows_of(tmp_path / "whole"))


def test_a_rule_that_comes_later_or_goes_again(tmp_path, plates, rows_of) -> None:
    whole = run(plates, tmp_path / "whole", settings(), rules=STILL)
    run(plates, tmp_path / "late", settings(300))  # its snapshot knows nothing of the rule
    late = run(plates, tmp_path / "late", settings(), rules=STILL)
    assert (late.evaluations, late.ended) == (whole.evaluations, whole.ended)
    beyond = run(plates, tmp_path / "late", settings(whole.evaluations + 150))
    assert (beyond.evaluations, beyond.ended) == (whole.evaluations + 150, "")
    # Rows there already are kept, and counted, though the rule would not have made them.
    again = run(plates, tmp_path / "late", settings(), rules=STILL)
    assert again.evaluations >= whole.evaluations + 150
    assert again.evaluations == open_archive(tmp_path / "late").rows


def test_a_search_without_anything_feasible_is_given_up(tmp_path, plates) -> None:
    evaluate = plates.evaluate

    def never(x: np.ndarray) -> Outcome:
        found = evaluate(x)
        return Outcome(found.objectives, found.constraints + 10.0, columns=found.columns)

    plates.evaluate = never
    summary = run(plates, tmp_path / "none", settings(), rules=StopRules(feasible_within=450))
    # Looked at after whole generations of a hundred.
    assert summary.evaluations == 500
    assert summary.ended == "no feasible design within 450 evaluations"
    # Without a feasible row no volume is measured, so nothing stagnates.
    still = run(plates, tmp_path / "still", settings(1_500), rules=STILL)
    assert (still.evaluations, still.ended) == (1_500, "")


def test_wall_time_ends_a_run_and_a_new_run_has_it_again(tmp_path, plates, rows_of) -> None:
    run(plates, tmp_path / "whole", settings(300))
    evaluate = plates.evaluate

    def slow(x: np.ndarray) -> Outcome:
        time.sleep(0.1)
        return evaluate(x)

    plates.evaluate = slow
    rules = StopRules(wall_time_s=0.35)
    first = run(plates, tmp_path / "timed", settings(300), rules=rules)
    assert first.ended == "its wall time of 0.35 s is used"
    # At most four calls of 0.1 s begin within 0.35 s; a busy machine may manage fewer.
    assert 0 < first.evaluations <= 100
    assert not first.stopped
    while first.ended:
        first = run(plates, tmp_path / "timed", settings(300), rules=rules)
    assert rows_of(tmp_path / "timed").equals(rows_of(tmp_path / "whole"))


@pytest.mark.parametrize(
    "wrong",
    [
        {"stagnation_generations": 0},
        {"stagnation_generations": 2.5},
        {"stagnation_gain": -0.1},
        {"stagnation_gain": float("nan")},
        {"feasible_within": True},
        {"wall_time_s": float("inf")},
        {"wall_time_s": -1.0},
    ],
)
def test_numbers_out_of_range_are_refused(wrong) -> None:
    with pytest.raises(ProblemError, match=f"{next(iter(wrong))} is .* is wanted"):
        StopRules(**wrong)
