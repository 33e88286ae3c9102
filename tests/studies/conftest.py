"""Fixtures of the study room: the toy evaluator as a third-party package, and a small study."""

from __future__ import annotations

import importlib
import os
import shutil
import subprocess
import sys
import tomllib
from collections.abc import Callable
from importlib.metadata import entry_points
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner, Result

from optimizer.archive.archive import open_archive

TIME_COLUMNS = ("time_s", "finished_at")
HERE = Path(__file__).parent
PROJECT = HERE.parents[1]

STUDY = """\
[study]
name = "small"
description = "an invented blower"

[duty]
power_kW = 2.0
speed_rpm = 30000
dc_link_V = 320.0

[materials]
stator_steel = "NO20-1200"
rotor_steel = "NO20-1200"
magnet = "REFeB 300/160"
conductor = "Copper"
sleeve = "TiAl6V4"
shaft = "C45"

[prices]
electrical_steel = { per_kg = 5.0, waste_share = 0.4 }
copper = 12.0
magnet = 80
sleeve = 60.0

[variables]
rotor_radius_mm = [12.0, 24.0]
clearance_mm = 0.4
sleeve_thickness_mm = 1.0
magnet_thickness_mm = [2.0, 5.0]
magnet_arc_ratio = [0.6, 1.0]
core_ratio = 0.5
tooth_width_ratio = 0.5
tip_span_ratio = 1.0
tip_height_mm = 1.0
wedge_height_mm = 1.0
slot_depth_ratio = 0.5
yoke_ratio = 1.0
current_density_A_mm2 = [2.0, 8.0]

[families]
list = ["Q6p2s1", "Q12p4s5"]

[limits]
tip_speed_m_s = { at_most = 70.0 }

[[objectives]]
metric = "loss_total_W"

[[objectives]]
metric = "cost"
sense = "minimise"

[[objectives]]
metric = "ripple_index"

[search]
evaluations_per_family = 200
seed = 3

[evaluator]
name = "toy"
"""


@pytest.fixture(scope="session")
def site(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder for the import path: the toy evaluator with its entry point."""
    folder = tmp_path_factory.mktemp("site")
    shutil.copy(HERE / "toy_evaluator.py", folder)
    info = folder / "toy_evaluator-1.0.dist-info"
    info.mkdir()
    (info / "METADATA").write_text("Metadata-Version: 2.1\nName: toy-evaluator\nVersion: 1.0\n")
    points = [
        "[hovergap.evaluators]",
        "toy = toy_evaluator:ToyEvaluator",
        "toy_finer = toy_evaluator:FinerToyEvaluator",
        "toy_broken = toy_evaluator:BrokenToyEvaluator",
        "toy_missing = toy_of_nobody:Evaluator",
    ]
    declared = tomllib.loads((PROJECT / "pyproject.toml").read_text())["project"]["entry-points"]
    found = {point.name for point in entry_points(group="hovergap.evaluators")}
    # The tests also run from a checkout that is not installed, or was installed before a change.
    points += [
        f"{name} = {place}"
        for name, place in declared["hovergap.evaluators"].items()
        if name not in found
    ]
    (info / "entry_points.txt").write_text("\n".join(points) + "\n")
    return folder


@pytest.fixture(autouse=True)
def _toy_installed(site: Path, monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.syspath_prepend(str(site))
    existing = os.environ.get("PYTHONPATH", "")
    paths = [str(site), str(PROJECT), *([existing] if existing else [])]
    monkeypatch.setenv("PYTHONPATH", os.pathsep.join(paths))  # also for worker processes
    monkeypatch.chdir(tmp_path)
    importlib.invalidate_caches()


@pytest.fixture(scope="session")
def study_text() -> str:
    return STUDY


@pytest.fixture
def write_study(tmp_path: Path) -> Callable[..., Path]:
    """Write the small study with some texts replaced; every replacement must occur."""

    def write(*replacements: tuple[str, str], name: str = "small.toml") -> Path:
        text = STUDY
        for old, new in replacements:
            assert old in text
            text = text.replace(old, new)
        file = tmp_path / name
        file.write_text(text)
        return file

    return write


@pytest.fixture
def rows() -> Callable[[Path], list[dict[str, Any]]]:
    """All rows of an archive without the columns of time."""

    def read(folder: Path) -> list[dict[str, Any]]:
        return [
            {key: value for key, value in row.items() if key not in TIME_COLUMNS}
            for row in open_archive(folder).table().to_pylist()
        ]

    return read


@pytest.fixture
def hovergap() -> Callable[..., Result]:
    """Run a command in this process."""

    def run(*arguments: str | Path) -> Result:
        from studies.cli import main

        return CliRunner().invoke(main, [str(item) for item in arguments])

    return run


@pytest.fixture
def process() -> Callable[..., subprocess.CompletedProcess[str]]:
    """Run a command as a process of its own."""

    def run(*arguments: str | Path, **options: object) -> subprocess.CompletedProcess[str]:
        return subprocess.run(
            [sys.executable, "-m", "studies", *map(str, arguments)],
            capture_output=True,
            text=True,
            timeout=120,
            check=False,
            **options,  # type: ignore[call-overload]
        )

    return run
