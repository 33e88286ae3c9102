"""The design sheet: worked values against the model, complete tables, harmless texts."""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from click.testing import CliRunner, Result

from evaluators.machine.geometry.cross_sections import cross_sections
from evaluators.machine.geometry.variables import VARIABLES
from studies.errors import ResultsError
from studies.sheet.blocks import Cautions, Drawing, Grid, Heading, Sheet, Text
from studies.sheet.checks import Check, worked_checks
from studies.sheet.content import design_sheet
from studies.sheet.html import sheet_html
from studies.sheet.pdf import sheet_pdf
from studies.stored.families import stored_families, stored_family
from studies.stored.layout import open_results

# Would stop Typst, and load a script, if it were read as markup.
MARKUP = "#panic(1) <img src=x onerror=alert(1)> $x$ *bold*"


@pytest.fixture(scope="module")
def results_folder(tmp_path_factory: pytest.TempPathFactory, study_text: str) -> Path:
    from studies.cli import main

    folder = tmp_path_factory.mktemp("searched")
    for old, new in (
        ('description = "an invented blower"', f"description = '{MARKUP}'"),
        ('name = "toy"', 'name = "analytic"'),
        ('list = ["Q6p2s1", "Q12p4s5"]', 'list = ["Q6p2s1", "Q12p2s1"]'),
    ):
        assert old in study_text
        study_text = study_text.replace(old, new)
    file = folder / "small.toml"
    file.write_text(study_text)
    options = ["--budget", "60", "--workers", "1", "--results", str(folder / "results")]
    found = CliRunner().invoke(main, ["sweep", str(file), *options])
    assert found.exit_code == 0, found.output
    return folder / "results" / "small"


def first_design(folder: Path, family: str) -> str:
    return stored_family(open_results(folder), family).front_ids[0]


def checks_of(folder: Path, family: str, row: dict[str, Any]) -> dict[str, Check]:
    study = open_results(folder).study
    designs = {item.name: np.array([row[item.name]]) for item in VARIABLES}
    winding = study.winding(family)
    sections, _, _ = cross_sections(winding.family, designs, study.construction)
    return {item.name: item for item in worked_checks(study.task(family), sections, row)}


def test_worked_values_agree_with_the_model(results_folder: Path) -> None:
    count = 0
    for stored in stored_families(open_results(results_folder)):
        for position in range(len(stored.front_ids)):
            row = stored.front_row(position)
            found = checks_of(results_folder, stored.family, row)
            assert len(found) >= 10
            for check in found.values():
                assert check.agrees, (check.name, check.difference)
                count += 1
    assert count > 50


@pytest.mark.parametrize(
    ("metric", "factor", "name"),
    [
        ("back_emf_V", 2.0, "torque from EMF and current"),
        ("torque_current_A", 2.0**0.5, "torque from EMF and current"),  # peak for effective
        ("gap_flux_density_T", np.pi / 2.0, "EMF from the gap flux density"),  # mean for peak
        ("wire_diameter_mm", 2.0, "copper loss"),
        ("loss_iron_W", 3.0, "efficiency from the separate losses"),
        ("magnet_mass_kg", 1.1, "mass of the magnets"),
    ],
)
def test_a_slipped_factor_shows(
    results_folder: Path, metric: str, factor: float, name: str
) -> None:
    row = stored_family(open_results(results_folder), "Q6p2s1").front_row(0)
    found = checks_of(results_folder, "Q6p2s1", row | {metric: factor * row[metric]})
    assert not found[name].agrees


def test_checks_without_their_metrics_are_left_out(results_folder: Path) -> None:
    row = stored_family(open_results(results_folder), "Q6p2s1").front_row(0)
    del row["back_emf_V"]
    row["tip_speed_m_s"] = None
    found = checks_of(results_folder, "Q6p2s1", row)
    assert "torque from EMF and current" not in found
    assert "surface speed of the rotor" not in found
    assert "copper loss" in found


@pytest.mark.parametrize("family", ["Q6p2s1", "Q12p2s1"])
def test_sheet_is_complete(results_folder: Path, family: str) -> None:
    results = open_results(results_folder)
    sheet = design_sheet(results, first_design(results_folder, family))
    grids = {block.head: block for block in sheet.blocks if isinstance(block, Grid)}
    winding = results.study.winding(family)
    sides = grids["slot", "layer", "coil", "string", "torque", "suspension"]
    assert len(sides.rows) == 2 * winding.family.slots
    strings = grids["string", "coils"]
    coils = [int(coil) for row in strings.rows for coil in re.findall(r"(\d+) \(in", row[1])]
    assert sorted(coils) == list(range(1, winding.family.slots + 1))
    assert len(grids["limit on", "value", "limit", "reserve", ""].rows) == len(results.study.limits)
    assert len(grids["metric", "meaning", "value", "source"].rows) > 40
    for grid in grids.values():
        assert all(len(row) == len(grid.head) for row in grid.rows), grid.head
        assert len(grid.weights) in (0, len(grid.head))
    assert sum(isinstance(block, Drawing) for block in sheet.blocks) == 3
    cautions = " ".join(next(b.items for b in sheet.blocks if isinstance(b, Cautions)))
    for word in ("containment", "pacemakers", "DC link", "touchdown", "licensed", "codes"):
        assert word in cautions


def test_html_is_text_only(results_folder: Path) -> None:
    design = first_design(results_folder, "Q6p2s1")
    text = sheet_html(design_sheet(open_results(results_folder), design))
    assert "<img" not in text
    assert "&lt;img src=x onerror=alert(1)&gt;" in text
    assert re.findall(r"(?:src|href)=\"(?!#|data:)[^\"]*", text) == []
    assert "<script" not in text


def test_every_block_is_text() -> None:
    said = "<b>#panic(1)"
    svg = '<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 2 1"></svg>'
    grid = Grid((said, said), ((said, said),))
    blocks = (Heading(said), Text(said), Cautions((said,)), Drawing(svg, said), grid)
    sheet = Sheet(said, said, said, blocks)
    html = sheet_html(sheet)
    assert "<b>" not in html
    assert html.count("&lt;b&gt;") == 12
    assert sheet_pdf(sheet).startswith(b"%PDF-")  # a panic would have refused it


def test_pdf_is_set_from_data_and_always_the_same(results_folder: Path) -> None:
    sheet = design_sheet(open_results(results_folder), first_design(results_folder, "Q12p2s1"))
    made = sheet_pdf(sheet)
    assert made.startswith(b"%PDF-")
    assert made.rstrip().endswith(b"%%EOF")
    assert len(made) > 20_000
    assert sheet_pdf(sheet) == made


def test_command_writes_both_kinds(
    results_folder: Path, hovergap: Callable[..., Result], tmp_path: Path
) -> None:
    design = first_design(results_folder, "Q6p2s1")
    assert hovergap("sheet", results_folder, design).exit_code == 0
    assert (tmp_path / f"{design}.html").read_text().startswith("<!DOCTYPE html>")
    done = hovergap("sheet", results_folder, design, "--output", tmp_path / "a.pdf")
    assert done.exit_code == 0, done.output
    assert (tmp_path / "a.pdf").read_bytes().startswith(b"%PDF-")
    refused = hovergap("sheet", results_folder, design, "--output", "a.docx")
    assert refused.exit_code == 2
    assert "must end with .html or .pdf" in refused.output


def test_unknown_and_failed_designs_have_no_sheet(
    results_folder: Path,
    write_study: Callable[..., Path],
    hovergap: Callable[..., Result],
    tmp_path: Path,
) -> None:
    with pytest.raises(ResultsError, match="not stored"):
        design_sheet(open_results(results_folder), "Q6p2s1-999999")
    toy = '[evaluator]\nname = "toy"'
    file = write_study((toy, f"{toy}\nsettings = {{ invalid_above_mm = 1.0 }}"))
    options = ["--budget", "10", "--workers", "1", "--results", tmp_path / "r"]
    hovergap("sweep", file, *options)
    with pytest.raises(ResultsError, match="could not be evaluated"):
        design_sheet(open_results(tmp_path / "r" / "small"), "Q6p2s1-000000")
