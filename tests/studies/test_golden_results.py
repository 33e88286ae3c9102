"""Results folders written by earlier versions stay readable, and can be continued."""

from __future__ import annotations

import json
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pyarrow.parquet as pq
import pytest
from click.testing import Result

from optimizer.archive.archive import open_archive
from optimizer.archive.identity import SEARCH_VERSION
from studies.stored.layout import LAYOUT, open_results

Run = Callable[..., Result]
Rows = Callable[[Path], list[dict[str, Any]]]
GOLDEN = Path(__file__).parent / "golden" / "layout_1" / "small"
FAMILIES = ["Q6p2s1", "Q12p4s5"]


@pytest.fixture
def old(tmp_path: Path) -> Path:
    """A copy, for nothing may change the golden files themselves."""
    shutil.copytree(GOLDEN, tmp_path / "results" / "small")
    return Path("results/small")


def content(result: Result) -> Any:
    assert result.exit_code == 0, result.output
    return json.loads(result.output)


def test_what_was_asked_for_is_read(old: Path) -> None:
    request = open_results(old).request
    assert list(request.families) == FAMILIES
    assert (request.evaluations_per_family, request.seed) == (30, 3)
    assert request.origin == "/nowhere/small.toml"
    assert json.loads((old / "study.json").read_text())["layout"] == 1


def test_another_layout_is_refused(old: Path, hovergap: Run) -> None:
    file = old / "study.json"
    file.write_text(file.read_text().replace('"layout": 1', f'"layout": {LAYOUT + 1}'))
    for command in ("status", "compare", "resume"):
        result = hovergap(command, old)
        assert result.exit_code == 2
        text = f"{file}: layout {LAYOUT + 1} is of another version of hovergap\n"
        assert result.output == text


def test_status(old: Path, hovergap: Run) -> None:
    entry = content(hovergap("status", old, "--json"))[0]
    assert entry["state"] == "complete"
    assert entry["damaged_parts"] == []
    for family, name in zip(entry["families"], FAMILIES, strict=True):
        feasible = pq.read_table(next((GOLDEN / name).glob("part-*")))["feasible"].to_pylist()
        assert family["evaluations"] == 30
        assert family["feasible"] == sum(feasible)
        assert family["front_size"] == pq.read_table(GOLDEN / name / "front.parquet").num_rows


def test_compare(old: Path, hovergap: Run) -> None:
    compared = content(hovergap("compare", old, "--json"))
    for family, name in zip(compared["families"], FAMILIES, strict=True):
        front = pq.read_table(GOLDEN / name / "front.parquet")
        assert family["evaluations"] == 30
        assert family["extremes"]["cost"]["value"] == min(front["cost"].to_pylist())
        assert family["compromise"]["metrics"].keys() >= {"mass_kg", "efficiency"}
    text = hovergap("compare", old)
    assert text.exit_code == 0
    verified = content(hovergap("compare", old, "--verified", "--json"))
    # Verified are the two of the first family nearest to the ideal, and each objective's best.
    assert verified["families"][0]["verified"]["evaluator"] == "toy_finer 1"
    assert 2 <= verified["families"][0]["verified"]["verified"] <= 5


@pytest.mark.parametrize("design", ["Q6p2s1-000003", "Q12p4s5-000029"])
def test_inspect(old: Path, hovergap: Run, design: str) -> None:
    family, _, number = design.partition("-")
    row = pq.read_table(next((GOLDEN / family).glob("part-*"))).to_pylist()[int(number)]
    found = content(hovergap("inspect", old, design, "--json"))
    assert found["metrics"]["cost"] == row["cost"]
    assert found["variables"]["rotor_radius_mm"] == row["rotor_radius_mm"]
    assert found["finished_at"] == str(row["finished_at"])
    text = hovergap("inspect", old, design)
    assert text.exit_code == 0, text.output
    assert design in text.output


def test_other_readers(old: Path, hovergap: Run) -> None:
    assert hovergap("choose", old).exit_code == 0
    assert (old / "decisions" / "decision-0002.json").is_file()  # beside the one that was there
    result = hovergap("export", old, "--output", "fronts")
    assert result.exit_code == 0, result.output


@pytest.mark.slow
def test_report(old: Path, hovergap: Run) -> None:
    result = hovergap("report", old)
    assert result.exit_code == 0, result.output


def test_the_sweep_goes_on(old: Path, hovergap: Run, rows: Rows) -> None:
    before = {name: rows(old / name) for name in FAMILIES}
    again = hovergap("resume", old, "--workers", "1")
    if open_archive(old / FAMILIES[0]).settings["search"] != SEARCH_VERSION:
        assert again.exit_code == 1
        assert "search 'decomposition 1' there" in again.output
        return
    assert again.exit_code == 0, again.output
    assert "0 new" in again.output
    result = hovergap("resume", old, "--budget", "50", "--workers", "1")
    assert result.exit_code == 0, result.output
    for name in FAMILIES:
        after = rows(old / name)
        assert [row["evaluation"] for row in after] == list(range(50))
        assert after[:30] == before[name]
