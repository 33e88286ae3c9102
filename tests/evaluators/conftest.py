"""Fixtures of the evaluator room.

`machines` (invented tasks and designs) and `conformance` (the suite of the evaluator contract) are
plain modules beside this file, imported by name: the `pythonpath` of pyproject.toml holds this
folder.
"""

from __future__ import annotations

import importlib
import tomllib
from collections.abc import Iterable
from importlib.metadata import EntryPoint, distributions, entry_points
from pathlib import Path

import pytest

pytest.register_assert_rewrite("conformance")

PROJECT = Path(__file__).parents[2]
GROUP = "hovergap.evaluators"


@pytest.fixture(scope="session")
def declared_entry_points(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder for the import path with the entry points that pyproject.toml declares."""
    declared = tomllib.loads((PROJECT / "pyproject.toml").read_text())["project"]["entry-points"]
    info = tmp_path_factory.mktemp("declared") / "hovergap_checkout-0.dist-info"
    info.mkdir()
    (info / "METADATA").write_text("Metadata-Version: 2.1\nName: hovergap-checkout\nVersion: 0\n")
    lines = [f"[{GROUP}]", *(f"{name} = {value}" for name, value in declared[GROUP].items())]
    (info / "entry_points.txt").write_text("\n".join(lines) + "\n")
    return info.parent


def distributions_points(folder: Path) -> Iterable[EntryPoint]:
    (distribution,) = distributions(path=[str(folder)])
    return distribution.entry_points


@pytest.fixture
def entry_points_found(declared_entry_points: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Make all declared evaluators discoverable, whatever is installed of this checkout."""
    declared = {point.name for point in distributions_points(declared_entry_points)}
    if not declared <= {point.name for point in entry_points(group=GROUP)}:
        monkeypatch.syspath_prepend(str(declared_entry_points))
        importlib.invalidate_caches()
