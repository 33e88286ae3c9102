"""A study whose evaluator is a program of the user's own: consent, and the way through."""

from __future__ import annotations

import json
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from click.testing import Result

Run = Callable[..., Result]
Write = Callable[..., Path]
Rows = Callable[[Path], list[dict[str, Any]]]

SOLVER = Path(__file__).parents[1] / "evaluators/external/slotless.awk"
DESIGN = "Q6p2s1-000000"

pytestmark = pytest.mark.skipif(shutil.which("awk") is None, reason="the example solver needs awk")


@pytest.fixture
def study(write_study: Write, tmp_path: Path) -> Path:
    """The small study with a solver in awk; it leaves a mark whenever it runs."""
    (tmp_path / "run").mkdir()
    program = f"""\
[evaluator]
name = "external"
[evaluator.settings]
program = ["awk", "-v", "mark={tmp_path}/mark", "-f", "{tmp_path}/solver.awk", "request.json"]
folder = "{tmp_path}/run"
version = "example 0.1"
"""
    text = SOLVER.read_text() + '\nEND { print "run" >> mark }\n'
    (tmp_path / "solver.awk").write_text(text)
    return write_study(
        ('[evaluator]\nname = "toy"\n', program),
        ("evaluations_per_family = 200", "evaluations_per_family = 12\ndesigns_per_call = 1"),
        ('list = ["Q6p2s1", "Q12p4s5"]', 'list = ["Q6p2s1"]'),
        ("tip_speed_m_s = { at_most = 70.0 }", "tip_speed_m_s = { at_most = 400.0 }"),
    )


def swept(hovergap: Run, study: Path) -> Path:
    result = hovergap("sweep", study, "--workers", "1", "--allow-program")
    assert result.exit_code == 0, result.output
    return Path("results/small")


def refusal(result: Result) -> str:
    assert result.exit_code == 2, result.output
    assert result.exception is None or isinstance(result.exception, SystemExit)
    assert "--allow-program" in result.output
    return result.output


def test_sweep_starts_nothing_without_consent(hovergap: Run, study: Path, tmp_path: Path) -> None:
    output = refusal(hovergap("sweep", study, "--workers", "1"))
    assert f"awk -v mark={tmp_path}/mark -f {tmp_path}/solver.awk request.json" in output
    assert not (tmp_path / "mark").exists()
    assert not Path("results").exists()
    assert list((tmp_path / "run").iterdir()) == []
    checked = hovergap("check", study)
    assert checked.exit_code == 0
    assert "only with --allow-program" in checked.output
    assert "solver.awk" in checked.output
    assert not (tmp_path / "mark").exists()


def test_sweep_and_resume_with_consent(
    hovergap: Run, study: Path, rows: Rows, tmp_path: Path
) -> None:
    result = hovergap("sweep", study, "--workers", "2", "--allow-program")
    assert result.exit_code == 0, result.output
    assert "starting for every design: awk -v" in result.output
    folder = Path("results/small")
    stored = rows(folder / "Q6p2s1")
    assert len(stored) == 12
    good = [row for row in stored if row["status"] == "ok"]
    assert len(good) >= 6, [row["reason"] for row in stored]
    assert {row["evaluator_version"] for row in stored} == {"1 example 0.1"}
    # One run for each design that has a cross-section.
    runs = (tmp_path / "mark").read_text().count("run")
    assert runs == sum(row["status"] != "invalid geometry" for row in stored)
    for row in good:
        # The solver's torque and the duty make the stack length: T l = P / omega + friction.
        assert row["torque_Nm"] >= 2000.0 / (30_000 * 3.14159265 / 30) * (1.0 - 1e-6)
        assert row["torque_ripple"] == 0.0

    # Consent was for that command alone and stands in no file.
    for file in folder.rglob("*"):
        assert not file.is_file() or b"allow_program" not in file.read_bytes()
    before = (tmp_path / "mark").read_text()
    refusal(hovergap("resume", folder, "--budget", "16", "--workers", "1"))
    assert (tmp_path / "mark").read_text() == before
    result = hovergap("resume", folder, "--budget", "16", "--workers", "1", "--allow-program")
    assert result.exit_code == 0, result.output
    assert rows(folder / "Q6p2s1")[:12] == stored
    assert len(rows(folder / "Q6p2s1")) == 16


def test_what_only_reads_needs_no_consent(hovergap: Run, study: Path, tmp_path: Path) -> None:
    folder = swept(hovergap, study)
    before = (tmp_path / "mark").read_text()
    for command in (
        ("status", folder),
        ("compare", folder),
        ("inspect", folder, DESIGN),
        ("export", folder, "--output", "fronts"),
        ("export", folder, DESIGN, "--output", "design"),
        ("choose", folder, "--no-store"),
    ):
        result = hovergap(*command)
        assert result.exit_code == 0, (command, result.output)
    assert (tmp_path / "mark").read_text() == before


def test_every_command_that_evaluates_asks(hovergap: Run, study: Path, tmp_path: Path) -> None:
    folder = swept(hovergap, study)
    before = (tmp_path / "mark").read_text()
    sensitivity = ("sensitivity", folder, DESIGN, "--points", "3", "--indices", "none")
    tolerance = ("tolerance", folder, DESIGN, "--machines", "10", "--json")
    changed = "program=['true']"
    verify = ("verify", folder, "--top", "1", "--evaluator", "external", "--setting", changed)
    for command in (sensitivity, tolerance, verify):
        refusal(hovergap(*command, "--workers", "1"))
    assert (tmp_path / "mark").read_text() == before
    result = hovergap(*sensitivity, "--workers", "1", "--allow-program")
    assert result.exit_code == 0, result.output
    assert (tmp_path / "mark").read_text() != before
    # The announcement does not get among the JSON.
    quick = ("--scatter", "tooth_width_mm=0.05", "--only", "--workers", "1", "--allow-program")
    result = hovergap(*tolerance, *quick)
    assert result.exit_code == 0, result.output
    assert json.loads(result.stdout)
    assert "starting for every design" in result.stderr


def test_program_in_a_stored_study_is_not_trusted_either(
    hovergap: Run, write_study: Write, tmp_path: Path
) -> None:
    """A results folder from somebody else, its copy of the study changed to start a program."""
    assert hovergap("sweep", write_study(), "--budget", "30", "--workers", "1").exit_code == 0
    frozen = Path("results/small/study.toml")
    mark = tmp_path / "mark"
    program = f'name = "external"\nsettings = {{ program = ["touch", "{mark}"] }}'
    frozen.write_text(frozen.read_text().replace('name = "toy"', program))
    for command in (
        ("resume", "results/small", "--budget", "60"),
        ("sensitivity", "results/small", DESIGN),
        ("tolerance", "results/small", DESIGN),
    ):
        # What is stored was not made by this program, which is said before consent is asked for.
        result = hovergap(*command, "--workers", "1")
        assert result.exit_code == 2
        assert "touch" in result.output
    hovergap("report", "results/small")
    hovergap("sheet", "results/small", DESIGN)
    assert not mark.exists()


def test_missing_program_is_said_before_anything_is_made(hovergap: Run, study: Path) -> None:
    study.write_text(study.read_text().replace('program = ["awk"', 'program = ["no-such-awk"'))
    result = hovergap("sweep", study, "--allow-program", "--workers", "1")
    assert result.exit_code == 2
    assert "'no-such-awk' is neither a program on the path" in result.output
    assert not Path("results").exists()
