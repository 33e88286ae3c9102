"""A study driven and read from Python, as in a notebook; the docstrings' examples run too."""

from __future__ import annotations

import doctest
import importlib
from collections.abc import Callable
from pathlib import Path

import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
import pytest
from click.testing import Result

from optimizer.running.progress import Progress
from studies import api
from studies.errors import ResultsError, StudiesError

Write = Callable[..., Path]
Run = Callable[..., Result]
FAMILIES = ["Q6p2s1", "Q12p4s5"]


@pytest.mark.parametrize("name", ["studies.api", "studies.api.searching"])
def test_examples_in_the_docstrings(name: str) -> None:
    result = doctest.testmod(importlib.import_module(name))
    assert result.attempted > 0
    assert result.failed == 0


def test_a_study_from_search_to_files(write_study: Write, hovergap: Run, tmp_path: Path) -> None:
    study = api.load_study(write_study())
    seen: list[tuple[str, Progress]] = []
    summary = api.sweep(
        study,
        evaluations=120,
        workers=1,
        progress=lambda family, state: seen.append((family, state)),
    )
    assert summary.to_pandas()["evaluations"].tolist() == [120, 120]
    assert {family for family, _ in seen} == set(FAMILIES)
    folder = Path("results/small")

    # The same study by the command line gives the same rows.
    assert hovergap("sweep", study.file, "--results", "other", "--budget", "120").exit_code == 0
    times = ["time_s", "finished_at"]
    rows, others = (api.evaluations(item).drop_columns(times) for item in (folder, "other/small"))
    assert rows.equals(others)
    assert rows.num_rows == 240
    assert rows["design"][130].as_py() == "Q12p4s5-000010"
    field = rows.schema.field("tip_speed_m_s")
    assert field.metadata[b"unit"] == b"m/s"
    some = api.evaluations(folder, ["Q12p4s5"], ["cost", "status"])
    assert some.column_names == ["design", "family", "cost", "status"]
    assert some.num_rows == 120

    assert api.resume(folder, evaluations=150, workers=1)["new"].to_pylist() == [30, 30]
    state = api.status(folder)
    assert state["state"].to_pylist() == ["complete", "complete"]
    assert state["evaluations"].to_pylist() == [150, 150]

    # The front by hand, from all rows, in pandas: nobody feasible is better in everything.
    front = api.front(folder, ["Q6p2s1"])
    frame: pd.DataFrame = api.evaluations(folder, ["Q6p2s1"]).to_pandas()
    goals = [name for name in frame.columns if name.startswith("objective:")]
    good = frame[frame["feasible"]]
    points = good[goals].to_numpy()
    beaten = [((points <= p).all(axis=1) & (points < p).any(axis=1)).any() for p in points]
    alone = good[~pd.Series(beaten, index=good.index)].drop_duplicates(goals)
    assert set(alone["design"]) == set(front["design"].to_pylist())

    compared = api.compare(folder).to_pandas().set_index("family")
    assert compared.loc["Q6p2s1", "front_size"] == front.num_rows
    best = float(pc.min(front["loss_total_W"]).as_py())
    # Both are the same stored number; one went through text with all its digits.
    assert compared.loc["Q6p2s1", "best:loss_total_W"] == pytest.approx(best, rel=1e-15)

    ranked = api.choose(folder, weights={"cost": 2.0}, at_most={"tip_speed_m_s": 60.0}, show=2)
    assert ranked["place"].to_pylist()[0] == 1
    design = ranked["design"].to_pylist()[0]
    chosen = api.inspect(folder, design)
    assert chosen.num_rows == 1
    assert chosen["tip_speed_m_s"][0].as_py() <= 60.0
    assert chosen["cost"][0].as_py() == pytest.approx(ranked["cost"][0].as_py(), rel=1e-15)
    assert not (folder / "decisions").exists()

    lines, nothing = api.sensitivity(folder, design, points=3, indices="none")
    assert set(api.variables()["name"].to_pylist()) == set(lines["variable"].to_pylist())
    assert nothing.num_rows == 0
    _, indices = api.sensitivity(folder, design, points=3, indices="sobol", samples=8)
    # The toy's tip speed is the rotor radius times the speed and depends on nothing else.
    speed = indices.to_pandas().set_index(["metric", "variable"])["first_order"]["tip_speed_m_s"]
    assert speed.idxmax() == "rotor_radius_mm"
    machines = api.tolerance(folder, design, machines=12)
    assert machines.num_rows == 12
    assert machines["meets_all_limits"].type == pa.bool_()

    files = api.export_fronts(folder, "fronts")
    assert {path.name for path in files} == {
        "front.csv",
        "front.parquet",
        "front.xlsx",
        "README.txt",
    }
    assert api.sheet(folder, design, "sheet.html").stat().st_size > 1000
    assert "small" in api.report(folder, "report.html", designs=10, workers=1).read_text()


def test_stopping_from_python_and_going_on(write_study: Write) -> None:
    asked: list[int] = []

    def stop() -> bool:
        asked.append(1)
        return len(asked) > 2

    summary = api.sweep(write_study(), families=["Q6p2s1"], workers=1, stop=stop)
    assert summary["stopped"].to_pylist() == [True]
    assert 0 < summary["evaluations"][0].as_py() < 200
    assert api.resume("results/small", workers=1)["evaluations"].to_pylist() == [200]
    api.sweep(write_study(), "whole", families=["Q6p2s1"], workers=1)
    times = ["time_s", "finished_at"]
    resumed, whole = (
        api.evaluations(folder).drop_columns(times) for folder in ("results/small", "whole/small")
    )
    assert resumed.equals(whole)


def test_verified_values_stand_beside_the_stored(write_study: Write) -> None:
    api.sweep(write_study(), families=["Q6p2s1"], evaluations=60, workers=1)
    assert api.verified("results/small").num_rows == 0
    table = api.verify("results/small", evaluator="analytic", top=2, workers=1)
    assert 2 <= table.num_rows <= 5  # and the best of each of three objectives
    stored = api.evaluations("results/small").to_pandas().set_index("design")
    for row in table.to_pylist():
        assert row["stored:cost"] == stored.loc[row["design"], "cost"]
    assert api.verified("results/small", "analytic").equals(table)


def test_errors_are_those_of_the_command_line(write_study: Write, tmp_path: Path) -> None:
    with pytest.raises(StudiesError, match="neither a file nor a shipped study"):
        api.load_study("no_such_study")
    with pytest.raises(ResultsError, match="no such results folder"):
        api.front("results/none")
    with pytest.raises(ResultsError, match="no results folder was given"):
        api.compare([])
    with pytest.raises(StudiesError, match="has no family"):
        api.sweep(write_study(), families=["Q99p1s2"])
    api.sweep(write_study(), families=["Q6p2s1"], evaluations=10, workers=1)
    with pytest.raises(ResultsError, match="has results already"):
        api.sweep(write_study())
    with pytest.raises(ValueError, match="must end with"):
        api.sheet("results/small", "Q6p2s1-000000", "sheet.docx")


def test_a_program_needs_consent_here_too(write_study: Write, tmp_path: Path) -> None:
    mark = tmp_path / "mark"
    program = f'name = "external"\nsettings = {{ program = ["touch", "{mark}"] }}'
    file = write_study(('name = "toy"', program))
    with pytest.raises(StudiesError, match="would start this program"):
        api.sweep(file, evaluations=4, workers=1)
    assert not mark.exists()
    assert not Path("results").exists()


def test_new_study_and_lists(tmp_path: Path) -> None:
    study = api.new_study("pump.toml", power_kW=3.0, speed_rpm=20_000.0)
    assert study.name == "pump"
    assert api.load_study("pump.toml").digest == study.digest
    with pytest.raises(StudiesError, match="left alone"):
        api.new_study("pump.toml")
    names = api.metrics()["name"].to_pylist()
    assert {"torque_Nm", "cost"} <= set(names)
    assert "rotor_radius_mm" in api.variables()["name"].to_pylist()
    assert {"magnet", "gas"} <= set(api.materials()["kind"].to_pylist())
    families = api.families([12], [4], speed_rpm=30_000.0).to_pylist()
    # 4 pole pairs at 500 turns a second.
    assert families[0]["electrical_frequency_Hz"] == pytest.approx(2000.0)
