"""The table of agreement: its statistics on closed cases, and the page it makes."""

from __future__ import annotations

import itertools
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner

from optimizer.workers.dispatch import Serial
from studies.agreement import measure as room
from studies.agreement.page import main, page
from studies.problem import machine_problem
from studies.shipped.library import find_study


def test_constant_factor_is_the_deviation_and_leaves_ranks_alone() -> None:
    second = np.linspace(1.0, 2.0, 101)
    found = room.agreement("torque_ripple", 1.1 * second, second)
    assert found.median == pytest.approx(0.1)
    assert found.ninth_decile == pytest.approx(0.1)
    assert found.rank == pytest.approx(1.0)


def test_signed_metric_is_held_against_the_spread() -> None:
    """Differences of 0.8 over values even from -5 to 5, whose deciles are 8 apart."""
    second = np.linspace(-5.0, 5.0, 101)
    found = room.agreement("demagnetisation_margin_T", second - 0.8, second)
    assert found.median == pytest.approx(0.1)
    reversed_order = room.agreement("demagnetisation_margin_T", -second, second)
    assert reversed_order.rank == pytest.approx(-1.0)


def test_quantiles_are_of_the_share() -> None:
    second = np.full(101, 10.0)
    found = room.agreement("cost", second + np.arange(101) * 0.01, second)
    assert (found.median, found.ninth_decile) == pytest.approx((0.05, 0.09))
    assert np.isnan(found.rank)  # one of both does not vary


def test_designs_are_the_same_every_time_and_lie_in_the_box() -> None:
    study = find_study("compressor")
    problem = machine_problem(study, "Q6p2s1")
    first, again = (
        np.concatenate(list(itertools.islice(room._designs(problem, "Q6p2s1"), 2)))
        for _ in range(2)
    )
    np.testing.assert_array_equal(first, again)
    assert len(np.unique(first, axis=0)) == 2 * room.BATCH
    for column, item in enumerate(problem.variables):
        assert np.all((first[:, column] >= item.lower) & (first[:, column] <= item.upper))


def test_evaluator_against_itself_agrees_wholly(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    monkeypatch.setattr(room, "SECOND", room.FIRST)
    study = find_study("compressor")
    found = room.family_agreement(study, "Q6p2s1", 30, Serial(), tmp_path)
    assert found.compared >= 30
    assert room.unaffected([found]) == list(found.metrics)
    assert all(item.median == 0.0 for item in found.metrics.values())
    kept = list(tmp_path.rglob("*.npz"))
    assert len(kept) == found.drawn // room.BATCH
    # What is kept is used: with other values in the file the agreement is another.
    with np.load(kept[0]) as stored:
        changed = {name: 2.0 * stored[name] for name in stored.files}
    np.savez(kept[0], **changed)
    again = room.family_agreement(study, "Q6p2s1", 30, Serial(), tmp_path)
    assert again.metrics["cost"].median == pytest.approx(0.5)


def test_page_names_goals_missed_and_metrics_that_do_not_differ() -> None:
    good = room.Agreement(0.01, 0.02, 0.99)
    names = ["torque_per_length_Nm_m", "force_per_length_N_m", "loss_iron_W", "efficiency", "cost"]
    names += ["torque_ripple", "force_error_magnitude", "force_error_angle_deg"]
    metrics = dict.fromkeys(names, good)
    same = {"tip_speed_m_s": room.Agreement(0.0, 0.0, 1.0)}
    bad = {**metrics, "torque_ripple": room.Agreement(0.4, 0.9, 0.75)}
    families = [
        room.FamilyAgreement("one", family, 256, 250, 0, 1, {**values, **same})
        for family, values in (("Q6p2s1", metrics), ("Q12p4s5", bad))
    ]
    text = page(families, "the command", ["hovergap 1"])
    ripple = [line for line in text.splitlines() if line.startswith("| `torque_ripple`")]
    assert "one Q12p4s5 | missed in 1 of 2" in ripple[0]
    assert ripple[1].endswith("| 0.750 | one Q12p4s5 | poor |")
    assert ripple[2] == "| `torque_ripple` | 1.0 %, 2.0 %, 0.990 | 40.0 %, 90.0 %, 0.750 |"
    assert text.count("tip_speed_m_s") == 1
    assert "`the command`" in text


@pytest.mark.slow
def test_command_writes_the_page(tmp_path: Path) -> None:
    file = tmp_path / "page.md"
    options = ["--designs", "10", "--study", "compressor", "--family", "Q6p2s1"]
    result = CliRunner().invoke(main, [*options, "--output", str(file)])
    assert result.exit_code == 0, result.output
    text = file.read_text()
    assert "| compressor Q6p2s1 | 64 |" in text
    assert "finite_element" in text
