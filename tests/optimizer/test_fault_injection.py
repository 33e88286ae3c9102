"""Whatever breaks at whatever step, the next run ends with the rows of one that never broke."""

from __future__ import annotations

import json
import os
import random
import resource
import signal
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow.compute as pc
import pytest

from optimizer.archive.archive import open_archive
from optimizer.archive.parts import part_paths
from optimizer.errors import ArchiveError, OptimizerError
from optimizer.running.runner import run
from optimizer.settings import Settings

sys.path.insert(0, str(Path(__file__).parent))
import faults

HERE = Path(__file__).parent
ERRORS = {
    "ENOSPC": "the disk is full",
    "EIO": "the disk reports an input/output error",
    "EACCES": "permission is denied",
}
# Steps whose failure costs nothing: a note for people, what is tidied up, a file without a name
# by which the lock's library tries the file system, and making the folder where it exists, which
# that library does again.
HARMLESS = {"open writer", "remove writer", "remove front.parquet", "open slopes", "mkdir slopes"}


@pytest.fixture
def place() -> Iterator[Path]:
    """A folder in memory where there is one: these tests sync thousands of times."""
    memory = Path("/dev/shm")  # noqa: S108
    where = memory if os.access(memory, os.W_OK) else None
    with tempfile.TemporaryDirectory(dir=where) as folder:
        inner = Path(folder) / "place"  # what a writer was told is noted beside it
        inner.mkdir()
        yield inner


def broken(place: Path, environment: dict[str, str], *arguments: str) -> list[dict]:
    """Run the script of faults; what it tells of each step."""
    done = subprocess.run(
        [sys.executable, str(HERE / "faults.py"), str(place), *arguments],
        capture_output=True, text=True, check=False, env=environment,
    )  # fmt: skip
    assert done.returncode == 0, done.stderr
    return [json.loads(line) for line in done.stdout.splitlines()]


def sound(told: dict, whole, rows_of) -> None:
    """The archive a run made after the fault is that of a run without one."""
    folder = Path(told["folder"])
    assert told["again"] == 0, told
    assert told["lost"] == [], told
    assert told["rows"] <= whole.num_rows, told
    assert rows_of(folder).equals(whole), told
    reader = open_archive(folder)
    assert reader.front().num_rows > 0, told
    assert reader.damaged == (), told
    left = {item.name for item in folder.iterdir() if item.name.startswith(".")}
    assert left == {".front.crc", ".lock"}, told


def all_sound(place: Path, environment, rows_of, scenario: str, fault: str, steps: str) -> None:
    lines = broken(place, environment, scenario, fault, steps)
    assert lines
    whole = rows_of(place / "warm")
    for told in lines:
        if fault == "kill":
            assert told["code"] == -signal.SIGKILL, told
        elif fault == "power":
            assert told["code"] == faults.POWER_CUT, told
        else:
            assert told["code"] == 0, told
            assert "\n" not in told["said"], told
            if told["name"] == "lock":  # its library takes some errors for another's lock
                assert str(place) in told["said"], told
            elif told["said"] or told["name"] not in HARMLESS:
                assert ERRORS[fault] in told["said"], told
        sound(told, whole, rows_of)
        # Only the part that was damaged before: no step leaves a torn one behind.
        aside = list(Path(told["folder"]).glob("quarantine/*"))
        assert len(aside) == (scenario == "interrupted"), told


# A quarter of the kinds of step each; all steps are tried below.
@pytest.mark.parametrize(
    ("scenario", "fault", "steps"),
    [("begin", "kill", "0/4"), ("interrupted", "power", "2/4")],
)
def test_some_steps(place, python_path, rows_of, scenario, fault, steps) -> None:
    all_sound(place, python_path, rows_of, scenario, fault, steps)


@pytest.mark.slow
@pytest.mark.parametrize("fault", faults.FAULTS)
@pytest.mark.parametrize("scenario", list(faults.SCENARIOS))
def test_every_step(place, python_path, rows_of, scenario, fault) -> None:
    all_sound(place, python_path, rows_of, scenario, fault, "all")


@pytest.mark.slow
def test_two_hundred_random_kills(place, python_path, rows_of) -> None:
    """Half of them at a step counted from the start, half by the clock."""
    settings = Settings(**{**vars(faults.SETTINGS), "budget": 8_000})
    dice = random.Random(2)
    killed, rows, folder = 0, [0], place / "results" / "slopes"
    folder.parent.mkdir(parents=True)
    while killed < 200:
        assert rows[-1] < settings.budget, f"the budget was used after {killed} kills"
        if killed % 2:
            at = dice.randint(1, 120)
            code, _ = faults.forked(lambda at=at: _search(place, settings, "kill", at))
        else:
            process = os.fork()
            if not process:
                _search(place, settings, "none", 0)
                os._exit(0)
            time.sleep(dice.uniform(0.0, 0.5))
            os.kill(process, signal.SIGKILL)
            code = os.waitstatus_to_exitcode(os.waitpid(process, 0)[1])
        killed += code == -signal.SIGKILL
        rows.append(open_archive(folder).rows if folder.is_dir() else 0)
    print(f"\n{killed} kills, {rows[-1]} rows by then")
    assert rows == sorted(rows)  # no kill took a stored row away
    settings = Settings(**{**vars(settings), "budget": rows[-1] + 100})
    run(faults.Slopes(), folder, settings)
    run(faults.Slopes(), place / "whole", settings)
    assert rows_of(folder).equals(rows_of(place / "whole"))
    assert open_archive(folder).front().equals(open_archive(folder).front())
    assert not (folder / "quarantine").exists()


def _search(place: Path, settings: Settings, fault: str, at: int) -> dict[str, Any]:
    faults.many_steps()
    return faults.attempt(place, fault, at, settings)


def test_two_writers_at_once_end_with_one_archive(place, rows_of) -> None:
    folder = place / "results" / "slopes"
    folder.parent.mkdir(parents=True)
    done = {}
    for number in range(4):
        process = os.fork()
        if not process:
            told = _search(place, faults.SETTINGS, "none", 0)
            ending = 3 if "is being written by process" in told["said"] else 4
            os._exit(ending if told["said"] else 0)
        done[process] = number
    codes = [os.waitstatus_to_exitcode(os.waitpid(process, 0)[1]) for process in done]
    assert 0 in codes
    assert set(codes) <= {0, 3}  # finished, or was told who is at work
    run(faults.Slopes(), place / "whole", faults.SETTINGS)
    assert rows_of(folder).equals(rows_of(place / "whole"))


def as_nobody(work: Callable[[], Any]) -> str:
    """What an archive says to a user without any rights; root gives its own up for that."""

    def attempted() -> str:
        if os.geteuid() == 0:
            os.setgroups([])
            os.setgid(65534)
            os.setuid(65534)
        try:
            work()
        except OptimizerError as error:
            return str(error)
        return ""

    code, said = faults.forked(attempted)
    assert code == 0
    return str(said)


@pytest.fixture
def open_place() -> Iterator[Path]:
    """A folder that other users may enter, which those of pytest are not."""
    with tempfile.TemporaryDirectory() as folder:
        os.chmod(folder, 0o755)  # noqa: S103
        yield Path(folder)


def test_permission_that_is_lost(open_place, rows_of) -> None:
    folder, problem = open_place / "slopes", faults.Slopes()
    run(problem, folder, faults.SETTINGS)
    before = rows_of(folder)
    more = Settings(**{**vars(faults.SETTINGS), "budget": 50})
    if os.geteuid() != 0:
        folder.chmod(0o500)
        (folder / ".lock").chmod(0o400)
    try:
        said = as_nobody(lambda: run(problem, folder, more))
        assert said.startswith(f"cannot lock {folder / '.lock'}: permission is denied")
        assert "\n" not in said
        # Reading needs no right to write.
        assert as_nobody(lambda: open_archive(folder).table()) == ""
        assert as_nobody(lambda: open_archive(folder).front()) == ""
        if os.geteuid() == 0:
            beside = open_place / "beside"
            said = as_nobody(lambda: run(problem, beside, more))
            assert said.startswith(f"cannot make the folder {beside}: permission is denied")
        # A part that may not be read is not damaged: nothing is set aside or left out.
        part = part_paths(folder)[0]
        part.chmod(0)
        said = as_nobody(lambda: open_archive(folder).table())
        assert f"{part}: permission is denied" in said
    finally:
        folder.chmod(0o755)
        (folder / ".lock").chmod(0o644)
        part_paths(folder)[0].chmod(0o644)
    assert rows_of(folder).equals(before)


@pytest.mark.parametrize(
    ("how", "said"),
    [("limit", "larger than allowed; raise the limit (ulimit -f)"), ("mode", "permission is")],
)
def test_the_right_to_write_lost_while_a_run_goes_on(open_place, rows_of, how, said) -> None:
    folder, problem = open_place / "slopes", faults.Slopes()
    evaluate, calls = problem.evaluate, []

    def then_forbidden(x: np.ndarray) -> Any:
        calls.append(len(x))
        if len(calls) == 3:
            lose()
        return evaluate(x)

    def lose() -> None:
        if how == "limit":  # of the size of a file, as `ulimit -f` sets it
            resource.setrlimit(resource.RLIMIT_FSIZE, (4_000, 4_000))
        else:
            folder.chmod(0o500)
            if os.geteuid() == 0:
                os.setgroups([])
                os.setgid(65534)
                os.setuid(65534)

    problem.evaluate = then_forbidden  # type: ignore[method-assign]

    def work() -> str:
        faults.many_steps()
        with pytest.raises(ArchiveError) as caught:
            run(problem, folder, faults.SETTINGS)
        return str(caught.value)

    code, text = faults.forked(work)
    assert code == 0
    assert said in text
    assert "\n" not in text
    folder.chmod(0o700)
    assert open_archive(folder).rows == 8
    run(faults.Slopes(), folder, faults.SETTINGS)
    run(faults.Slopes(), open_place / "whole", faults.SETTINGS)
    assert rows_of(folder).equals(rows_of(open_place / "whole"))


def test_a_clock_that_jumps_changes_no_row_and_makes_no_duration_negative(
    place, rows_of, monkeypatch
) -> None:
    run(faults.Slopes(), place / "whole", faults.SETTINGS)
    year = 365 * 86_400 * 10**9
    jumps = iter([2, -1, 60, -90, 3, -56, 0, 200, 1] * 50)  # years; 1969 and 2260 among them
    monkeypatch.setattr(time, "time_ns", lambda: 1_800_000_000 * 10**9 + next(jumps) * year)
    for budget in (5, 13, 32):  # whatever was finished "later" must not count more
        run(
            faults.Slopes(),
            place / "slopes",
            Settings(**{**vars(faults.SETTINGS), "budget": budget}),
        )
    monkeypatch.undo()
    assert rows_of(place / "slopes").equals(rows_of(place / "whole"))
    table = open_archive(place / "slopes").table()
    assert min(table["time_s"].to_pylist()) >= 0.0
    years = {value.year for value in pc.cast(table["finished_at"], "timestamp[us]").to_pylist()}
    assert min(years) < 1970 < 2200 < max(years)  # as the clock said, and no less readable


def flipped(content: bytes, place: int, bit: int) -> bytes:
    return content[:place] + bytes([content[place] ^ 1 << bit]) + content[place + 1 :]


def no_wrong_row(folder: Path, whole, rows_of) -> None:
    """Whatever is still read is right; what is missing is named, or nothing is read at all."""
    try:
        reader = open_archive(folder)
        there = reader.table()
        front = reader.front()
    except ArchiveError:
        return
    assert bool(reader.damaged) == (there.num_rows < whole.num_rows)
    if there.num_rows:
        right = whole.filter(pc.is_in(whole["evaluation"], there["evaluation"]))
        assert there.drop_columns(["time_s", "finished_at"]).combine_chunks().equals(right)
        inside = whole.filter(pc.is_in(whole["evaluation"], front["evaluation"]))
        assert front.drop_columns(["time_s", "finished_at"]).combine_chunks().equals(inside)


def damaged_anywhere(place: Path, rows_of, each: int) -> None:
    folder = place / "slopes"
    run(faults.Slopes(), folder, Settings(**{**vars(faults.SETTINGS), "budget": 16}))
    run(faults.Slopes(), folder, faults.SETTINGS)
    whole = rows_of(folder)
    dice = random.Random(each)
    for file in sorted(item for item in folder.iterdir() if item.stat().st_size):
        good = file.read_bytes()
        # Everywhere, and in the footer and magic bytes of a Parquet file more closely.
        spots = {*range(dice.randrange(each), len(good), each)}
        spots |= {*range(max(0, len(good) - 12), len(good), 1 + each // 100)}
        for spot in sorted(spots):
            file.write_bytes(flipped(good, spot, dice.randrange(8)))
            no_wrong_row(folder, whole, rows_of)
            file.write_bytes(good[:spot])  # and cut short there
            no_wrong_row(folder, whole, rows_of)
        file.write_bytes(good)
    assert rows_of(folder).equals(whole)


def test_bits_flipped_and_files_cut_short(place, rows_of) -> None:
    damaged_anywhere(place, rows_of, 997)


@pytest.mark.slow
def test_bits_flipped_and_files_cut_short_nearly_everywhere(place, rows_of) -> None:
    damaged_anywhere(place, rows_of, 23)


@pytest.mark.parametrize("name", ["archive.json", "state.npz", "front.parquet", ".front.crc"])
def test_a_run_goes_on_beside_damaged_files_that_follow_from_the_parts(
    place, rows_of, name
) -> None:
    folder = place / "slopes"
    half = Settings(**{**vars(faults.SETTINGS), "budget": 16})
    run(faults.Slopes(), folder, half)
    run(faults.Slopes(), place / "whole", faults.SETTINGS)
    file = folder / name
    good = file.read_bytes()
    for bad in (b"", good[: len(good) // 2], bytes(len(good)), flipped(good, len(good) // 3, 0)):
        file.write_bytes(bad)
        run(faults.Slopes(), folder, faults.SETTINGS)
        assert rows_of(folder).equals(rows_of(place / "whole"))
