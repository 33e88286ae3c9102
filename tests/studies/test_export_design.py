"""A design written for others: drawing, winding, materials, geometry, suspension data."""

from __future__ import annotations

import csv
import json
import re
import shutil
import xml.etree.ElementTree as ET
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from click.testing import Result

from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.geometry.dxf import LAYER_COLOURS
from studies.export.suspension import suspension_data
from studies.inspection.chosen import Chosen, choose_design
from studies.stored.layout import open_results

Run = Callable[..., Result]
Write = Callable[..., Path]

FAMILIES = ("Q6p2s1", "Q12p4s5")


@pytest.fixture(scope="module")
def kept(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("kept") / "results"


@pytest.fixture
def swept(hovergap: Run, write_study: Write, kept: Path) -> Path:
    """A few designs by the analytic evaluator; limits are loose, so fronts are not empty."""
    if not kept.exists():  # searched once, copied for each test
        write_study(('name = "toy"', 'name = "analytic"'), ("at_most = 70.0", "at_most = 500.0"))
        done = hovergap("sweep", "small.toml", "--budget", "12", "--workers", "1")
        assert done.exit_code == 0, done.output
        shutil.copytree("results", kept)
    else:
        shutil.copytree(kept, "results")
    return Path("results/small")


def first_good(folder: Path, family: str) -> Chosen:
    from studies.stored.families import stored_family

    results = open_results(folder)
    return choose_design(results, stored_family(results, family).front_ids[0])


def at_fixed_temperatures(chosen: Chosen) -> Chosen:
    """The design evaluated anew with the temperatures the study states."""
    task = chosen.task
    task = replace(task, cooling=replace(task.cooling, temperatures="fixed"))
    problem = replace(chosen.problem, task=task, _built={})
    outcome = problem.evaluate(chosen.point[None, :])
    metrics = {name: float(values[0]) for name, values in outcome.columns.items()}
    found = replace(chosen.found, row={**chosen.found.row, **metrics})
    return replace(chosen, found=found, problem=problem)


def enclosed_area(points: list[tuple[float, float, float]]) -> float:
    """Area of a closed polyline: shoelace, and circular segments by the library's own arcs."""
    from ezdxf.math import Vec2, bulge_to_arc

    area = 0.0
    for (x, y, bulge), (u, v, _) in zip(points, [*points[1:], points[0]], strict=True):
        area += 0.5 * (x * v - u * y)
        if bulge:
            _, start, end, radius = bulge_to_arc(Vec2(x, y), Vec2(u, v), bulge)
            angle = (end - start) % (2.0 * np.pi)
            area += np.sign(bulge) * 0.5 * radius**2 * (angle - np.sin(angle))
    return area


def read_csv(file: Path) -> list[dict[str, str]]:
    with file.open(encoding="utf-8", newline="") as stream:
        return list(csv.DictReader(stream))


@pytest.mark.parametrize("family", FAMILIES)
def test_drawing_audits_clean_and_its_areas_are_the_evaluators(
    hovergap: Run, swept: Path, family: str
) -> None:
    import ezdxf

    chosen = first_good(swept, family)
    done = hovergap("export", swept, chosen.design, "--output", "out")
    assert done.exit_code == 0, done.output
    doc = ezdxf.readfile("out/cross_section.dxf")
    audit = doc.audit()
    assert not audit.errors
    assert not audit.fixes
    assert doc.dxfversion == "AC1024"  # R2010
    assert doc.header["$INSUNITS"] == 4  # mm (DXF reference)
    assert doc.header["$MEASUREMENT"] == 1
    assert set(LAYER_COLOURS) <= {layer.dxf.name for layer in doc.layers}

    space = doc.modelspace()
    areas: dict[str, list[float]] = {}
    for line in space.query("LWPOLYLINE"):
        assert line.closed
        area = enclosed_area(line.get_points("xyb"))
        assert area > 0.0, "outlines run counter-clockwise"
        areas.setdefault(line.dxf.layer, []).append(area)
    sections: CrossSections = chosen.sections
    slots = sections.family.slots

    def mm2(value: np.ndarray) -> float:
        return 1e6 * float(value[0])

    def ring(layer: str) -> float:
        outer, *holes = sorted(areas[layer], reverse=True)
        return outer - sum(holes)

    # Coordinates are written with 16 digits; the arcs drawn for the wedge's sides are right to
    # 1e-6 of the slot mouth.
    close = {"rel": 1e-6}
    assert len(areas["slot"]) == slots
    assert len(areas["winding"]) == 2 * slots
    assert len(areas["magnet"]) == sections.family.poles
    whole_slot = mm2(sections.slot_area) + mm2(sections.slot_mouth_area)
    assert areas["slot"] == pytest.approx([whole_slot] * slots, **close)
    assert sum(areas["winding"]) == pytest.approx(slots * mm2(sections.slot_area), **close)
    assert sum(areas["magnet"]) == pytest.approx(mm2(sections.magnet_area), **close)
    assert ring("stator") == pytest.approx(mm2(sections.stator_area), **close)
    assert ring("sleeve") == pytest.approx(mm2(sections.sleeve_area), **close)
    assert ring("core") == pytest.approx(mm2(sections.core_area), **close)
    assert ring("shaft") == pytest.approx(mm2(sections.shaft_area), **close)

    dimension = next(iter(space.query("DIMENSION")))
    assert dimension.get_measurement() == pytest.approx(2e3 * float(sections.outer_radius[0]))
    words = " ".join(text.dxf.text for text in space.query("TEXT"))
    assert "not released for manufacture" in words
    for caution in ("burst", "crush", "DC links kill", "Local codes", "licensed"):
        assert caution in words


def test_pictures_are_well_formed_and_names_stay_text(
    hovergap: Run, swept: Path, tmp_path: Path
) -> None:
    # A description is free text: it may hold anything.
    frozen = swept / "study.toml"
    nasty = "<script>alert(1)</script> & =1+1"
    frozen.write_text(frozen.read_text().replace("an invented blower", nasty))
    design = first_good(swept, "Q12p4s5").design
    assert hovergap("export", swept, design, "--output", "out").exit_code == 0
    for name in ("cross_section.svg", "winding.svg"):
        root = ET.parse(tmp_path / "out" / name).getroot()  # noqa: S314  our own file
        assert root.tag == "{http://www.w3.org/2000/svg}svg"
        assert not [item for item in root.iter() if item.tag.endswith("script")]


def test_winding_tables_describe_the_winding(hovergap: Run, swept: Path) -> None:
    chosen = first_good(swept, "Q12p4s5")
    assert hovergap("export", swept, chosen.design, "--output", "out").exit_code == 0
    sides = read_csv(Path("out/coil_sides.csv"))
    assert len(sides) == 24
    # A coil goes out where it comes back: its two sides carry opposite currents.
    for coil in range(1, 13):
        pair = [row for row in sides if int(row["coil"]) == coil]
        assert sum(int(row["torque_direction"]) for row in pair) == 0
        assert sum(int(row["suspension_direction"]) for row in pair) == 0
        # y = 1: the coil surrounds tooth `coil`, between slots coil-1 and coil, counted from 1.
        assert {int(row["slot"]) for row in pair} == {coil, (coil - 2) % 12 + 1}
    for row in sides:
        same = row["torque_direction"] == row["suspension_direction"]
        assert same == (row["group"] == "a")
    strings = read_csv(Path("out/coil_connections.csv"))
    assert sorted(int(row["coil"]) for row in strings) == list(range(1, 13))
    assert {row["turns"] for row in strings} == {str(int(chosen.metric("turns_per_coil")))}
    for row in strings:
        at_start = [
            side for side in sides if side["slot"] == row["slot_in"] and side["coil"] == row["coil"]
        ]
        assert [int(side["torque_direction"]) for side in at_start] == [1]
    assert [row["from"].startswith("terminal") for row in strings].count(True) == 6
    assert [row["to"].startswith("terminal") for row in strings].count(True) == 6


def test_materials_carry_values_and_sources(hovergap: Run, swept: Path) -> None:
    chosen = first_good(swept, "Q6p2s1")
    assert hovergap("export", swept, chosen.design, "--output", "out").exit_code == 0
    content = json.loads(Path("out/materials.json").read_text())
    magnet = content["materials"]["magnet"]
    assert magnet["name"] == "REFeB 300/160"
    for material in content["materials"].values():
        for value in material.values():
            if isinstance(value, dict):
                assert value["source"]
                assert value["year"]
    steel = chosen.task.materials.stator_steel
    curve = read_csv(Path("out/bh_stator_steel.csv"))
    field = [float(row["field_A_per_m"]) for row in curve]
    density = [float(row["flux_density_T"]) for row in curve]
    # H(B) at the table's own points is the table: the interpolation passes through them.
    assert steel.magnetization.field(np.array(density)) == pytest.approx(field, rel=1e-9, abs=1e-9)
    line = read_csv(Path("out/bh_magnet.csv"))
    temperature = chosen.task.conditions.magnet_temperature
    remanence = magnet["remanence"]
    at_temperature = remanence["value"] * (
        1.0 + remanence["per_K"] * (temperature - remanence["at_C"])
    )
    assert float(line[-1]["field_A_per_m"]) == 0.0
    assert float(line[-1]["flux_density_T"]) == pytest.approx(at_temperature)
    slope = np.polyfit(*[[float(r[k]) for r in line] for k in line[0]], 1)[0]
    # mu0 mu_r from the published constant, not from the code.
    assert slope == pytest.approx(4e-7 * np.pi * magnet["recoil_permeability"]["value"])


def test_machine_file_is_complete_and_says_what_it_is(hovergap: Run, swept: Path) -> None:
    chosen = first_good(swept, "Q12p4s5")
    assert hovergap("export", swept, chosen.design, "--output", "out").exit_code == 0
    content = json.loads(Path("out/machine.json").read_text())
    assert (content["format"], content["format_version"]) == ("hovergap machine", 1)
    excitation = content["excitation"]
    # Copper area times density is the ampere-turns of the peaks together (root mean square).
    turns = excitation["turns_per_coil"]
    peak = turns * (excitation["torque_peak_A"] + excitation["suspension_peak_A"])
    copper = 0.5 * float(chosen.sections.slot_area[0]) * chosen.task.construction.copper_fill
    density = 1e6 * chosen.values["current_density_A_mm2"]
    assert peak == pytest.approx(np.sqrt(2.0) * density * copper)
    assert excitation["suspension_peak_A"] / (
        excitation["torque_peak_A"] + excitation["suspension_peak_A"]
    ) == pytest.approx(chosen.task.duty.suspension_share)
    parts = [region["part"] for region in content["regions"]]
    assert {part: parts.count(part) for part in set(parts)} == {
        "stator": 1,
        "slot": 12,
        "winding": 24,
        "magnet": 8,
        "sleeve": 1,
        "core": 1,
        "shaft": 1,
    }
    assert content["results"]["metrics"]["force_N"] == chosen.metric("force_N")


def test_both_field_models_say_when_the_torque_current_peaks(hovergap: Run, swept: Path) -> None:
    chosen = first_good(swept, "Q12p4s5")
    angles = []
    for evaluator in ("analytic", "finite_element"):
        words = ("export", swept, chosen.design, "--evaluator", evaluator, "--output", evaluator)
        assert hovergap(*words).exit_code == 0
        content = json.loads((Path(evaluator) / "machine.json").read_text())
        angles.append(content["excitation"]["torque_angle_deg"])
    # Both follow from symmetry; the finite-element field is solved to 1e-4.
    assert angles[0] == pytest.approx(angles[1], abs=0.01)


@pytest.mark.parametrize("family", FAMILIES)
def test_suspension_data_agree_with_the_metrics_and_with_symmetry(
    hovergap: Run, swept: Path, family: str
) -> None:
    chosen = first_good(swept, family)
    assert hovergap("export", swept, chosen.design, "--output", "out").exit_code == 0
    content = json.loads(Path("out/suspension.json").read_text())
    mean = np.array(content["mean_force_per_ampere_N_A"])
    metric = chosen.metric("force_per_ampere_N_A")
    assert mean == pytest.approx(metric * np.eye(2), abs=1e-9 * metric)
    # Same model on two ways, the metric from the phasor's transfer, this from the waveforms: at
    # fixed temperatures nothing is left to be scaled but rounding.
    assert suspension_data(at_fixed_temperatures(chosen)).scale == pytest.approx(1.0, abs=1e-9)
    rows = read_csv(Path("out/suspension.csv"))
    table = np.array([[float(value) for value in row.values()] for row in rows])
    # A third of a turn carries each phase into the next one, so it only turns force and command.
    data = suspension_data(chosen)
    turn = np.exp(2j * np.pi / 3.0)
    rotation = np.array([[turn.real, -turn.imag], [turn.imag, turn.real]])
    later = np.roll(data.per_ampere, -len(table) // 3, axis=0)
    assert later == pytest.approx(rotation @ data.per_ampere @ rotation.T, abs=1e-9 * metric)
    # y is commanded a quarter of an electrical period apart from x.
    apart = content["angle_y_electrical_deg"] - content["angle_x_electrical_deg"]
    expected = 90.0 if family == "Q12p4s5" else -90.0  # force follows the phasor for ps > p
    assert (apart - expected + 180.0) % 360.0 - 180.0 == pytest.approx(0.0, abs=1e-6)
    errors = np.abs(table[:, 7:9])
    assert content["largest_direction_error_deg"] == pytest.approx(errors.max())
    assert content["displacement_stiffness_N_mm"] == chosen.metric("displacement_stiffness_N_mm")


def test_nothing_is_overwritten_without_force(hovergap: Run, swept: Path) -> None:
    design = first_good(swept, "Q6p2s1").design
    out = Path("out")
    out.mkdir()
    (out / "machine.json").write_text("mine")
    refused = hovergap("export", swept, design, "--output", "out")
    assert refused.exit_code == 1
    assert "machine.json: exists already" in refused.output
    assert [item.name for item in out.iterdir()] == ["machine.json"]
    assert (out / "machine.json").read_text() == "mine"
    assert hovergap("export", swept, design, "--output", "out", "--force").exit_code == 0
    assert (out / "machine.json").read_text() != "mine"


def test_every_export_carries_the_cautions(hovergap: Run, swept: Path) -> None:
    design = first_good(swept, "Q6p2s1").design
    assert hovergap("export", swept, design, "--output", "design").exit_code == 0
    assert hovergap("export", swept, "--output", "front").exit_code == 0
    for folder in ("design", "front"):
        text = " ".join(Path(folder, "README.txt").read_text().split())
        for word in ("bursts", "containment", "Magnets crush", "DC link", "touchdown", "codes"):
            assert re.search(word, text), word
        for item in Path(folder).iterdir():
            assert item.name == "README.txt" or item.name in text
            # What is likely to travel alone carries them itself.
            if item.suffix in (".json", ".svg"):
                assert re.search(r"burst.*containment.*crush.*DC link", item.read_text(), re.DOTALL)


def test_a_failed_or_unknown_design_is_refused_in_one_sentence(
    hovergap: Run, write_study: Write
) -> None:
    write_study(('name = "toy"', 'name = "toy"\nsettings = { invalid_above_mm = 1.0 }'))
    hovergap("sweep", "small.toml", "--budget", "5", "--workers", "1", "--family", "Q6p2s1")
    failed = hovergap("export", "results/small", "Q6p2s1-000002", "--output", "out")
    assert failed.exit_code == 2
    assert "could not be evaluated" in failed.output
    unknown = hovergap("export", "results/small", "Q6p2s1-000999", "--output", "out")
    assert unknown.exit_code == 2
    assert "is not stored" in unknown.output
    assert not Path("out").exists()
    nothing = hovergap("export", "results/small", "--output", "out")
    assert nothing.exit_code == 2
    assert "no front to export" in nothing.output
