"""A small study searched with the analytic evaluator, and a browser if one is installed."""

from __future__ import annotations

import shutil
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner

MARKUP = 'a <b>bold</b> blower </script><script>alert(1)</script> & "more"'


def searched(folder: Path, study_text: str, budget: int, *replacements: tuple[str, str]) -> Path:
    """Search a study text and return its results folder."""
    from studies.cli import main

    for old, new in replacements:
        assert old in study_text
        study_text = study_text.replace(old, new)
    file = folder / "small.toml"
    file.write_text(study_text)
    options = ["--budget", str(budget), "--workers", "1", "--results", str(folder / "results")]
    found = CliRunner().invoke(main, ["sweep", str(file), *options])
    assert found.exit_code == 0, found.output
    return folder / "results" / "small"


@pytest.fixture(scope="session")
def results_folder(tmp_path_factory: pytest.TempPathFactory, study_text: str) -> Path:
    """Two families, 150 evaluations each; the description holds markup."""
    description = MARKUP.replace('"', '\\"')
    return searched(
        tmp_path_factory.mktemp("searched"),
        study_text,
        150,
        ('description = "an invented blower"', f'description = "{description}"'),
        ('name = "toy"', 'name = "analytic"'),
        # Curves hold at the stated temperatures, so that metrics must do so to be compared.
        ("[prices]", '[cooling]\ntemperatures = "fixed"\n\n[prices]'),
        ("tooth_width_ratio = 0.5", "tooth_width_ratio = [0.35, 0.6]"),
        ("tip_span_ratio = 1.0", "tip_span_ratio = [0.7, 1.6]"),
        ("tip_speed_m_s = { at_most = 70.0 }", "tip_speed_m_s = { at_most = 75.0 }"),
    )


@pytest.fixture(scope="session")
def page(results_folder: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The report of that study."""
    from studies.cli import main

    file = tmp_path_factory.mktemp("page") / "report.html"
    options = ["--output", str(file), "--workers", "1", "--designs", "30"]
    found = CliRunner().invoke(main, ["report", str(results_folder), *options])
    assert found.exit_code == 0, found.output
    return file


def _chromium() -> str | None:
    names = ("chromium", "chromium-browser", "google-chrome", "chrome")
    return next((path for path in map(shutil.which, names) if path), None)


@pytest.fixture(scope="session")
def browser() -> Iterator[Any]:
    """Headless Chromium through its driver; skipped where they are not installed."""
    webdriver = pytest.importorskip(
        "selenium.webdriver", reason="the package selenium is not installed"
    )
    from selenium.webdriver.chrome.options import Options
    from selenium.webdriver.chrome.service import Service

    program, driver = _chromium(), shutil.which("chromedriver")
    if program is None or driver is None:
        pytest.skip("Chromium and chromedriver are not installed")
    options = Options()
    options.binary_location = program
    for argument in ("--headless=new", "--no-sandbox", "--disable-gpu", "--disable-dev-shm-usage"):
        options.add_argument(argument)
    options.add_argument("--window-size=1400,1000")
    options.set_capability("goog:loggingPrefs", {"browser": "ALL", "performance": "ALL"})
    found = webdriver.Chrome(options=options, service=Service(driver))
    yield found
    found.quit()
