"""Hostile study files: no traceback, nothing written outside the results, nothing started."""

from __future__ import annotations

import csv
import io
import shutil
import sys
import unicodedata
from collections.abc import Callable
from pathlib import Path

import hostile
import pytest
from click.testing import CliRunner, Result
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from studies.errors import StudyFileError
from studies.study_file.definition import study_from
from studies.tables import FORMULA_STARTS

Run = Callable[..., Result]
Write = Callable[..., Path]
QUICK, LONG = 40, 1500
WRITES = hostile.Writes()
SHARED = [HealthCheck.function_scoped_fixture, HealthCheck.too_slow]


def run(*arguments: str) -> Result:
    from studies.cli import main

    return CliRunner().invoke(main, list(arguments))


def check_result(result: Result) -> None:
    """A known exit code, no traceback, nothing that drives a terminal."""
    assert result.exit_code in (0, 1, 2, 3), (result.output, result.exception)
    assert result.exception is None or isinstance(result.exception, SystemExit)
    assert "Traceback" not in result.output
    controls = {sign for sign in result.output if unicodedata.category(sign) == "Cc"}
    assert controls <= {"\n", "\t"}, controls
    assert "\u202e" not in result.output
    if result.exit_code == 2:
        assert result.output.strip()


def check_study(content: bytes, folder: Path) -> None:
    """Check a file and, where it is a study, sweep and read it."""
    shutil.rmtree(folder, ignore_errors=True)
    folder.mkdir()
    file = folder / "hostile.toml"
    file.write_bytes(content)
    before = sys.dont_write_bytecode
    sys.dont_write_bytecode = True
    try:
        with WRITES.watched() as written:
            check_result(run("check", str(file)))
            sweep = ("--results", str(folder / "results"), "--budget", "4", "--workers", "1")
            result = run("sweep", str(file), *sweep)
            check_result(result)
            for stored in (folder / "results").glob("*"):
                for command in ("status", "compare"):
                    check_result(run(command, str(stored)))
    finally:
        sys.dont_write_bytecode = before
    assert hostile.outside(written, folder / "results") == []
    assert sorted(item.name for item in folder.iterdir()) in (
        ["hostile.toml"],
        ["hostile.toml", "results"],
    )
    for stored in (folder / "results").glob("*"):
        assert stored.name == study_from(content, "x").name


@settings(max_examples=QUICK, deadline=None, suppress_health_check=SHARED)
@given(st.data())
def test_hostile_studies(study_text: str, tmp_path: Path, data: st.DataObject) -> None:
    check_study(data.draw(hostile.hostile_studies(study_text)), tmp_path / "case")


@pytest.mark.slow
@settings(max_examples=LONG, deadline=None, suppress_health_check=list(HealthCheck))
@given(st.data())
def test_many_hostile_studies(study_text: str, tmp_path: Path, data: st.DataObject) -> None:
    check_study(data.draw(hostile.hostile_studies(study_text)), tmp_path / "case")


@settings(max_examples=200, deadline=None, suppress_health_check=SHARED)
@given(st.data())
def test_hostile_values_are_a_study_or_clear_findings(study_text: str, data: st.DataObject) -> None:
    content = data.draw(hostile.hostile_studies(study_text))
    try:
        study_from(content, "hostile.toml")
    except StudyFileError as error:
        for line in str(error).splitlines():
            assert line.startswith("hostile.toml")
            assert line.isprintable()
            assert len(line) < 1500


def test_the_watch_sees_what_it_must(tmp_path: Path) -> None:
    """Else a fuzz test that finds nothing would prove nothing."""
    with WRITES.watched() as written:
        (tmp_path / "file").write_text("x")
        (tmp_path / "folder").mkdir()
        (tmp_path / "file").rename(tmp_path / "moved")
        (tmp_path / "moved").read_text()
    assert len(hostile.outside(written, tmp_path / "results")) == 4
    assert hostile.outside(written, tmp_path) == []


@pytest.mark.parametrize("name", ["../escaped", "/escaped", "..", "a/b", "con\0", "-rf", ""])
def test_names_that_leave_the_results_folder(write_study: Write, hovergap: Run, name: str) -> None:
    file = write_study(('name = "small"', f"name = {hostile.quoted(name)}"))
    result = hovergap("sweep", file, "--budget", "4", "--workers", "1")
    check_result(result)
    assert result.exit_code == 2
    assert "study.name" in result.output
    assert not Path("results").exists()


@pytest.mark.parametrize("sign", ["\x1b[2J", "\0", "\r", "\x7f", "\u202e"])
def test_descriptions_that_would_drive_a_terminal(
    write_study: Write, hovergap: Run, sign: str
) -> None:
    text = f"a blower {sign}"
    file = write_study(('"an invented blower"', hostile.quoted(text)))
    result = hovergap("check", file)
    check_result(result)
    assert result.exit_code == 2
    assert "study.description: holds the control character" in result.output


def test_absurd_sizes(tmp_path: Path, hovergap: Run, study_text: str) -> None:
    big = tmp_path / "big.toml"
    big.write_text(study_text + "#" + "x" * 300_000)
    nested = tmp_path / "nested.toml"
    nested.write_text(study_text.replace('["Q6p2s1", "Q12p4s5"]', "[" * 5000 + "]" * 5000))
    wide = tmp_path / "wide.toml"
    rule = "slots = [" + ", ".join(map(str, range(3, 361))) + "]\npole_pairs = ["
    rule += ", ".join(map(str, range(1, 61))) + "]"
    wide.write_text(study_text.replace('list = ["Q6p2s1", "Q12p4s5"]', rule))
    for file in (big, nested, wide):
        result = hovergap("check", file)
        check_result(result)
        assert result.exit_code == 2, file


NASTY = '=HYPERLINK("http://x") <script>alert(1)</script> \x1b[31m'


@pytest.mark.skipif(shutil.which("awk") is None, reason="needs awk")
def test_what_a_program_says_harms_no_reader(
    write_study: Write, hovergap: Run, tmp_path: Path
) -> None:
    """Reasons come from outside: through the archive into terminal, CSV and HTML."""
    script = tmp_path / "solver.awk"
    reason = NASTY.replace('"', '\\\\\\"').replace("\x1b", "\\\\u001b")
    script.write_text(
        '/"rotor_radius_mm"/ { radius = $2 + 0 }\n'
        'END { printf "{\\"format\\": \\"hovergap field reply\\", \\"format_version\\": 1, "\n'
        f'  if (radius > 18) printf "\\"status\\": \\"failed\\", \\"reason\\": \\"{reason}\\"}}"\n'
        '  else printf "\\"status\\": \\"ok\\", \\"metrics\\": {\\"loss_total_W\\": %g, '
        '\\"cost\\": %g, \\"ripple_index\\": 1, \\"tip_speed_m_s\\": 9}}", radius, 30 - radius }\n'
    )
    program = f"""\
name = "external"
[evaluator.settings]
program = ["sh", "-c", "awk -f {script} request.json > reply.json"]
field = false
keep = "none"
metrics = ["loss_total_W", "cost", "ripple_index", "tip_speed_m_s"]
"""
    description = hostile.quoted(NASTY.replace("\x1b", ""))
    file = write_study(
        ('name = "toy"', program),
        ('description = "an invented blower"', f"description = {description}"),
        ("evaluations_per_family = 200", "evaluations_per_family = 16\ndesigns_per_call = 4"),
        ('list = ["Q6p2s1", "Q12p4s5"]', 'list = ["Q6p2s1"]'),
    )
    result = hovergap("sweep", file, "--workers", "1", "--allow-program")
    check_result(result)
    folder = "results/small"
    from studies import api

    stored = api.evaluations(folder)
    statuses, reasons = (stored[name].to_pylist() for name in ("status", "reason"))
    words = dict(zip(statuses, reasons, strict=True))
    assert words["failed"].startswith("=HYPERLINK")
    assert words["failed"].isprintable()
    good = stored["design"].to_pylist()[stored["status"].to_pylist().index("ok")]
    bad = stored["design"].to_pylist()[stored["status"].to_pylist().index("failed")]
    lines = ("--points", "5", "--indices", "none", "--workers", "1", "--allow-program")
    for command in (
        ("status", folder),
        ("compare", folder, "--csv", "families.csv", "--front-csv", "front.csv"),
        ("inspect", folder, good),
        ("inspect", folder, bad),
        ("export", folder, "--output", "fronts"),
        ("sensitivity", folder, good, *lines, "--output", "lines"),
        ("report", folder, "--output", "report.html", "--workers", "1"),
    ):
        result = hovergap(*command)
        check_result(result)
        assert result.exit_code == 0, (command, result.output)
    tables = [Path("families.csv"), Path("front.csv"), *Path("fronts").glob("*.csv")]
    seen = 0
    for table in (*tables, *Path("lines").glob("*.csv")):
        for row in csv.reader(io.StringIO(table.read_text())):
            for cell in row:
                seen += "HYPERLINK" in cell
                assert not cell.startswith(FORMULA_STARTS) or is_number(cell), (table, cell)
    assert seen, "a reason must have come through for this to prove anything"
    assert "<script>alert" not in Path("report.html").read_text()


def is_number(cell: str) -> bool:
    try:
        float(cell)
    except ValueError:
        return False
    return True
