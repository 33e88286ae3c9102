"""Pytest option `--checks-page=FILE`: run the tests with outside checks, write what they find."""

from __future__ import annotations

import platform
import shlex
from collections.abc import Iterator, Sequence
from datetime import UTC, datetime
from importlib.metadata import version
from pathlib import Path
from types import CodeType
from typing import Any

import hypothesis
import pytest
from outside import RECORDS, OutsideChecks
from outside_page import Absent, page

LIBRARIES = ("hovergap", "numpy", "scipy", "numba")


def pytest_addoption(parser: pytest.Parser) -> None:
    parser.addoption(
        "--checks-page",
        metavar="FILE",
        help="run only tests with outside checks, and write a page of what these have found; with "
        "the equals sign, else a page that is there already is taken for a test",
    )


def pytest_configure(config: pytest.Config) -> None:
    file = config.getoption("--checks-page")
    if file:
        # The same examples in every run, so that the page tells changes of the project alone.
        hypothesis.settings.register_profile("checks page", derandomize=True)
        hypothesis.settings.load_profile("checks page")
        config.pluginmanager.register(Page(config, Path(file)), "checks page")


@pytest.hookimpl(wrapper=True)
def pytest_runtest_call(item: pytest.Item) -> Iterator[None]:
    RECORDS.slow = item.get_closest_marker("slow") is not None
    try:
        return (yield)
    finally:
        RECORDS.slow = False


class Page:
    """Gathers what was not run, and writes the page when all has gone well."""

    def __init__(self, config: pytest.Config, file: Path) -> None:
        self.config = config
        self.file = file
        self.absent: list[Absent] = []
        self.told = ""
        RECORDS.rows.clear()

    @pytest.hookimpl(trylast=True)
    def pytest_collection_modifyitems(self, items: list[pytest.Item]) -> None:
        others = [item for item in items if not holds_checks(item)]
        items[:] = [item for item in items if holds_checks(item)]
        self.config.hook.pytest_deselected(items=others)

    def pytest_deselected(self, items: Sequence[pytest.Item]) -> None:
        for item in items:
            if holds_checks(item):
                marks = [name for name in ("slow", "benchmark") if item.get_closest_marker(name)]
                reason = f"marked {' and '.join(marks)}" if marks else "not selected"
                self.absent.append(Absent(_name(item.nodeid), reason))

    def pytest_collectreport(self, report: pytest.CollectReport) -> None:
        file = self.config.rootpath / report.nodeid
        if report.skipped and file.is_file() and "OutsideChecks(" in file.read_text():
            self.absent.append(Absent(report.nodeid, f"skipped: {_reason(report)}"))

    def pytest_runtest_logreport(self, report: pytest.TestReport) -> None:
        if report.skipped:
            self.absent.append(Absent(_name(report.nodeid), f"skipped: {_reason(report)}"))

    def pytest_sessionfinish(self, session: pytest.Session) -> None:
        if session.testsfailed or not RECORDS.rows:
            cause = "a test has failed" if session.testsfailed else "no outside check has run"
            self.told = f"{self.file} is not written: {cause}"
            return
        arguments = [str(argument) for argument in self.config.invocation_params.args]
        versions = ", ".join(f"{name} {version(name)}" for name in LIBRARIES)
        self.file.write_text(
            page(
                RECORDS.rows.values(),
                list(dict.fromkeys(self.absent)),
                shlex.join(["python", "-m", "pytest", *arguments]),
                f"Python {platform.python_version()}, {versions}",
                datetime.now(UTC).date().isoformat(),
            )
        )
        self.told = f"{self.file} is written: {len(RECORDS.rows)} outside checks"

    def pytest_terminal_summary(self, terminalreporter: Any) -> None:
        terminalreporter.write_line(self.told)


def holds_checks(item: pytest.Item) -> bool:
    """Whether the test or a function of its file that it calls names an `OutsideChecks`."""
    function = getattr(item, "obj", None)
    inner = getattr(function, "hypothesis", None)
    scope = vars(getattr(item, "module", object))
    waiting, seen = [inner.inner_test if inner else function], set()
    while waiting:
        code = getattr(waiting.pop(), "__code__", None)
        if code is None or code in seen:
            continue
        seen.add(code)
        named = [scope[name] for name in _names(code) if name in scope]
        if any(value is OutsideChecks or isinstance(value, OutsideChecks) for value in named):
            return True
        waiting += [
            value for value in named if getattr(value, "__module__", "") == item.module.__name__
        ]
    return False


def _names(code: CodeType) -> set[str]:
    inner = (_names(part) for part in code.co_consts if isinstance(part, CodeType))
    return set(code.co_names).union(*inner)


def _name(nodeid: str) -> str:
    """Of the test without the values it was called with."""
    return nodeid.split("[")[0]


def _reason(report: pytest.CollectReport | pytest.TestReport) -> str:
    if not isinstance(report.longrepr, tuple):
        return "no reason given"
    return str(report.longrepr[-1]).removeprefix("Skipped: ")
