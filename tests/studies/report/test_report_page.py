"""The report without a browser: what stands in the file, and that it is harmless."""

from __future__ import annotations

import base64
import gzip
import json
import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa
import pytest
from click.testing import CliRunner

from evaluators.interface import Waveform
from evaluators.machine.metrics import METRIC
from optimizer.archive.parts import write_part
from studies.errors import ResultsError
from studies.report.collect import ReportData, collect
from studies.report.columns import title
from studies.report.encoding import STEPS, coarse, packed, script_json, single
from studies.report.families import tip_shapes
from studies.report.html import table
from studies.report.verified import verified_values
from studies.report.waves import turn_curves
from studies.stored.families import Stored, StoredFamily, stored_search
from studies.stored.layout import open_results
from studies.stored.verified import verified_folder


def content(page: str, name: str) -> Any:
    match = re.search(rf'<script type="application/json" id="{name}">(.*?)</script>', page, re.S)
    assert match
    return json.loads(match[1])


def decoded(part: dict[str, Any]) -> np.ndarray:
    """A coarse column as the page's program reads it."""
    if "count" in part:
        return np.full(part["count"], part["low"])
    codes = np.frombuffer(base64.b64decode(part["codes"]), dtype="<u2").astype(float)
    return np.where(codes == STEPS + 1, np.nan, part["low"] + codes * part["step"])


@pytest.fixture(scope="module")
def text(page: Path) -> str:
    return page.read_text(encoding="utf-8")


@pytest.fixture(scope="module")
def data(results_folder: Path) -> ReportData:
    return collect([open_results(results_folder)], 30)


def test_file_is_small_and_refers_to_nothing_outside(text: str) -> None:
    assert len(text.encode()) < 10e6
    outside = re.findall(
        r"<(?:link|img|script|iframe|object|embed)\b[^>]*(?:src|href)=[^>]*>", text
    )
    assert outside == ['<link rel="icon" href="data:,">']
    assert "default-src 'none'" in text  # a browser refuses whatever else might ask


def test_markup_of_the_study_is_escaped(text: str) -> None:
    assert "&lt;b&gt;bold&lt;/b&gt;" in text
    assert "<b>bold" not in text
    assert "alert(1)</script>" not in text.replace("&lt;/script&gt;", "")


def test_page_holds_the_front_exactly_enough(text: str, results_folder: Path) -> None:
    held = content(text, "report-data")
    values = np.frombuffer(base64.b64decode(held["designs"]["values"]), dtype="<f4")
    values = values.reshape(len(held["columns"]), -1)
    names = [column["name"] for column in held["columns"]]
    reader = stored_search(open_results(results_folder), "Q6p2s1").reader
    for position, design in enumerate(held["designs"]["ids"]):
        family, evaluation = design.rsplit("-", 1)
        if family != "Q6p2s1":
            continue
        row = reader.row(int(evaluation))
        for name in ("loss_total_W", "cost", "ripple_index", "rotor_radius_mm"):
            found = values[names.index(name), position]
            assert found == pytest.approx(row[name], rel=1e-6)  # 32-bit numbers


def test_cards_hold_a_drawing_and_curves_of_every_design(text: str) -> None:
    packed_cards = content(text, "report-cards")
    cards = json.loads(gzip.decompress(base64.b64decode(packed_cards)))
    held = content(text, "report-data")
    assert len(cards["designs"]) == len(held["designs"]["ids"])
    names = [column["name"] for column in held["columns"]]
    values = np.frombuffer(base64.b64decode(held["designs"]["values"]), dtype="<f4")
    values = values.reshape(len(names), -1)
    for position, (design, card) in enumerate(
        zip(held["designs"]["ids"], cards["designs"], strict=True)
    ):
        assert design in card["section"]
        curves = card["curves"]
        torque = decoded(curves["torque"])
        # Same model, stored and computed again; thinning of the curve moves the mean a little.
        stored = values[names.index("torque_Nm"), position]
        assert torque.mean() == pytest.approx(stored, rel=1e-3)
        # A per cent or two of ripple does not average out over the points that are kept.
        force = decoded(curves["xx"]).mean()
        assert force == pytest.approx(values[names.index("force_N"), position], rel=0.02)
        # Linear in the current: at the duty, half of the curve's end, the stored errors return.
        angle = np.interp(0.5, np.linspace(0.05, 1.0, 20), curves["angle"])
        expected = values[names.index("force_error_angle_deg"), position]
        assert angle == pytest.approx(expected, rel=1e-3, abs=1e-4)


def test_same_results_give_the_same_file(results_folder: Path, page: Path, tmp_path: Path) -> None:
    from studies.cli import main

    again = tmp_path / "again.html"
    options = ["--output", str(again), "--workers", "1", "--designs", "30"]
    assert CliRunner().invoke(main, ["report", str(results_folder), *options]).exit_code == 0

    # Bokeh numbers its documents at random; nothing else may differ.
    def settled(file: Path) -> str:
        found = re.sub(r"[0-9a-f]{8}-[0-9a-f-]{27}", "", file.read_text())
        return re.sub(r'"?p\d{4,}"?', "", found)

    assert settled(again) == settled(page)


def test_progress_ends_at_the_hypervolume_of_the_comparison(data: ReportData) -> None:
    for family in data.families:
        [curve] = family.progress  # one search
        assert curve[-1, 0] == family.member.stored.counts[0]
        assert curve[-1, 1] == pytest.approx(family.member.hypervolume, rel=1e-12)
        assert (np.diff(curve[:, 1]) >= -1e-12).all()


def test_context_and_cards_are_all_feasible_designs(data: ReportData) -> None:
    for family in data.families:
        assert len(family.ids) + len(family.context) == family.member.stored.counts[1]
        assert len(family.ids) <= 31  # one more where the compromise was thinned out
        assert family.ids[family.compromise or 0] in family.member.stored.front_ids


def test_unknown_number_of_digits_stays_in_the_range() -> None:
    rng = np.random.default_rng(5)
    values = np.append(rng.normal(3.0, 20.0, 500), np.nan)
    back = decoded(coarse(values))
    assert np.isnan(back[-1])
    span = np.ptp(values[:-1])
    np.testing.assert_allclose(back[:-1], values[:-1], atol=0.501 * span / STEPS)
    np.testing.assert_array_equal(decoded(coarse(np.full(7, 2.5))), np.full(7, 2.5))
    assert np.frombuffer(base64.b64decode(single(np.array([1.5]))), "<f4")[0] == 1.5


def test_json_cannot_end_its_script() -> None:
    said = script_json({"name": "</script><!-- &", "bad": float("nan"), "list": [float("inf")]})
    assert "<" not in said
    assert json.loads(said) == {"name": "</script><!-- &", "bad": None, "list": [None]}
    assert packed([1, 2]) == packed([1, 2])


@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("loss_total_W", "total loss"),
        ("force_error_angle_deg", "force error angle"),
        ("displacement_stiffness_N_mm", "displacement stiffness"),
        ("torque_density_Nm_L", "torque density"),
        ("back_emf_V", "back EMF"),
        ("winding_temperature_C", "winding temperature"),
        ("free_bending_speed_rpm", "free bending speed"),
        ("lift_off_ratio", "lift-off ratio"),
    ],
)
def test_titles_have_no_unit(name: str, expected: str) -> None:
    assert title(name, METRIC[name].unit) == expected


def test_tables_hold_text() -> None:
    said = table(["<i>head"], [["<b>row", "<u>cell"]], "<s>caption")
    assert not re.search(r"<[bius]>", said)
    assert said.count("&lt;") == 4


def test_curves_of_other_positions_are_brought_to_those_of_the_torque() -> None:
    """A force that turns once against the rotor: its mean is that of its constant part."""

    def wave(name: str, count: int, shape: Callable[[np.ndarray], np.ndarray]) -> Waveform:
        angle = 2.0 * np.pi * np.arange(count) / count
        return Waveform(name, "N/m", "rotor angle, rad", angle, shape(angle))

    found = turn_curves(
        [
            wave("torque", 360, lambda a: 2.0 + 0.1 * np.cos(6.0 * a)),
            wave("force along x, commanded along x", 720, lambda a: 5.0 + 0.5 * np.cos(a)),
            wave("force along y, commanded along x", 720, lambda a: 0.5 * np.sin(a)),
            wave("force along x, no suspension current", 720, lambda a: 0.5 * np.cos(a)),
            wave("force along y, no suspension current", 720, lambda a: 0.5 * np.sin(a)),
        ],
        stack_length=0.1,
        suspension_current=3.0,
    )
    assert found is not None
    assert found.force_x.shape == found.torque.shape == (360,)
    assert found.cogging.size == found.force_y.size == 0
    assert found.force_x.mean() == pytest.approx(0.5)
    # At s times the current the mean is s and the rest stays: sin(angle) = 0.05 / (0.5 s).
    share = found.current / 3.0
    np.testing.assert_allclose(found.force, 0.5 * share, rtol=1e-9)
    turned = share > 0.2  # below, the constant part is too weak to hold the direction
    expected = np.degrees(np.arcsin(0.1 / share[turned]))
    # One degree between positions, near a flat maximum.
    np.testing.assert_allclose(found.error_angle[turned], expected, rtol=1e-3)
    np.testing.assert_allclose(found.error_magnitude, 0.1 / share, rtol=1e-3)


def test_curves_need_torque_and_force() -> None:
    assert turn_curves([], 1.0, 1.0) is None


def test_tip_shapes() -> None:
    assert tip_shapes(np.array([0.5, 0.97, 0.99, 1.0, 1.01, 1.5, 1.9])) == (2, 3, 2)


def test_verified_values_are_read_where_they_are(tmp_path: Path) -> None:
    search = Stored("small", "Q6p2s1", tmp_path, (), None, search=2)  # type: ignore[arg-type]
    family = StoredFamily((search,))
    assert verified_values(family) == {}
    table = pa.table(
        {
            "evaluation": [7],
            "status": ["ok"],
            "evaluator": ["finer"],
            "evaluator_version": ["2"],
            "torque_Nm": [1.25],
            "cost": pa.array([None], pa.float64()),
        }
    )
    folder = verified_folder(tmp_path, "finer")
    folder.mkdir()
    path = write_part(folder, 0, table)
    found = verified_values(family)["Q6p2s1.2-000007"]
    assert (found.evaluator, found.metrics) == ("finer", {"torque_Nm": 1.25})
    path.write_bytes(b"PAR1 no")
    with pytest.raises(ResultsError, match="verified"):
        verified_values(family)


def test_nothing_feasible_is_said(write_study: Any, hovergap: Any, tmp_path: Path) -> None:
    file = write_study(("at_most = 70.0", "at_most = 1.0"))
    hovergap("sweep", file, "--budget", "30", "--workers", "1", "--results", tmp_path / "r")
    found = hovergap("report", tmp_path / "r" / "small")
    assert found.exit_code == 2
    assert "no design meets all limits" in found.output


def test_evaluator_without_waveforms_and_two_studies(
    write_study: Any, hovergap: Any, tmp_path: Path
) -> None:
    file = write_study()
    for root in ("one", "<i>two"):
        options = ["--budget", "40", "--workers", "1", "--results", tmp_path / root]
        assert hovergap("sweep", file, *options).exit_code == 0
    folders = [tmp_path / root / "small" for root in ("one", "<i>two")]
    found = hovergap("report", *folders, "--output", tmp_path / "both.html", "--workers", "1")
    assert found.exit_code == 0, found.output
    text = (tmp_path / "both.html").read_text()
    assert "<i>two" not in text
    held = content(text, "report-data")
    assert len(held["families"]) == 4
    assert len({family["label"] for family in held["families"]}) == 4
    cards = json.loads(gzip.decompress(base64.b64decode(content(text, "report-cards"))))
    assert all(card["curves"] is None for card in cards["designs"])
