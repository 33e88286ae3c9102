"""Several searches of each family: layout, resuming, designs of any search, the sure order."""

from __future__ import annotations

import csv
import itertools
import json
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow.parquet as pq
import pytest
from click.testing import Result
from scipy import stats

from evaluators.machine.winding.winding import Family
from optimizer.archive.archive import open_archive
from optimizer.fronts import hypervolume, non_dominated
from studies import api
from studies.comparison.numbers import REFERENCE
from studies.running.spreading import read_rows
from studies.stored.families import stored_families, stored_family
from studies.stored.layout import open_results
from studies.stored.naming import (
    design_id,
    search_name,
    search_names,
    search_seed,
    split_design_id,
    split_search_name,
)

Run = Callable[..., Result]
Write = Callable[..., Path]
Read = Callable[[Path], list[dict[str, Any]]]

FOLDER = Path("results/small")
GOALS = ("loss_total_W", "cost", "ripple_index")
BUDGET = ("evaluations_per_family = 200", "evaluations_per_family = 50")


def search(hovergap: Run, file: Path, *arguments: str) -> Result:
    result = hovergap("sweep", file, "--workers", "1", *arguments)
    assert result.exit_code == 0, result.output
    return result


def front_of(folder: Path) -> np.ndarray:
    table = open_archive(folder).table()
    points = np.column_stack([table[f"objective:{goal}"].to_numpy() for goal in GOALS])
    points = points[table["feasible"].to_numpy()]
    return points[non_dominated(points)]


def test_names_lead_to_search_and_design_and_back() -> None:
    assert search_names(["A", "B"], 2) == ("A", "B", "A.2", "B.2")
    for number in (1, 2, 37):
        name = search_name("Q12p4s5", number)
        assert split_search_name(name) == ("Q12p4s5", number)
        assert split_design_id(design_id(name, 1234)) == (name, 1234)
    assert design_id("Q12p4s5.2", 1234) == "Q12p4s5.2-001234"
    assert split_design_id("Q12p4s5.1-7") == ("Q12p4s5", 7)


def test_seeds_of_searches_differ_and_follow_from_the_study() -> None:
    families = [Family(6, 2, 1, 2), Family(12, 4, 5, 1)]
    seeds = {
        (seed, family.id, number): search_seed(seed, family, number)
        for seed in (3, 4)
        for family in families
        for number in range(1, 6)
    }
    # The first search has the study's own seed in every family, all others one of their own.
    own = [value for (seed, _, number), value in seeds.items() if number > 1]
    assert len(set(own)) == len(own)
    assert all(seeds[seed, family.id, 1] == seed for seed in (3, 4) for family in families)
    words = np.random.SeedSequence(3, spawn_key=(2, 12, 4, 5)).generate_state(1)
    assert seeds[3, "Q12p4s5", 2] == int(words[0]) // 2
    assert all(0 <= value < 2**31 for value in own)


def test_the_first_search_is_the_only_one_of_a_study_with_one(
    hovergap: Run, write_study: Write, rows: Read
) -> None:
    search(hovergap, write_study(BUDGET))
    alone = rows(FOLDER / "Q6p2s1")
    assert json.loads((FOLDER / "study.json").read_text())["searches_per_family"] == 1
    before = sorted(path.name for path in FOLDER.iterdir() if path.is_dir())
    assert before == ["Q12p4s5", "Q6p2s1"]
    shutil.rmtree("results")
    search(hovergap, write_study(BUDGET), "--searches", "2")
    assert rows(FOLDER / "Q6p2s1") == alone
    folders = sorted(path.name for path in FOLDER.iterdir() if path.is_dir())
    assert folders == ["Q12p4s5", "Q12p4s5.2", "Q6p2s1", "Q6p2s1.2"]
    other = rows(FOLDER / "Q6p2s1.2")
    assert other[0]["rotor_radius_mm"] != alone[0]["rotor_radius_mm"]
    assert len({row["seed"] for row in [*alone, *other]}) == 2


def test_a_request_without_the_number_means_one(hovergap: Run, write_study: Write) -> None:
    """As written before there could be several."""
    search(hovergap, write_study(BUDGET))
    file = FOLDER / "study.json"
    request = json.loads(file.read_text())
    del request["searches_per_family"]
    file.write_text(json.dumps(request))
    assert open_results(FOLDER).request.searches_per_family == 1
    assert "complete" in hovergap("status", FOLDER).output


def test_resume_adds_searches_and_loses_nothing(
    hovergap: Run, write_study: Write, rows: Read
) -> None:
    key = (BUDGET[0], f"{BUDGET[1]}\nsearches_per_family = 3")
    search(hovergap, write_study(key))
    whole = {path.name: rows(path) for path in FOLDER.iterdir() if path.is_dir()}
    assert len(whole) == 6
    shutil.rmtree("results")
    search(hovergap, write_study(BUDGET), "--budget", "20")
    result = hovergap("resume", FOLDER, "--searches", "2", "--workers", "1")
    assert result.exit_code == 0
    assert "2 families, 2 searches each, 20 evaluations of each search" in result.output
    result = hovergap("resume", FOLDER, "--searches", "3", "--budget", "50", "--workers", "1")
    assert result.exit_code == 0
    assert {path.name: rows(path) for path in FOLDER.iterdir() if path.is_dir()} == whole
    status = json.loads(hovergap("status", FOLDER, "--json").output)[0]
    assert [(item["family"], item["search"]) for item in status["families"]] == [
        (family, number) for family in ("Q6p2s1", "Q12p4s5") for number in (1, 2, 3)
    ]
    assert status["state"] == "complete"
    # Fewer again: what is stored stays, and still counts.
    hovergap("resume", FOLDER, "--searches", "1", "--workers", "1")
    assert len(stored_family(open_results(FOLDER), "Q6p2s1").searches) == 3
    assert json.loads(hovergap("status", FOLDER, "--json").output)[0]["state"] == "complete"
    assert "Q12p4s5.3   50/50" not in hovergap("watch", FOLDER).output


def test_watch_shows_every_search(hovergap: Run, write_study: Write) -> None:
    search(hovergap, write_study(BUDGET), "--searches", "2", "--budget", "40")
    lines = hovergap("watch", FOLDER).output.splitlines()
    named = [line.split()[0] for line in lines if "40/40" in line]
    assert named == ["Q6p2s1", "Q12p4s5", "Q6p2s1.2", "Q12p4s5.2"]


def test_a_total_is_spread_over_all_searches(hovergap: Run, write_study: Write) -> None:
    total = f"{BUDGET[0].replace('200', '300')}\ntotal_evaluations = 400"
    file = write_study((BUDGET[0], total))
    search(hovergap, file, "--searches", "2")
    counts = {
        item.name: item.counts[0]
        for family in stored_families(open_results(FOLDER))
        for item in family.searches
    }
    assert len(counts) == 4
    assert 380 <= sum(counts.values()) <= 400
    # Searches of a family are given up together, so that they stay comparable.
    assert counts["Q6p2s1"] == counts["Q6p2s1.2"]
    assert counts["Q12p4s5"] == counts["Q12p4s5.2"]
    result = hovergap("sweep", file, "--searches", "6", "--results", "elsewhere")
    assert result.exit_code == 2
    assert "is too few for 2 families with 6 searches each" in result.output
    assert "give at least 1200" in result.output


def test_a_family_is_judged_by_the_first_rows_of_all_its_searches(
    hovergap: Run, write_study: Write
) -> None:
    search(hovergap, write_study(BUDGET), "--searches", "2", "--family", "Q6p2s1")
    quota = {"Q6p2s1": 40, "Q6p2s1.2": 25}
    found = read_rows(open_results(FOLDER), quota)["Q6p2s1"]
    feasible = []
    for name, count in quota.items():
        table = open_archive(FOLDER / name).table()
        feasible += np.flatnonzero(table["feasible"].to_numpy()[:count]).tolist()
    assert found.evaluations.tolist() == feasible
    assert found.objectives.shape == (len(feasible), 3)
    assert found.wanted == 40


def test_the_front_of_a_family_is_that_of_all_its_searches(
    hovergap: Run, write_study: Write
) -> None:
    search(hovergap, write_study(BUDGET), "--searches", "3")
    fronts = {
        family: [front_of(FOLDER / name) for name in search_names([family], 3)]
        for family in ("Q6p2s1", "Q12p4s5")
    }
    found = json.loads(hovergap("compare", FOLDER, "--json").output)
    for entry in found["families"]:
        joined = np.concatenate(fronts[entry["family"]])
        assert entry["evaluations"] == 150
        assert entry["front_size"] == np.count_nonzero(non_dominated(joined))
    exported = hovergap("export", FOLDER, "--output", "out")
    assert exported.exit_code == 0, exported.output
    table = pq.read_table("out/front.parquet")
    for design, loss in zip(
        table["design"].to_pylist(), table["loss_total_W"].to_pylist(), strict=True
    ):
        name, evaluation = split_design_id(design)
        assert open_archive(FOLDER / name).row(evaluation)["loss_total_W"] == loss
    assert {split_design_id(item)[0] for item in table["design"].to_pylist()} >= {"Q6p2s1.2"}


def test_every_command_finds_designs_of_any_search(hovergap: Run, write_study: Write) -> None:
    search(hovergap, write_study(BUDGET), "--searches", "2", "--family", "Q6p2s1")
    stored = stored_family(open_results(FOLDER), "Q6p2s1")
    design = next(item for item in stored.front_ids if item.startswith("Q6p2s1.2-"))
    row = stored.row(design)
    shown = json.loads(hovergap("inspect", FOLDER, design, "--json").output)
    assert shown["design"] == design
    assert shown["on_front"]
    assert shown["metrics"]["loss_total_W"] == row["loss_total_W"]
    for arguments in (
        ("sheet", FOLDER, design, "--output", "sheet.html"),
        ("export", FOLDER, design, "--output", "handover"),
        ("tolerance", FOLDER, design, "--machines", "20", "--workers", "1"),
        ("sensitivity", FOLDER, design, "--indices", "none", "--points", "3", "--workers", "1"),
        ("choose", FOLDER, "--take", design),
    ):
        result = hovergap(*arguments)
        assert result.exit_code == 0, (arguments, result.output)
    assert design in Path("sheet.html").read_text()
    result = hovergap("inspect", FOLDER, "Q6p2s1.3-000001")
    assert result.exit_code == 2
    assert "there are Q6p2s1, Q6p2s1.2" in result.output


def test_verified_values_go_with_their_search(hovergap: Run, write_study: Write) -> None:
    search(hovergap, write_study(BUDGET), "--searches", "2")
    result = hovergap("verify", FOLDER, "--front", "--evaluator", "toy_finer", "--workers", "1")
    assert result.exit_code == 0, result.output
    assert "Q6p2s1.2: " in result.output
    ids = {item for family in stored_families(open_results(FOLDER)) for item in family.front_ids}
    assert set(api.verified(FOLDER)["design"].to_pylist()) == ids
    found = json.loads(hovergap("compare", FOLDER, "--verified", "--json").output)
    for entry in found["families"]:
        assert entry["verified"]["verified"] == entry["verified"]["searched_front"]
    assert found["certainty"] is None
    assert (
        "can only be told by the values of the search"
        in hovergap("compare", FOLDER, "--verified").output
    )


def test_the_order_is_judged_by_the_searches(hovergap: Run, write_study: Write) -> None:
    search(hovergap, write_study(BUDGET), "--searches", "4")
    found = json.loads(hovergap("compare", FOLDER, "--json").output)
    certainty = found["certainty"]
    low = np.array([goal["scale_0"] for goal in found["objectives"]])
    high = np.array([goal["scale_1"] for goal in found["objectives"]])
    corner = np.full(3, REFERENCE)
    volumes: dict[str, list[float]] = {}
    for row in certainty["searches"]:
        points = (front_of(FOLDER / row["search"]) - low) / (high - low)
        wanted = hypervolume(points, corner) / REFERENCE**3
        assert row["hypervolume"] == pytest.approx(wanted, rel=1e-12)  # rounding
        volumes.setdefault(row["label"], []).append(row["hypervolume"])
    [pair] = certainty["pairs"]
    a, b = volumes[pair["first"]], volumes[pair["second"]]
    assert np.median(a) >= np.median(b)
    assert pair["first_ahead"] == sum(x > y for x, y in itertools.product(a, b))
    wanted = stats.mannwhitneyu(a, b, method="exact")
    assert pair["p"] == pytest.approx(wanted.pvalue, rel=1e-12)  # rounding
    assert pair["probability"] == pytest.approx(wanted.statistic / 16.0, rel=1e-12)
    assert certainty["overall"] is None  # two families
    text = hovergap("compare", FOLDER).output
    assert f"{pair['first']} is before {pair['second']} in {pair['first_ahead']} of 16" in text
    # The union holds every search's front, so it dominates at least as much.
    for entry in found["families"]:
        assert entry["hypervolume"] >= max(volumes[entry["label"]]) * (1.0 - 1e-12)
    hovergap("compare", FOLDER, "--csv", "families.csv")
    with Path("families.csv").open() as stream:
        lines = list(csv.DictReader(stream))
    for line in lines:
        each = [float(line[f"hypervolume:{number}"]) for number in range(1, 5)]
        assert sorted(each) == pytest.approx(sorted(volumes[line["family"]]))
        assert float(line["hypervolume_median"]) == pytest.approx(np.median(each))
    assert api.compare(FOLDER)["searches"].to_pylist() == [4, 4]
    assert api.compare_searches(FOLDER).num_rows == 8
    assert api.order_certainty(FOLDER)["p"].to_pylist() == [pair["p"]]


def test_too_few_searches_are_said_to_be_too_few(hovergap: Run, write_study: Write) -> None:
    search(hovergap, write_study(BUDGET))
    text = hovergap("compare", FOLDER).output
    said = [line for line in text.splitlines() if "says nothing about chance" in line]
    assert len(said) == 1
    assert "--searches 4" in said[0]
    assert json.loads(hovergap("compare", FOLDER, "--json").output)["certainty"] is None
    hovergap("resume", FOLDER, "--searches", "3", "--workers", "1")
    text = " ".join(hovergap("compare", FOLDER).output.split())
    assert "3 searches of a family cannot tell it from another" in text
    assert "p is 0.1 at best" in text
    assert "at least 4 searches of each are needed" in text
    hovergap("resume", FOLDER, "--family", "Q6p2s1", "--budget", "120", "--workers", "1")
    text = " ".join(hovergap("compare", FOLDER).output.split())
    assert "The searches have from 50 to 120 evaluations" in text
