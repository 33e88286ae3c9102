"""The section on chance: there with several searches, absent with one, legible in a browser."""

from __future__ import annotations

import json
import time
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from click.testing import CliRunner

from evaluators.machine.winding.winding import Family
from studies.comparison.certainty import order_certainty
from studies.comparison.certainty_text import once_only, statements
from studies.comparison.numbers import REFERENCE
from studies.drawing.palette import family_mark
from studies.report.certainty import all_surfaces, certainty_data
from studies.report.certainty_figures import attainment_figure, order_figure
from studies.report.collect import ReportData, collect
from studies.stored.layout import open_results
from studies.stored.naming import search_seed

SEARCHES = 4
FAMILIES = ("Q6p2s1", "Q12p4s5", "Q12p2s1")


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory, study_text: str, site: Path) -> Path:
    """Three families, four searches each, with the quick toy evaluator."""
    from studies.cli import main

    root = tmp_path_factory.mktemp("chance")
    file = root / "small.toml"
    file.write_text(study_text.replace('"Q12p4s5"]', '"Q12p4s5", "Q12p2s1"]'))
    options = ["--budget", "50", "--searches", str(SEARCHES), "--workers", "1"]
    with pytest.MonkeyPatch.context() as patch:
        patch.syspath_prepend(str(site))
        found = CliRunner().invoke(main, ["sweep", str(file), "--results", str(root), *options])
    assert found.exit_code == 0, found.output
    return root / "small"


@pytest.fixture(scope="module")
def chance(folder: Path) -> ReportData:
    return collect([open_results(folder)], 20)


@pytest.fixture(scope="module")
def chance_page(folder: Path, site: Path) -> Path:
    from studies.cli import main

    file = folder.parent / "report.html"
    options = ["--output", str(file), "--workers", "1", "--designs", "10"]
    with pytest.MonkeyPatch.context() as patch:
        patch.syspath_prepend(str(site))
        found = CliRunner().invoke(main, ["report", str(folder), *options])
    assert found.exit_code == 0, found.output
    return file


def test_a_report_of_single_searches_has_one_line_on_chance(page: Path) -> None:
    text = page.read_text()
    assert "How sure is this order" not in text
    assert 'id="certainty"' not in text
    assert text.count("says nothing about chance") == 1


def test_marks_are_the_hypervolumes_of_the_searches(chance: ReportData) -> None:
    certainty = order_certainty(chance.comparison)
    assert certainty is not None
    assert sorted(family.label for family in certainty.families) == sorted(FAMILIES)
    medians = [family.median for family in certainty.families]
    assert medians == sorted(medians, reverse=True)
    for family in certainty.families:
        machine = next(f.winding.family for f in chance.families if f.label == family.label)
        assert isinstance(machine, Family)
        assert family.seeds == tuple(search_seed(3, machine, k) for k in range(1, SEARCHES + 1))
    marks = [family_mark(position) for position in range(3)]
    plot = order_figure(certainty.families, marks)
    drawn = [renderer.data_source.data for renderer in plot.renderers if renderer.glyph.size == 11]
    for row, (family, data) in enumerate(zip(certainty.families, drawn, strict=True)):
        assert np.array_equal(data["x"], family.hypervolumes)
        assert set(data["y"]) == {row}


def test_surfaces_lie_between_the_fronts_of_the_searches(chance: ReportData) -> None:
    shown = certainty_data(chance)
    assert shown is not None
    assert shown.pairs == [(0, 1), (0, 2), (1, 2)]
    assert [chance.families[position].label for position in shown.order] == [
        family.label for family in shown.certainty.families
    ]
    comparison = chance.comparison
    by_label = {family.label: family for family in shown.certainty.families}
    for pair, of_families in zip(shown.pairs, all_surfaces(chance, shown), strict=True):
        columns = list(pair)
        low, span = comparison.ideal[columns], np.ptp([comparison.ideal, comparison.nadir], axis=0)
        for family, surfaces in zip(chance.families, of_families, strict=True):
            fronts = [front[:, columns] for front in by_label[family.label].fronts]
            for path, level in ((surfaces.best, 1), (surfaces.median, 2), (surfaces.worst, 4)):
                scaled = (path - low) / span[columns]
                assert scaled.max() == pytest.approx(REFERENCE)  # from edge to edge
                assert (np.diff(scaled[:, 0]) >= 0.0).all()
                assert (np.diff(scaled[:, 1]) <= 0.0).all()
                # A little better than a corner fewer searches come, a little worse enough do.
                for corner in scaled[1:-1:2]:
                    for shift, enough in ((1e-9, True), (-1e-9, False)):
                        count = sum((front <= corner + shift).all(axis=1).any() for front in fronts)
                        assert (count >= level) == enough


def test_a_family_with_an_empty_search_keeps_its_band_open() -> None:
    from studies.report.certainty_figures import Surfaces

    edge = np.array([[1.0, 1.0]])
    path = np.array([[0.0, 1.0], [0.0, 0.2], [1.0, 0.2]])
    plot = attainment_figure(0, [Surfaces(path, edge, edge)], [family_mark(0)])
    assert len(plot.renderers) == 3


def test_statements_are_those_of_the_comparison(chance: ReportData, chance_page: Path) -> None:
    assert chance.certainty is not None
    text = chance_page.read_text()
    for sentence in statements(chance.certainty):
        assert sentence.replace("'", "&#x27;") in text
    assert "Share of the common box reached" in text
    assert "by half of them" in text
    assert once_only(chance.comparison).endswith("--searches 5` adds more.")


def test_section_in_a_browser(browser: Any, chance_page: Path) -> None:
    browser.get_log("browser")
    browser.get(chance_page.as_uri())
    end = time.monotonic() + 60.0
    while browser.execute_script("return document.documentElement.dataset.ready") != "cards":
        assert time.monotonic() < end
        time.sleep(0.05)
    assert not [entry for entry in browser.get_log("browser") if entry["level"] != "INFO"]
    labels = browser.execute_script(
        "const axis = Bokeh.documents[0].get_model_by_name('order-axis');"
        "return Array.from(axis.major_label_overrides.values())"
    )
    assert sorted(labels) == sorted(FAMILIES)
    axes = browser.execute_script(
        "return [0, 1, 2].map(k => ['x', 'y'].map(a => Bokeh.documents[0]"
        ".get_model_by_name(`attainment-${a}-${k}`).axis_label))"
    )
    assert axes == [
        ["total loss, W", "cost, EUR"],
        ["total loss, W", "ripple index"],
        ["cost, EUR", "ripple index"],
    ]
    seen = "return Bokeh.documents[0].get_model_by_name('attained-1-2-band').visible"
    assert browser.execute_script(seen) is True
    browser.execute_script("document.querySelector('[data-attained=\"2\"]').click()")
    assert browser.execute_script(seen) is False
    assert browser.execute_script(seen.replace("-1-2-", "-1-0-")) is True
    # Figures are drawn: none is an empty canvas, and nothing makes the page scroll sideways.
    places = browser.execute_script(
        "return ['plot-order', 'plot-attainment-0', 'plot-attainment-2'].map("
        "id => document.getElementById(id).getBoundingClientRect().height)"
    )
    assert min(places) > 150
    assert json.loads(
        browser.execute_script("return document.getElementById('report-data').textContent")
    )["certainty"]["pairs"]
