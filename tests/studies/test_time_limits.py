"""The limit of time of one evaluation wherever designs are evaluated; evaluators that break."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from click.testing import Result

from optimizer.workers.dispatch import Serial
from studies import api
from studies.inspection import chosen as room

Run = Callable[..., Result]
Write = Callable[..., Path]
PLACE = "results/small"
ONE_FAMILY = ('list = ["Q6p2s1", "Q12p4s5"]', 'list = ["Q6p2s1"]')
LIMITED = ("evaluations_per_family = 200", "evaluations_per_family = 60\ntime_limit_s = 20.0")


@pytest.fixture
def limits(
    hovergap: Run, write_study: Write, monkeypatch: pytest.MonkeyPatch
) -> list[float | None]:
    """Limits that dispatchers are made with, after a sweep with a limit of 20 s."""
    result = hovergap("sweep", write_study(ONE_FAMILY, LIMITED), "--workers", "1")
    assert result.exit_code == 0, result.output
    found: list[float | None] = []

    def made(evaluator: str, workers: int | None, cluster: str, limit: float | None) -> Serial:
        del evaluator, workers, cluster
        found.append(limit)
        return Serial()

    monkeypatch.setattr(room, "made_dispatcher", made)
    return found


def test_the_study_s_limit_holds_for_the_study_s_evaluator(
    hovergap: Run, limits: list[float | None]
) -> None:
    design = "Q6p2s1-000003"
    finer = ("--evaluator", "toy_finer")
    tolerance = ("tolerance", PLACE, design, "--machines", "10")
    sensitivity = ("sensitivity", PLACE, design, "--points", "3", "--indices", "none")
    verify = ("verify", PLACE, "--top", "1")
    for command in (
        tolerance,
        sensitivity,
        (*verify, "--evaluator", "toy", "--setting", "delay_s=0.01"),
    ):
        result = hovergap(*command)
        assert result.exit_code == 0, result.output
        assert hovergap(*command, "--time-limit", "7").exit_code == 0
    for command in (tolerance, sensitivity, verify):
        assert hovergap(*command, *finer).exit_code == 0
        assert hovergap(*command, *finer, "--time-limit", "7").exit_code == 0
    api.tolerance(PLACE, design, machines=10)
    api.sensitivity(PLACE, design, points=3, indices="none", time_limit_s=7.0)
    api.verify(PLACE, top=2, evaluator="toy_finer")
    assert limits == [20.0, 7.0] * 3 + [None, 7.0] * 3 + [20.0, 7.0, None]


@pytest.mark.slow
def test_verify_gives_up_designs_that_take_too_long(hovergap: Run, write_study: Write) -> None:
    assert (
        hovergap("sweep", write_study(ONE_FAMILY), "--workers", "1", "--budget", "60").exit_code
        == 0
    )
    slow = ("--evaluator", "toy", "--setting", "delay_s=3600", "--time-limit", "0.3")
    result = hovergap("verify", PLACE, "--top", "1", *slow, "--workers", "2")
    assert result.exit_code == 0, result.output
    assert "could not be evaluated: no answer within 0.3 s" in result.output
    assert set(api.verified(PLACE, "toy")["status"].to_pylist()) == {"timed out"}


@pytest.mark.parametrize(
    ("name", "said"),
    [
        (
            "toy_broken",
            "(toy_evaluator:BrokenToyEvaluator) cannot be built: LookupError: no licence for",
        ),
        ("toy_missing", "cannot be built: ModuleNotFoundError: No module named 'toy_of_nobody'"),
    ],
)
def test_an_evaluator_that_cannot_be_built_is_named(
    hovergap: Run, write_study: Write, name: str, said: str
) -> None:
    result = hovergap("sweep", write_study(('name = "toy"', f'name = "{name}"')))
    assert result.exit_code == 2, result.output
    assert isinstance(result.exception, SystemExit)
    assert f"the evaluator '{name}'" in result.output
    assert said in result.output
    assert len(result.output.strip().splitlines()) == 1
