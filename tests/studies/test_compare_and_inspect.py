"""Comparing families by their fronts and looking up single designs."""

from __future__ import annotations

import csv
import importlib
import io
import itertools
import json
import re
import shutil
import sys
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from click.testing import Result

from evaluators.machine.geometry.variables import VARIABLES
from evaluators.machine.metrics import METRICS
from optimizer.archive.archive import open_archive
from studies.comparison.numbers import BINDING, REFERENCE
from studies.inspection.design import CAUTIONS
from studies.tables import csv_text, number, percent, prose_table, text_table, wide_table

Run = Callable[..., Result]
Write = Callable[..., Path]

GOALS = ("loss_total_W", "cost", "ripple_index")


@pytest.fixture
def swept(hovergap: Run, write_study: Write) -> Path:
    result = hovergap("sweep", write_study(), "--workers", "1")
    assert result.exit_code == 0, result.output
    return Path("results/small")


def front(folder: Path) -> np.ndarray:
    """Front by brute force: every feasible row against every other."""
    table = open_archive(folder).table()
    points = np.column_stack([table[f"objective:{goal}"].to_numpy() for goal in GOALS])
    points = points[table["feasible"].to_numpy()]
    keep = [
        not any((other <= point).all() and (other < point).any() for other in points)
        for point in points
    ]
    return np.unique(points[keep], axis=0)


def share_below(points: np.ndarray, samples: np.ndarray) -> float:
    """Share of sample points that some point dominates."""
    beaten = np.zeros(len(samples), dtype=bool)
    for point in points:
        beaten |= (point <= samples).all(axis=1)
    return float(beaten.mean())


def test_comparison_numbers_against_brute_force(hovergap: Run, swept: Path) -> None:
    result = hovergap("compare", swept, "--json")
    assert result.exit_code == 0, result.output
    found = json.loads(result.output)
    families = {item["family"]: item for item in found["families"]}
    fronts = {name: front(swept / name) for name in families}
    joint = np.concatenate(list(fronts.values()))
    low, high = joint.min(axis=0), joint.max(axis=0)
    scaled = {name: (points - low) / (high - low) for name, points in fronts.items()}
    rng = np.random.default_rng(5)
    samples = rng.random((20_000, 3)) * REFERENCE
    for name, item in families.items():
        table = open_archive(swept / name).table()
        assert item["evaluations"] == table.num_rows == 200
        assert item["feasible_share"] == np.mean(table["feasible"].to_numpy())
        assert item["front_size"] == len(fronts[name])
        # Monte Carlo with 20,000 points: standard deviation at most 0.0036; four of them.
        assert item["hypervolume"] == pytest.approx(
            share_below(scaled[name], samples), abs=4 * 0.0036
        )
        for column, goal in enumerate(GOALS):
            assert item["extremes"][goal]["value"] == fronts[name][:, column].min()
        # Rounding of the scale only.
        chosen = [item["compromise"]["objectives"][goal] for goal in GOALS]
        distance = np.linalg.norm((np.array(chosen) - low) / (high - low))
        nearest = np.linalg.norm(scaled[name], axis=1).min()
        assert distance == pytest.approx(nearest, rel=1e-12)
        close = table.filter(table["feasible"])
        margins = {
            tuple(row[f"objective:{goal}"] for goal in GOALS): row["margin:tip_speed_m_s_at_most"]
            for row in close.to_pylist()
        }
        binding = np.mean([margins[tuple(point)] >= -BINDING for point in fronts[name]])
        assert item["binding_limits"].get("tip_speed_m_s_at_most", 0.0) == binding
    for a, b in itertools.permutations(fronts, 2):
        weakly = (scaled[a][:, None] <= scaled[b][None]).all(axis=2)
        assert found["coverage"][a][b] == weakly.any(axis=0).mean()
        shift = (scaled[a][:, None] - scaled[b][None]).max(axis=2).min(axis=0).max()
        assert found["additive_epsilon"][a][b] == pytest.approx(shift, abs=1e-12)  # rounding


def test_binding_limits_are_those_with_less_than_a_hundredth_left(
    hovergap: Run, write_study: Write
) -> None:
    """The toy is best at the smallest radius, so a least tip speed binds most of the front."""
    file = write_study(("{ at_most = 70.0 }", "{ at_least = 50.0 }"))
    assert hovergap("sweep", file, "--budget", "400", "--workers", "1").exit_code == 0
    found = json.loads(hovergap("compare", "results/small", "--json").output)
    for item in found["families"]:
        table = open_archive(Path("results/small") / item["family"]).front()
        speeds = table["tip_speed_m_s"].to_numpy()
        close = (speeds - 50.0) / 50.0 <= 0.01
        assert item["binding_limits"]["tip_speed_m_s_at_least"] == close.mean()
        assert 0.0 < close.mean() < 1.0
        assert speeds[close].max() > 50.0


def test_dominated_family_is_said_plainly(hovergap: Run, write_study: Write) -> None:
    """The toy's ripple grows with the slots and nothing else does: more slots are dominated."""
    ideal = [
        ("rotor_radius_mm = [12.0, 24.0]", "rotor_radius_mm = [12.0, 12.001]"),
        ("current_density_A_mm2 = [2.0, 8.0]", "current_density_A_mm2 = 4.0"),
        ("magnet_arc_ratio = [0.6, 1.0]", "magnet_arc_ratio = 0.9"),
        ("magnet_thickness_mm = [2.0, 5.0]", "magnet_thickness_mm = 3.0"),
    ]
    arguments = ("--budget", "100", "--workers", "1")
    assert hovergap("sweep", write_study(*ideal), *arguments).exit_code == 0
    output = hovergap("compare", "results/small").output
    assert "Q12p4s5 is dominated by Q6p2s1: every design of its front" in output
    found = json.loads(hovergap("compare", "results/small", "--json").output)
    assert found["dominated"] == [{"family": "Q12p4s5", "by": "Q6p2s1"}]


def test_several_studies(hovergap: Run, write_study: Write, swept: Path) -> None:
    other = write_study(
        ('name = "small"', 'name = "other"'), ("seed = 3", "seed = 4"), name="o.toml"
    )
    assert hovergap("sweep", other, "--budget", "50", "--workers", "1").exit_code == 0
    result = hovergap("compare", swept, "results/other", "--json")
    labels = [item["label"] for item in json.loads(result.output)["families"]]
    assert labels == ["small/Q6p2s1", "small/Q12p4s5", "other/Q6p2s1", "other/Q12p4s5"]
    assert len(json.loads(hovergap("compare", swept, swept, "--json").output)["families"]) == 2
    third = write_study(
        ('name = "small"', 'name = "third"'), ('"cost"', '"mass_kg"'), name="t.toml"
    )
    assert hovergap("sweep", third, "--budget", "50", "--workers", "1").exit_code == 0
    result = hovergap("compare", swept, "results/third")
    assert result.exit_code == 2
    assert "different objectives" in result.output


def test_results_are_read_without_the_evaluator(
    hovergap: Run, swept: Path, site: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(sys, "path", [item for item in sys.path if item != str(site)])
    importlib.invalidate_caches()
    for arguments in (("compare", swept), ("inspect", swept, "Q6p2s1-0"), ("status", swept)):
        assert hovergap(*arguments).exit_code == 0
    result = hovergap("resume", swept)
    assert result.exit_code == 2
    assert "no evaluator is called 'toy'" in result.output


def test_text_is_readable_when_piped(hovergap: Run, swept: Path) -> None:
    output = hovergap("compare", swept).output
    assert "\x1b" not in output
    for words in ("Hypervolume is the share", "Coverage", "Additive epsilon", "Best of each"):
        assert words in output
    assert max(map(len, output.splitlines())) <= 120


def test_csv_files(hovergap: Run, swept: Path, tmp_path: Path) -> None:
    result = hovergap("compare", swept, "--csv", "families.csv", "--front-csv", "fronts.csv")
    assert result.exit_code == 0
    with Path("families.csv").open() as stream:
        rows = list(csv.DictReader(stream))
    assert [row["family"] for row in rows] == ["Q6p2s1", "Q12p4s5"]
    assert float(rows[0]["best:cost"]) == front(swept / "Q6p2s1")[:, 1].min()
    with Path("fronts.csv").open() as stream:
        designs = list(csv.DictReader(stream))
    assert len(designs) == sum(len(front(swept / row["family"])) for row in rows)
    assert all(re.fullmatch(r"Q\d+p\d+s\d+-\d{6}", row["design"]) for row in designs)
    result = hovergap("compare", swept, "--csv", "none/families.csv")
    assert result.exit_code == 1
    assert "there is no folder none; make it first" in result.output
    (tmp_path / "folder").mkdir()
    result = hovergap("compare", swept, "--csv", "folder")
    assert result.exit_code == 1
    assert "Traceback" not in result.output


def test_csv_text_runs_nothing_in_a_spreadsheet() -> None:
    text = csv_text(["a", "=b"], [["=1+1", -2.5], ["@x", float("nan")], ["plain", "+cmd"]])
    rows = list(csv.reader(io.StringIO(text)))
    assert rows == [["a", "'=b"], ["'=1+1", "-2.5"], ["'@x", ""], ["plain", "'+cmd"]]


def test_inspect_shows_the_stored_design(hovergap: Run, swept: Path) -> None:
    row = open_archive(swept / "Q12p4s5").row(42)
    result = hovergap("inspect", swept, "Q12p4s5-000042", "--json")
    assert result.exit_code == 0, result.output
    found = json.loads(result.output)
    assert found["design"] == "Q12p4s5-000042"
    assert found["variables"] == {item.name: row[item.name] for item in VARIABLES}
    assert found["metrics"] == {item.name: row[item.name] for item in METRICS}
    assert found["limits"] == [
        {
            "metric": "tip_speed_m_s",
            "at_most": 70.0,
            "value": row["tip_speed_m_s"],
            "margin": row["margin:tip_speed_m_s_at_most"],
            "source": "definition",
        }
    ]
    bore = row["rotor_radius_mm"] + row["clearance_mm"]
    assert found["dimensions"]["bore_radius_mm"] == pytest.approx(bore, rel=1e-12)  # rounding
    sides = found["winding"]["coil_sides"]
    assert len(sides) == 2 * 12  # two layers
    for phase, group in itertools.product("UVW", "ab"):
        assert sum(s["phase"] == phase and s["group"] == group for s in sides) == 4
    for side in sides:  # group b is reversed for suspension
        turned = side["torque_direction"] != side["suspension_direction"]
        assert turned == (side["group"] == "b")
    text = hovergap("inspect", swept, "Q12p4s5-42").output
    for words in ("tip_speed_m_s", "at most 70 m/s", "loss_copper_W", "coil pitch 1"):
        assert words in text
    flat = " ".join(text.split())
    assert all(caution in flat for caution in CAUTIONS)


@pytest.mark.parametrize(
    ("design", "words"),
    [
        ("Q12p4s5-999999", "is not stored; the last one of Q12p4s5 is Q12p4s5-000199"),
        ("Q12p4s4-000001", "did you mean 'Q12p4s5'?"),
        ("nonsense", "is no design; write"),
        ("-1", "No such option"),
        ("../../x-1", "has no family"),
    ],
)
def test_inspect_of_what_is_not_there(hovergap: Run, swept: Path, design: str, words: str) -> None:
    result = hovergap("inspect", swept, design)
    assert result.exit_code == 2
    assert words in result.output


def test_inspect_says_whether_a_design_is_on_the_front(hovergap: Run, swept: Path) -> None:
    found = json.loads(hovergap("compare", swept, "--json").output)
    chosen = found["families"][0]["compromise"]["design"]
    assert "no other design of its family beats it" in hovergap("inspect", swept, chosen).output
    table = open_archive(swept / "Q6p2s1").table(["evaluation", "feasible"])
    broken = next(row["evaluation"] for row in table.to_pylist() if not row["feasible"])
    fronted = {item["evaluation"] for item in open_archive(swept / "Q6p2s1").front().to_pylist()}
    beaten = next(
        row["evaluation"]
        for row in table.to_pylist()
        if row["feasible"] and row["evaluation"] not in fronted
    )
    output = hovergap("inspect", swept, f"Q6p2s1-{beaten}").output
    assert "another design of its family beats it" in output
    output = hovergap("inspect", swept, f"Q6p2s1-{broken}").output
    assert "breaks at least one limit" in output
    assert re.search(r"tip_speed_m_s .* BROKEN", output)


def test_results_of_another_study_are_not_compared(
    hovergap: Run, write_study: Write, swept: Path
) -> None:
    """A study file put beside another study's archive, and parts put into it, are told apart."""
    limited = ("[limits]\n", "[limits]\nefficiency = { at_least = 0.1 }\n")
    other = write_study(('name = "small"', 'name = "other"'), limited, name="other.toml")
    assert hovergap("sweep", other, "--workers", "1").exit_code == 0
    kept = (swept / "study.toml").read_text()
    reading = (("compare", swept), ("inspect", swept, "Q6p2s1-000001"), ("status", swept))
    shutil.copy("results/other/study.toml", swept / "study.toml")
    for command in (*reading, ("resume", swept)):
        result = hovergap(*command)
        assert result.exit_code == 2
        assert f"{swept / 'Q6p2s1'}: holds another study than" in result.output
        # The study file it came from is at hand, so every key is named.
        assert "limits.efficiency.at_least: 0.1 was added" in result.output
        assert "study.name: 'small' became 'other'" in result.output
    (swept / "study.toml").write_text(kept)
    # A part of the other study among its own: its rows do not count, and it is named.
    part = next(Path("results/other/Q6p2s1").glob("part-*.parquet"))
    shutil.copy(part, swept / "Q6p2s1" / part.name.replace("part-0", "part-9"))
    for command in reading:
        result = hovergap(*command)
        assert result.exit_code == (0 if command[0] == "inspect" else 1)
        told = "belongs to another archive (study 'other' there and 'small' here"
        assert (told in result.output) == (command[0] != "inspect")
    assert open_archive(swept / "Q6p2s1").rows == 200
    result = hovergap("resume", swept, "--workers", "1")
    assert "damaged or another study's was set aside" in result.output
    assert hovergap("compare", swept).exit_code == 0


def test_a_family_of_a_study_that_is_not_at_hand_is_told_by_what_is_stored(
    hovergap: Run, write_study: Write, swept: Path
) -> None:
    """Alike in name, columns and limits; its study file is nowhere to be found."""
    wider = ("rotor_radius_mm = [12.0, 24.0]", "rotor_radius_mm = [12.0, 26.0]")
    other = write_study(wider, name="wider.toml")
    arguments = ("--results", "elsewhere", "--workers", "1", "--budget", "30")
    assert hovergap("sweep", other, *arguments).exit_code == 0
    shutil.rmtree(swept / "Q6p2s1")
    shutil.copytree("elsewhere/small/Q6p2s1", swept / "Q6p2s1")
    for command in (("compare", swept), ("inspect", swept, "Q6p2s1-1"), ("resume", swept)):
        result = hovergap(*command)
        assert result.exit_code == 2
        said = "(rotor_radius_mm from 12 to 26 there and from 12 to 24 here)"
        assert said in result.output
        assert "digest" not in result.output
    # A folder under another family's name.
    shutil.rmtree(swept / "Q6p2s1")
    shutil.copytree(swept / "Q12p4s5", swept / "Q6p2s1")
    result = hovergap("compare", swept)
    assert result.exit_code == 2
    assert "family 'Q12p4s5' there and 'Q6p2s1' here" in result.output


def test_tables() -> None:
    table = text_table(["name", "x"], [["a", "1"], ["long", "22"]])
    assert table.splitlines() == ["name   x", "----  --", "a      1", "long  22"]
    wide = wide_table(["name", "first", "second"], [["a", "1", "2"]], width=12)
    assert wide.split("\n\n") == [
        "name  first\n----  -----\na         1",
        "name  second\n----  ------\na          2",
    ]


def test_numbers() -> None:
    shown = [number(v) for v in (0.0, 1234567.0, 12.3456, 0.000123456, 1e-9, -5.1, float("nan"))]
    assert shown == ["0", "1234567", "12.35", "0.0001235", "1.000e-09", "-5.100", "-"]
    assert [number(v) for v in (41.0, -5.0, 41.0001)] == ["41", "-5", "41.00"]
    assert [percent(v) for v in (-1e-5, -1e-3, 0.5)] == ["0.0 %", "-0.1 %", "50.0 %"]


def test_words_of_a_table_are_broken_into_lines() -> None:
    rows = [["a", "1", "one two three"], ["long", "22", "x"], ["c", "3", ""]]
    table = prose_table(["name", "n", "words"], rows, width=20)
    assert table.splitlines() == [
        "name   n  words",
        "----  --  -------------",
        "a      1  one two three",
        "long  22  x",
        "c      3",
    ]
    many = prose_table(["name", "n", "words"], [["a", "1", "four " * 12]], width=50)
    assert max(map(len, many.splitlines())) <= 50
    assert many.splitlines()[-1].startswith(" " * 9 + "four")
