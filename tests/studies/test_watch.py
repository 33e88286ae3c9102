"""Watching a sweep that runs in a process of its own."""

from __future__ import annotations

import os
import pty
import re
import signal
import socket
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest
from click.testing import Result

from optimizer.archive.lock import WRITER_NAME
from studies.running.screen import Screen
from studies.running.watching import StudyWatch, writer_of
from studies.stored.families import stored_family
from studies.stored.layout import open_results

Run = Callable[..., Result]
Write = Callable[..., Path]
LONGEST_S = 90.0  # of a wait; the machine may be busy
FAMILIES = ("Q6p2s1", "Q12p4s5")


def command(*arguments: str) -> list[str]:
    return [sys.executable, "-m", "studies", *arguments]


@pytest.fixture
def sweep(write_study: Write, request: pytest.FixtureRequest) -> Iterator[subprocess.Popen[bytes]]:
    """A sweep of two families that takes several seconds; its parameter is the time of a call."""
    delay = getattr(request, "param", 0.5)
    write_study(('name = "toy"', f'name = "toy"\nsettings = {{ delay_s = {delay} }}'))
    process = subprocess.Popen(
        command("sweep", "small.toml", "--budget", "150", "--workers", "1"),
        stdout=subprocess.DEVNULL,
    )
    yield process
    if process.poll() is None:
        process.terminate()
    process.wait(LONGEST_S)


def wait_for_rows(process: subprocess.Popen[bytes]) -> None:
    begin = time.monotonic()
    while not list(Path("results/small").glob("*/part-*.parquet")):
        assert process.poll() is None
        assert time.monotonic() - begin < LONGEST_S
        time.sleep(0.05)


def test_watch_follows_a_running_sweep_to_its_end(sweep: subprocess.Popen[bytes]) -> None:
    watching = subprocess.run(
        command("watch", "results/small", "--wait", "--interval", "0.3"),
        capture_output=True,
        text=True,
        timeout=LONGEST_S,
        check=False,
    )
    assert watching.returncode == 0, watching.stderr
    assert sweep.wait(LONGEST_S) == 0
    text = watching.stdout
    assert f"small: searched by process {sweep.pid}" in text
    assert "\x1b" not in text  # plain lines in a pipe
    for family in FAMILIES:
        counts = [int(item) for item in re.findall(rf"{family} +(\d+)/150", text)]
        assert counts == sorted(counts)
        assert counts[0] < 150
        assert counts[-1] == 150
    assert re.search(r"\d/s +\d:\d\d", text)  # a rate and the time left
    assert text.rstrip().endswith("every family is complete")
    # What it ends with is what the archive holds.
    state = StudyWatch.of(open_results(Path("results/small")))
    state.refresh()
    for item in state.searches:
        stored = stored_family(state.results, item.name)
        assert (item.evaluations, item.feasible, item.failed) == stored.counts
        assert len(item.front) == stored.front.num_rows


@pytest.mark.parametrize("sweep", [3.0], indirect=True)  # outlasts the start of watch
def test_control_c_ends_the_watching_and_not_the_sweep(sweep: subprocess.Popen[bytes]) -> None:
    wait_for_rows(sweep)
    watching = subprocess.Popen(
        command("watch", "results/small", "--interval", "0.2"),
        stdout=subprocess.PIPE,
        text=True,
    )
    assert watching.stdout is not None
    first = watching.stdout.readline()
    assert f"searched by process {sweep.pid}" in first
    watching.send_signal(signal.SIGINT)
    rest, _ = watching.communicate(timeout=LONGEST_S)
    assert watching.returncode == 0
    assert "goes on" in rest
    assert sweep.poll() is None


def test_an_idle_study_is_shown_once(hovergap: Run, write_study: Write) -> None:
    write_study()
    hovergap("sweep", "small.toml", "--budget", "30", "--workers", "1", "--family", "Q6p2s1")
    before = {path: path.stat().st_mtime_ns for path in Path("results").rglob("*")}
    done = hovergap("watch", "results/small")
    assert {path: path.stat().st_mtime_ns for path in Path("results").rglob("*")} == before
    assert done.exit_code == 0
    assert "not being searched" in done.output
    assert "30/30" in done.output
    assert "Q12p4s5" not in done.output  # was not asked for
    # A writer's note outlives a process that was killed; its number is no longer in use.
    gone = subprocess.Popen([sys.executable, "-c", "pass"])
    gone.wait()
    note = Path("results/small", WRITER_NAME)
    note.write_text(f"process {gone.pid} on {socket.gethostname()}")
    assert writer_of(Path("results/small")) == ""
    note.write_text(f"process {os.getpid()} on {socket.gethostname()}")
    assert writer_of(Path("results/small")) == f"process {os.getpid()}"
    note.write_text("process 1 on another-machine")
    assert writer_of(Path("results/small")) == "process 1 on another-machine"
    note.write_bytes(b"\xff\xfe garbage")
    assert writer_of(Path("results/small")) == ""
    missing = hovergap("watch", "results/nothing")
    assert missing.exit_code == 2
    assert "no such results folder" in missing.output


def test_merged_parts_are_not_counted_twice(hovergap: Run, write_study: Write) -> None:
    write_study()
    hovergap("sweep", "small.toml", "--budget", "60", "--workers", "1", "--family", "Q6p2s1")
    state = StudyWatch.of(open_results(Path("results/small")))
    state.refresh()
    [family] = state.searches
    counts = family.evaluations, family.feasible, len(family.front)
    # The same rows under a new name, as after a merge.
    for part in family.folder.glob("part-*.parquet"):
        part.rename(part.with_name(part.name.replace("part-0000", "part-0009")))
    state.refresh()
    assert (family.evaluations, family.feasible, len(family.front)) == counts


def test_a_terminal_is_redrawn_in_place(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("TERM", "xterm")
    monkeypatch.setenv("COLUMNS", "20")
    monkeypatch.setenv("LINES", "5")
    parent, child = pty.openpty()
    try:
        with os.fdopen(child, "w") as stream:
            screen = Screen(stream)
            assert screen.live
            screen.show(["a" * 50, "b"])
            screen.show([f"line {k}" for k in range(9)])
            screen.show(["end"])
            written = b""
            while b"end" not in written:  # a terminal hands over what it has so far
                written += os.read(parent, 10_000)
            text = written.decode().replace("\r\n", "\n")
    finally:
        os.close(parent)
    first, second, third = text.split("\x1b[J")[1:]
    assert first.split("\n")[0] == "a" * 19  # cut to the terminal's width
    assert first.endswith("\x1b[2A\r")  # up by the two lines shown
    assert second.split("\n")[3] == "and 6 more lines"  # one line is left for the cursor
    assert second.endswith("\x1b[4A\r")
    assert third.strip() == "end"
