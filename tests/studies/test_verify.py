"""Stored designs evaluated again: values, limits, interruption, damage, versions, comparison."""

from __future__ import annotations

import importlib
import json
import os
import signal
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from click.testing import Result

from optimizer.archive.archive import open_archive
from optimizer.archive.parts import part_paths
from studies.comparison.numbers import compare_families
from studies.stored.families import matrix
from studies.stored.layout import open_results
from studies.stored.verified import read_verified, verified_folder
from studies.verification.selection import read_settings

Run = Callable[..., Result]
Write = Callable[..., Path]
FAMILY = "Q6p2s1"
PLACE = Path("results/small")
ROUNDING = 1e-12  # the toys multiply by 1.1 and 1.5; the rest is the last bits of doubles


@pytest.fixture
def searched(write_study: Write, hovergap: Run) -> Path:
    found = hovergap("sweep", write_study(), "--budget", "200", "--workers", "1")
    assert found.exit_code == 0, found.output
    return PLACE


def verify(hovergap: Run, *arguments: str) -> Result:
    options = ["--evaluator", "toy_finer", "--workers", "1"]
    return hovergap("verify", PLACE, *options, *arguments)


def stored(family: str = FAMILY) -> pa.Table:
    paths = part_paths(verified_folder(PLACE / family, "toy_finer"))
    table = pa.concat_tables([pq.read_table(path) for path in paths], promote_options="default")
    return table.sort_by("evaluation")


def test_both_values_and_the_deviation_are_stored_side_by_side(
    searched: Path, hovergap: Run
) -> None:
    result = verify(hovergap, "--front")
    assert result.exit_code == 0, result.output
    front = open_archive(searched / FAMILY).front().sort_by("evaluation")
    table = stored()
    assert table["evaluation"].to_pylist() == front["evaluation"].to_pylist()
    loss = front["loss_total_W"].to_numpy()
    np.testing.assert_array_equal(table["stored:loss_total_W"].to_numpy(), loss)
    np.testing.assert_allclose(table["loss_total_W"].to_numpy(), 1.1 * loss, rtol=ROUNDING)
    change = table["deviation:loss_total_W"].to_numpy()
    np.testing.assert_allclose(change, 0.1, rtol=1e3 * ROUNDING)  # a difference of near numbers
    np.testing.assert_array_equal(table["deviation:cost"].to_numpy(), 0.0)
    assert set(table["evaluator_version"].to_pylist()) == {"1"}
    # All rows lie in one part at the end, which any Parquet reader takes with units.
    assert len(part_paths(verified_folder(searched / FAMILY, "toy_finer"))) == 1
    assert table.schema.field("loss_total_W").metadata[b"unit"] == b"W"


def test_table_says_medians_and_broken_limits(searched: Path, hovergap: Run) -> None:
    output = verify(hovergap, "--front").output
    losses = [line for line in output.splitlines() if line.startswith("loss_total_W")]
    assert len(losses) == 2  # one a family
    assert all(line.count("+10.0 %") == 2 for line in losses)
    table = stored()
    over = table["tip_speed_m_s"].to_numpy() > 70.0
    assert over.any()
    np.testing.assert_array_equal(~over, table["feasible"].to_numpy())
    number = table["evaluation"].to_pylist()[int(np.flatnonzero(over)[0])]
    assert f"{FAMILY}-{number:06d} breaks a limit: tip_speed_m_s at most 70 m/s, is " in output


def test_top_takes_the_nearest_and_the_best_of_each_objective(
    searched: Path, hovergap: Run
) -> None:
    assert verify(hovergap, "--top", "2", "--family", FAMILY).exit_code == 0
    comparison = compare_families([open_results(searched)])
    front = next(item.stored for item in comparison.members if item.stored.family == FAMILY)
    points = (front.front_objectives - comparison.ideal) / (comparison.nadir - comparison.ideal)
    order = sorted(range(len(points)), key=lambda row: float(np.linalg.norm(points[row])))
    wanted = {*order[:2], *(int(np.argmin(points[:, k])) for k in range(points.shape[1]))}
    numbers = front.front["evaluation"].to_pylist()
    assert stored()["evaluation"].to_pylist() == sorted(numbers[row] for row in wanted)
    assert not verified_folder(searched / "Q12p4s5", "toy_finer").exists()


def test_going_on_evaluates_only_what_is_missing(searched: Path, hovergap: Run) -> None:
    verify(hovergap, "--top", "1", "--family", FAMILY)
    first = stored()
    output = verify(hovergap, "--front", "--family", FAMILY).output
    front = open_archive(searched / FAMILY).front().num_rows
    assert f"{front} designs verified by toy_finer 1 ({front - first.num_rows} now)" in output
    both = stored()
    kept = both.filter(
        pa.array([n in first["evaluation"].to_pylist() for n in both["evaluation"].to_pylist()])
    )
    assert kept["finished_at"].to_pylist() == first["finished_at"].to_pylist()
    assert "(0 now)" in verify(hovergap, "--front", "--family", FAMILY).output


def test_ctrl_c_keeps_what_is_done_and_the_printed_command_goes_on(
    searched: Path, hovergap: Run
) -> None:
    front = open_archive(searched / FAMILY).front().num_rows
    assert front > 24  # more than three chunks
    command = [sys.executable, "-m", "studies", "verify", str(PLACE), "--front"]
    options = ["--evaluator", "toy_finer", "--workers", "1", "--setting", "delay_s=0.3"]
    child = subprocess.Popen(
        [*command, *options, "--family", FAMILY],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
    )
    folder = verified_folder(searched / FAMILY, "toy_finer")
    for _ in range(600):
        if folder.is_dir() and part_paths(folder):
            break
        assert child.poll() is None, child.communicate()
        time.sleep(0.05)
    os.killpg(child.pid, signal.SIGINT)
    output, errors = child.communicate(timeout=60)
    assert child.returncode == 130, output + errors
    assert "Traceback" not in output + errors
    done = stored()
    assert 0 < done.num_rows < front
    line = next(item.strip() for item in output.splitlines() if item.startswith("  hovergap"))
    again = hovergap(*line.split()[1:], "--workers", "1")
    assert again.exit_code == 0, again.output
    assert f"({front - done.num_rows} now)" in again.output
    assert stored().num_rows == front


def test_killed_at_any_moment_nothing_done_is_lost(searched: Path, hovergap: Run) -> None:
    """Parts of chunks that were never merged count like the merged one."""
    verify(hovergap, "--front", "--family", FAMILY)
    folder = verified_folder(searched / FAMILY, "toy_finer")
    whole = stored()
    (part,) = part_paths(folder)
    part.unlink()
    from optimizer.archive.parts import write_part

    write_part(folder, 3, whole.slice(0, 8))
    write_part(folder, 4, whole.slice(5, 6))  # rows twice, as after a crash while merging
    output = verify(hovergap, "--front", "--family", FAMILY).output
    assert f"({whole.num_rows - 11} now)" in output
    assert stored()["evaluation"].to_pylist() == whole["evaluation"].to_pylist()


def test_damaged_part_is_said_set_aside_and_verified_again(searched: Path, hovergap: Run) -> None:
    verify(hovergap, "--front")
    folder = verified_folder(searched / FAMILY, "toy_finer")
    whole = stored()
    (part,) = part_paths(folder)
    data = bytearray(part.read_bytes())
    data[len(data) // 2] ^= 0x10
    part.write_bytes(data)
    assert read_verified(searched / FAMILY, "toy_finer").damaged == (part,)
    compared = hovergap("compare", PLACE, "--verified")
    assert compared.exit_code == 1
    assert f"{part}: is damaged" in compared.output
    output = verify(hovergap, "--front").output
    assert "a damaged part was set aside" in output
    assert f"({whole.num_rows} now)" in output
    assert stored().drop_columns(["time_s", "finished_at"]) == whole.drop_columns(
        ["time_s", "finished_at"]
    )


def test_changed_version_is_said_and_verified_again(
    searched: Path, hovergap: Run, monkeypatch: pytest.MonkeyPatch
) -> None:
    verify(hovergap, "--top", "1", "--family", FAMILY)
    count = stored().num_rows
    toys = importlib.import_module("toy_evaluator")
    monkeypatch.setattr(toys.FinerToyEvaluator, "version", "2")
    output = verify(hovergap, "--top", "1", "--family", FAMILY).output
    assert f"{count} designs verified before by toy_finer 1, now again by toy_finer 2" in output
    assert f"({count} now)" in output
    assert stored()["evaluator_version"].to_pylist() == ["2"] * count


def test_changed_settings_are_verified_again(searched: Path, hovergap: Run) -> None:
    verify(hovergap, "--top", "1", "--family", FAMILY)
    output = verify(hovergap, "--top", "1", "--family", FAMILY, "--setting", "delay_s=0.0").output
    assert 'now again by toy_finer 1 with settings {"delay_s": 0.0}' in output


def test_failing_designs_are_rows_with_a_reason(searched: Path, hovergap: Run) -> None:
    setting = ["--setting", "invalid_above_mm=14.0"]
    result = verify(hovergap, "--front", "--family", FAMILY, *setting)
    assert result.exit_code == 0, result.output
    assert "could not be evaluated: the rotor is too large for the toy" in result.output
    table = stored()
    failed = np.array(table["status"].to_pylist()) != "ok"
    assert 0 < failed.sum() < len(failed)
    np.testing.assert_array_equal(np.isnan(table["loss_total_W"].to_numpy()), failed)


def test_comparison_counts_with_verified_values(searched: Path, hovergap: Run) -> None:
    results = open_results(searched)
    verify(hovergap, "--front", "--family", FAMILY)
    plain, counted, only = (
        {
            item.stored.family: item.stored
            for item in compare_families([results], *by, **how).members
        }
        for by, how in (((), {}), (("toy_finer",), {}), (("toy_finer",), {"verified_only": True}))
    )
    table = counted[FAMILY].front
    assert set(table["evaluator"].to_pylist()) == {"toy_finer"}
    assert table["tip_speed_m_s"].to_numpy().max() <= 70.0
    before = plain[FAMILY].front.to_pylist()
    losses = {row["evaluation"]: row["loss_total_W"] for row in before}
    expected = [1.1 * losses[number] for number in table["evaluation"].to_pylist()]
    np.testing.assert_allclose(matrix(table, ["objective:loss_total_W"])[:, 0], expected, ROUNDING)
    assert counted["Q12p4s5"].front == plain["Q12p4s5"].front
    assert only["Q12p4s5"].front.num_rows == 0
    output = hovergap("compare", PLACE, "--verified").output
    kept = sum(row["tip_speed_m_s"] * 1.5 <= 70.0 for row in before)
    words = [FAMILY, "toy_finer 1", str(len(before)), str(len(before)), str(len(before) - kept)]
    assert any(
        [cell.strip() for cell in line.split("  ") if cell][:5] == words
        for line in output.splitlines()
    )
    assert "--verified-only" in output  # the other family's values are the search's
    table = json.loads(hovergap("compare", PLACE, "--verified", "--json").output)
    assert [item["verified"]["verified"] for item in table["families"]] == [len(before), 0]


def test_family_without_a_verified_feasible_design_says_so(searched: Path, hovergap: Run) -> None:
    verify(hovergap, "--front", "--setting", "invalid_above_mm=1.0")
    output = hovergap("compare", PLACE, "--verified").output
    assert f"{FAMILY} has no verified design that meets all limits." in output


def test_inspect_shows_both_side_by_side(searched: Path, hovergap: Run) -> None:
    verify(hovergap, "--front", "--family", FAMILY)
    row = stored().to_pylist()[0]
    name = f"{FAMILY}-{row['evaluation']:06d}"
    output = hovergap("inspect", PLACE, name).output
    assert "Verified by toy_finer 1: " in output
    shown = [line.split() for line in output.splitlines() if line.startswith("loss_total_W")][-1]
    assert shown[1] == "W"
    assert float(shown[3]) == pytest.approx(1.1 * float(shown[2]), rel=1e-3)  # four digits shown
    assert shown[4:] == ["10.0", "%"]
    found = json.loads(hovergap("inspect", PLACE, name, "--json").output)["verified"][0]
    assert found["metrics"]["loss_total_W"] == row["loss_total_W"]
    assert found["deviations"]["loss_total_W"] == pytest.approx(0.1, rel=1e3 * ROUNDING)


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["--evaluator", "toy"], "searched with toy 1 and the same settings"),
        (["--evaluator", "none_such"], "no evaluator is called 'none_such'"),
        (["--setting", "delay"], "write it as NAME=VALUE"),
        (["--setting", "speed=1"], "there is no setting 'speed'"),
        (["--family", "Q6p9s1"], "no family 'Q6p9s1'"),
        (["--top", "3", "--front"], "exclude each other"),
    ],
)
def test_bad_options_are_refused_in_one_sentence(
    searched: Path, hovergap: Run, arguments: list[str], words: str
) -> None:
    result = verify(hovergap, *arguments)
    assert result.exit_code == 2, result.output
    assert words in result.output
    assert not list(searched.glob("*/verified-*"))


def test_comparison_without_verified_values_says_how_to_get_them(
    searched: Path, hovergap: Run
) -> None:
    result = hovergap("compare", PLACE, "--verified")
    assert result.exit_code == 2
    assert "hovergap verify results/small" in result.output


def test_settings_are_read_as_toml_or_as_text() -> None:
    texts = ["refinement=2", "analysis=transient", "cells={ tooth = 3 }", "x = 0.5"]
    wanted = {"refinement": 2, "analysis": "transient", "cells": {"tooth": 3}, "x": 0.5}
    assert read_settings(texts) == wanted


@pytest.mark.slow
def test_with_the_finite_element_evaluator(write_study: Write, hovergap: Run) -> None:
    """Torque of both field models agrees to a few per cent; their force errors need not."""
    replaced = [
        ('name = "toy"', 'name = "analytic"'),
        ("tooth_width_ratio = 0.5", "tooth_width_ratio = [0.35, 0.6]"),
    ]
    assert hovergap("sweep", write_study(*replaced), "--budget", "60").exit_code == 0
    result = hovergap("verify", PLACE, "--top", "1", "--family", FAMILY, "--workers", "1")
    assert result.exit_code == 0, result.output
    rows = [row for row in read_verified(PLACE / FAMILY, "finite_element").rows.values() if row.ok]
    assert rows
    for row in rows:
        # The length follows from torque per metre; 10 % is far above the models' disagreement on
        # an unsaturated machine and far below a wrong unit or a wrong design.
        assert abs(row.number("deviation:stack_length_mm")) < 0.1
        assert row.number("loss_iron_W") != row.number("stored:loss_iron_W")
