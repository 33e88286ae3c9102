"""Ctrl-C, kill, and what a sweep shows while it runs: real processes and a pretended terminal."""

from __future__ import annotations

import os
import re
import signal
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from click.testing import Result

from studies.running.progress import ProgressLine, duration

Run = Callable[..., Result]
Write = Callable[..., Path]
Process = Callable[..., "subprocess.CompletedProcess[str]"]
Rows = Callable[[Path], list[dict[str, Any]]]

SLOW = ('name = "toy"', 'name = "toy"\n[evaluator.settings]\ndelay_s = 0.05')


def begin(*arguments: str | Path) -> subprocess.Popen[str]:
    return subprocess.Popen(
        [sys.executable, "-m", "studies", *map(str, arguments)],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
    )


def press_ctrl_c(child: subprocess.Popen[str]) -> None:
    """As a terminal does it: the signal reaches the program and its workers alike."""
    os.killpg(child.pid, signal.SIGINT)


def wait_for_rows(folder: Path, child: subprocess.Popen[str]) -> None:
    """Wait until something is stored; a child that ends before that fails the test."""
    for _ in range(600):
        if list(folder.glob("*/part-*.parquet")):
            return
        assert child.poll() is None, child.communicate()
        time.sleep(0.05)
    pytest.fail("nothing was stored in 30 s")


def test_ctrl_c_ends_cleanly_and_the_printed_command_goes_on(
    write_study: Write, process: Process, hovergap: Run, rows: Rows
) -> None:
    child = begin("sweep", write_study(SLOW), "--workers", "2", "--budget", "1500")
    wait_for_rows(Path("results/small"), child)
    press_ctrl_c(child)
    output, errors = child.communicate(timeout=60)
    assert child.returncode == 130, output + errors
    assert "Traceback" not in output + errors
    assert "finishing the designs in hand" in errors
    stored = rows(Path("results/small/Q6p2s1"))
    assert 0 < len(stored) < 1500
    command = next(line.strip() for line in output.splitlines() if line.startswith("  hovergap"))
    assert command == "hovergap resume results/small"
    arguments = command.split()[1:]
    result = hovergap(*arguments, "--budget", str(len(stored) + 25), "--family", "Q6p2s1")
    assert result.exit_code == 0, result.output
    assert rows(Path("results/small/Q6p2s1"))[: len(stored)] == stored


@pytest.mark.parametrize("workers", ["1", "2"])  # in this process; side by side in threads
def test_second_ctrl_c_stops_at_once(write_study: Write, workers: str) -> None:
    """One call takes a minute; the second signal must not wait for it."""
    settings = '[evaluator.settings]\ndelay_s = 60.0\nbegun = "begun"'
    minute = ('name = "toy"', f'name = "toy"\n{settings}')
    child = begin("sweep", write_study(minute), "--workers", workers)
    for _ in range(600):
        if Path("begun").exists():
            break
        assert child.poll() is None, child.communicate()
        time.sleep(0.05)
    start = time.monotonic()
    press_ctrl_c(child)
    time.sleep(0.5)
    assert child.poll() is None
    press_ctrl_c(child)
    output, errors = child.communicate(timeout=30)
    assert time.monotonic() - start < 20.0  # far below the minute, far above two slow cores
    assert child.returncode == 130, output + errors
    assert "Traceback" not in output + errors
    assert "hovergap resume results/small" in output


def test_killed_then_resumed_equals_uninterrupted(
    write_study: Write, hovergap: Run, rows: Rows
) -> None:
    child = begin("sweep", write_study(SLOW), "--workers", "2", "--budget", "400")
    wait_for_rows(Path("results/small"), child)
    child.kill()
    child.communicate()
    assert hovergap("resume", "results/small", "--workers", "1").exit_code == 0
    again = hovergap(
        "sweep", "small.toml", "--results", "whole", "--budget", "400", "--workers", "2"
    )
    assert again.exit_code == 0
    for family in ("Q6p2s1", "Q12p4s5"):
        assert rows(Path("results/small") / family) == rows(Path("whole/small") / family)


def test_piped_progress_is_plain_lines(write_study: Write, process: Process) -> None:
    result = process("sweep", write_study(), "--workers", "1")
    assert result.returncode == 0, result.stderr
    assert "\r" not in result.stdout
    assert "\x1b" not in result.stdout
    assert re.search(
        r"^Q6p2s1  \d+/200  (left .*  )?feasible \d+\.\d %  (hypervolume \d\.\d{3}  )?front \d+",
        result.stdout,
        re.MULTILINE,
    )


class Terminal:
    """A stream that says it is a terminal."""

    def __init__(self) -> None:
        self.text = ""

    def write(self, text: str) -> int:
        self.text += text
        return len(text)

    def flush(self) -> None:
        pass

    def isatty(self) -> bool:
        return True


def test_terminal_progress_overwrites_one_line(monkeypatch: pytest.MonkeyPatch) -> None:
    from optimizer.running.progress import Progress

    monkeypatch.setenv("COLUMNS", "120")
    stream = Terminal()
    line = ProgressLine(("A", "B"), stream)  # type: ignore[arg-type]
    state = Progress(500, 1000, 125, 3, 40, 0.5, 100.0, 5.0, 12)
    line.show("A", state)
    line.finish("A")
    line.say("done")
    first, blank, rest = stream.text.removeprefix("\r").split("\r")
    # 500 left at 100/s, then 1000 of the other family.
    assert first == (
        "A  500/1,000  left 0:05, all 0:15  feasible 25.0 %  hypervolume 0.500  front 40  100/s"
    )
    assert blank == " " * len(first)
    assert rest == "done\n"
    monkeypatch.setenv("COLUMNS", "40")
    line.show("B", state)
    assert len(stream.text.rpartition("\r")[2]) == 39


def test_searches_side_by_side_share_a_line(monkeypatch: pytest.MonkeyPatch) -> None:
    from optimizer.running.progress import Progress

    monkeypatch.setenv("COLUMNS", "120")
    stream = Terminal()
    line = ProgressLine(("A", "B", "C"), stream)  # type: ignore[arg-type]
    line.show("A", Progress(500, 1000, 125, 3, 40, 0.5, 100.0, 5.0, 12))
    line.show("B", Progress(250, 1000, 125, 3, 40, 0.5, 150.0, 5.0, 12))
    # 500 and 750 left and 1000 of the third, at 250/s together.
    text = stream.text.rpartition("\r")[2].rstrip()
    assert text == "all left 0:09  250/s  A  500  B  250"


def test_durations() -> None:
    assert [duration(s) for s in (0.4, 59.6, 3599.0, 3661.0, float("nan"))] == [
        "0:00",
        "1:00",
        "59:59",
        "1:01:01",
        "-",
    ]
