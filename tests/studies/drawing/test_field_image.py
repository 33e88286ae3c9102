"""`hovergap field`: a picture that shows something, with units, and clear refusals."""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner, Result

from evaluators.machine.geometry.cross_sections import MILLI
from evaluators.machine.geometry.outlines import outlines
from studies.drawing.field_picture import colours, loop_points
from studies.stored.families import stored_search
from studies.stored.layout import open_results

Run = Callable[..., Result]
FAMILY = "Q6p2s1"


@pytest.fixture(scope="module")
def searched(tmp_path_factory: pytest.TempPathFactory, study_text: str) -> Path:
    """Results of a small study with the analytic evaluator."""
    from studies.cli import main

    folder = tmp_path_factory.mktemp("field")
    file = folder / "small.toml"
    file.write_text(study_text.replace('name = "toy"', 'name = "analytic"'))
    options = ["--budget", "30", "--workers", "1", "--results", str(folder), "--family", FAMILY]
    found = CliRunner().invoke(main, ["sweep", str(file), *options])
    assert found.exit_code in (0, 3), found.output
    return folder / "small"


@pytest.fixture(scope="module")
def design(searched: Path) -> str:
    """A design that could be evaluated."""
    table = stored_search(open_results(searched), FAMILY).reader.table(["evaluation", "status"])
    row = table["status"].to_pylist().index("ok")
    return f"{FAMILY}-{table['evaluation'].to_pylist()[row]:06d}"


def test_png_shows_a_field(searched: Path, design: str, hovergap: Run) -> None:
    from matplotlib.image import imread

    result = hovergap("field", searched, design, "--angle", "10")
    assert result.exit_code == 0, result.output
    assert f"wrote {design}-field.png" in result.output
    image = (255.0 * imread(f"{design}-field.png")[..., :3]).astype(int)
    shades = np.unique(image.reshape(-1, 3), axis=0)
    assert len(shades) > 200  # a blank or an outline drawing has a dozen greys
    blue = (image[..., 2] - image[..., 0]) > 40
    assert 0.05 < blue.mean() < 0.8  # iron and magnets carry flux, paper and slots do not


def test_svg_has_labels_with_units(searched: Path, design: str, hovergap: Run) -> None:
    result = hovergap("field", searched, design, "--no-load", "--output", "a.svg")
    assert result.exit_code == 0, result.output
    text = Path("a.svg").read_text()
    words = " ".join(re.findall(r"<text[^>]*>([^<]*)</text>", text))
    for label in ("flux density |B|, T", "x, mm", "y, mm", "per metre of stack", "Magnets alone"):
        assert label in words
    assert hovergap("field", searched, design, "--no-load", "--output", "b.svg").exit_code == 0
    assert Path("b.svg").read_bytes() == Path("a.svg").read_bytes()


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["--output", "field.gif"], "must end with .png or .svg"),
        (["--angle", "many"], "is not a valid float"),
    ],
)
def test_bad_options_are_refused(
    searched: Path, design: str, hovergap: Run, arguments: list[str], words: str
) -> None:
    result = hovergap("field", searched, design, *arguments)
    assert result.exit_code == 2
    assert words in result.output


def test_unknown_design_is_refused(searched: Path, hovergap: Run) -> None:
    result = hovergap("field", searched, f"{FAMILY}-999999")
    assert result.exit_code == 2
    assert "is not stored" in result.output


def test_colours_get_evenly_darker_also_without_colour() -> None:
    """CIE 1976 L* of sRGB (IEC 61966-2-1): what is left for a reader who sees no colour."""
    rgb = colours()(np.linspace(0.0, 1.0, 101))[:, :3]
    linear = np.where(rgb <= 0.04045, rgb / 12.92, ((rgb + 0.055) / 1.055) ** 2.4)
    luminance = linear @ np.array([0.2126, 0.7152, 0.0722])
    lightness = 116.0 * np.cbrt(luminance) - 16.0  # all shades lie above the linear foot
    steps = np.diff(lightness)
    assert np.all(steps < 0.0)
    assert lightness[0] > 99.0
    # Even in Oklab; L* weighs colour otherwise, so steps there differ by less than a factor of 3.
    assert steps.min() > 3.0 * steps.max()


def test_outlines_as_polygons_keep_their_area(searched: Path, design: str) -> None:
    from studies.inspection.chosen import choose_design

    chosen = choose_design(open_results(searched), design)
    for part in outlines(chosen.sections, 0, chosen.task.winding):
        z = loop_points(part.outer)
        area = 0.5 * float(np.sum(np.imag(np.conj(z[:-1]) * z[1:])))
        # Chords of 2 degrees of a circle: 1 - sin(a)/a = 2e-4.
        assert area == pytest.approx(part.outer.area, rel=1e-3)
    assert float(chosen.sections.outer_radius[0]) / MILLI > np.sqrt(area / np.pi)
