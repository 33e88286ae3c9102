"""The record of outside checks: what fails, what is kept, and what the page says."""

from __future__ import annotations

import os
import re
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from outside import TOPICS, OutsideChecks

check = OutsideChecks("studies", source="made up")
WORDS = {"why": "a test of the record"}


@pytest.mark.parametrize(("found", "expected", "tolerance"), [
    (1.02, 1.0, {"relative": 0.01}),
    (0.98, 1.0, {"absolute": 0.01}),
    ([1.0, 1.02], [1.0, 1.0], {"relative": 0.01}),
    (1.0 + 0.02j, 1.0, {"relative": 0.01}),
    (float("nan"), 1.0, {"relative": 0.01}),
    (float("nan"), float("nan"), {"relative": 0.01}),
    (1.0, float("inf"), {"relative": 0.01}),
    (float("inf"), 1.0, {"absolute": 0.01}),
    (1e-9, 0.0, {"relative": 0.01}),
    ([1.0, 1.0], [1.0, 1.0, 1.0], {"relative": 0.01}),
    ([], [], {"relative": 0.01}),
])  # fmt: skip
def test_what_deviates_too_far_fails(
    found: object, expected: object, tolerance: dict[str, float]
) -> None:
    with pytest.raises(AssertionError, match="a quantity"):
        check("a quantity", found, expected, **tolerance, **WORDS)


def test_bounds_and_equality_fail_too() -> None:
    for value in (0.9, 2.1, float("nan")):
        with pytest.raises(AssertionError, match=r"allowed 1 to 2 m .* Source: made up"):
            check.within("a length", [1.5, value], 1.0, 2.0, unit="m", **WORDS)
    with pytest.raises(AssertionError, match="no value to compare"):
        check.within("a length", [], 1.0, 2.0, **WORDS)
    with pytest.raises(AssertionError, match="found 3, expected 4"):
        check.same("a number", 3, 4)


def test_a_check_without_words_or_tolerance_is_refused() -> None:
    with pytest.raises(ValueError, match="tolerance is missing"):
        check("a quantity", 1.0, 1.0, **WORDS)
    with pytest.raises(ValueError, match="why of an outside check is missing"):
        check("a quantity", 1.0, 1.0, relative=1e-3, why=" ")
    with pytest.raises(ValueError, match="source of an outside check is missing"):
        OutsideChecks("field")("a quantity", 1.0, 1.0, relative=1e-3, **WORDS)
    with pytest.raises(ValueError, match="topic = 'weather' must be one of winding, geometry"):
        OutsideChecks("weather")


CHILD = """
import numpy as np
import pytest
from hypothesis import given, strategies as st
from outside import OutsideChecks

check = OutsideChecks("heat", source="a book | of 1900")

@pytest.mark.parametrize("value", [100.1, 99.7])
def test_heat(value):
    check("warmth", value, 100.0, relative=0.01, why="two\\n digits")
    check("cold", [value, 0.25], [value, 0.0], relative=0.01, absolute=0.5, unit="K", why="noise")
    OutsideChecks("winding").within("order", value / 100, 0.9, 2.0, why="wide", source="memory")

@pytest.mark.slow
def test_slow():
    check("glow", 1.0, 1.0 + 1e-14, relative=1e-9, why="rounding")

@pytest.mark.slow
def test_left_out():
    check("glow", 1.0, 1.0, relative=1e-9, why="rounding")

@given(st.integers(1, 3))
def test_skipped(n):
    pytest.skip("no such library")
    check.same("ice", n, n)

ROWS = np.zeros(3)

def helper():
    assert ROWS.size == 3
    check.same("what a helper compares", "a", "a")

def test_by_a_helper():
    helper()

def test_of_no_interest():
    raise RuntimeError("not run")
"""


def run(folder: Path, *arguments: str, text: str = CHILD) -> subprocess.CompletedProcess[str]:
    (folder / "conftest.py").write_text('pytest_plugins = ["outside_plugin"]\n')
    (folder / "pytest.ini").write_text("[pytest]\nmarkers =\n    slow: takes long\n")
    (folder / "test_child.py").write_text(text)
    (folder / "test_absent.py").write_text(
        "import pytest\npytest.importorskip('no_such_library')\ncheck = OutsideChecks('heat')\n"
    )
    return subprocess.run(
        [sys.executable, "-m", "pytest", "-q", *arguments],
        cwd=folder,
        env=os.environ | {"PYTHONPATH": str(Path(__file__).parent)},
        capture_output=True,
        text=True,
        check=False,
    )


def test_the_page(tmp_path: Path) -> None:
    done = run(tmp_path, "-k", "not left_out", "--checks-page=page.md")
    assert done.returncode == 0, done.stdout + done.stderr
    assert "page.md is written: 5 outside checks" in done.stdout
    page = (tmp_path / "page.md").read_text()
    assert "python -m pytest -q -k 'not left_out' --checks-page=page.md" in page
    assert re.search(r"\d{4}-\d\d-\d\d: Python 3\.\d+\.\d+, hovergap .*, numpy ", page)
    assert "5 checks of 10 values in 1 test files, all passed; 3 tests were not run" in page
    heat, book = "| `test_child.py` |", "a book \\| of 1900"
    assert f"| what a helper compares | 0 | none | exact | {book} | 1 {heat}" in page
    assert f"| warmth | 0.3 % | 1 % | two digits | {book} | 2 {heat}" in page
    assert f"| cold | 0, 0.25 K | 1 % or 0.5 K | noise | {book} | 4 {heat}" in page
    assert f"| glow (slow) | below 1e-12 | 1e-9 | rounding | {book} | 1 {heat}" in page
    assert f"| order | 0.997 to 1 | 0.9 to 2 | wide | memory | 2 {heat}" in page
    assert page.index("## Winding") < page.index("## Heat") < page.index("## Not in this run")
    assert "| `test_child.py::test_skipped` | skipped: no such library |" in page
    assert "| `test_absent.py` | skipped: could not import 'no_such_library'" in page
    assert "| `test_child.py::test_left_out` | marked slow |" in page
    assert "test_of_no_interest" not in page


def test_no_page_after_a_failure(tmp_path: Path) -> None:
    failing = CHILD.replace("99.7", "98.9")
    done = run(tmp_path, "--checks-page=page.md", text=failing)
    assert done.returncode == 1
    assert "warmth: found 98.9" in done.stdout
    assert "page.md is not written: a test has failed" in done.stdout
    assert not (tmp_path / "page.md").exists()


def test_no_page_without_the_option(pytestconfig: pytest.Config) -> None:
    wanted = pytestconfig.getoption("--checks-page") is not None
    assert pytestconfig.pluginmanager.has_plugin("checks page") == wanted


def test_topics_are_words() -> None:
    assert len(set(TOPICS.values())) == len(TOPICS)
    assert np.all([title[0].isupper() for title in TOPICS.values()])
