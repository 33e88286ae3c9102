"""Breaks a run at a chosen file operation, in processes of its own; used by tests and as a script.

Every operation that changes a file or folder below the archive is one step: making, opening to
write, the first and the second half of writing, syncing, renaming, removing, locking. At a step
the process is killed, the power is cut, or the operation fails with an error. The power cut
assumes the worst disk there may be: whatever was not synced is lost, folder entries included.

Script: ``faults.py FOLDER SCENARIO FAULT STEPS`` prints one JSON line for each step tried.
"""

from __future__ import annotations

import builtins
import errno
import fcntl
import json
import os
import shutil
import signal
import sys
import traceback
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa

from optimizer.archive import archive, durable, merging, parts
from optimizer.errors import OptimizerError
from optimizer.problem import Column, Outcome, Variable
from optimizer.running import runner
from optimizer.settings import Settings

POWER_CUT = 70  # exit status
WRITING = os.O_WRONLY | os.O_RDWR | os.O_CREAT | os.O_TRUNC
FAULTS = ("kill", "power", "ENOSPC", "EIO", "EACCES")
CHANGES = ("os.rename", "os.remove", "os.mkdir", "os.rmdir", "os.truncate", "os.link")


class Slopes:
    """Small and quick; a fifth of its designs fails."""

    variables = tuple(Variable(f"v{i}", -1.0, 1.0) for i in range(3))
    objectives = ("first", "second")
    constraints = ("above",)
    columns = (Column("rest"), Column("word", kind="string"))

    def evaluate(self, x: np.ndarray) -> Outcome:
        rest = (x[:, 1:] ** 2).sum(axis=1)
        values = np.column_stack([x[:, 0] ** 2 + rest, (x[:, 0] - 1.0) ** 2 + rest])
        status = np.where(np.modf(np.abs(x[:, 2]) * 1e5)[0] < 0.2, "failed", "ok")
        columns = {"rest": rest, "word": np.where(x[:, 1] > 0.0, "up", "down")}
        return Outcome(values, 0.2 - x[:, :1], status, status, columns)


SETTINGS = Settings(budget=32, seed=3, population=8, chunk=4, labels={"study": "slopes"})


def many_steps() -> None:
    """A part for each chunk, a snapshot for each generation, and few parts to merge."""
    archive.SHORTEST_INTERVAL_S = archive.LARGEST_SHARE = runner.SNAPSHOT_INTERVAL_S = 0.0
    merging.MERGE_FROM = 2
    merging.MERGE_MEANWHILE = 3


def search(folder: Path, settings: Settings = SETTINGS) -> None:
    """Run, or go on."""
    runner.run(Slopes(), folder, settings)


def begin(folder: Path) -> None:
    """Nothing is there before."""


def interrupted(folder: Path) -> None:
    """What a killed run leaves, with one part that was damaged since and one foreign file."""
    merging.MERGE_FROM = merging.MERGE_MEANWHILE = 10**9
    search(folder, Settings(**{**vars(SETTINGS), "budget": 12}))
    part = parts.part_paths(folder)[1]
    part.write_bytes(part.read_bytes()[:-100])
    (folder / ".front.parquet.1").write_bytes(b"torn")


SCENARIOS: dict[str, Callable[[Path], None]] = {"begin": begin, "interrupted": interrupted}


class Disk:
    """What of a folder would be found after the power was cut, on the worst disk."""

    def __init__(self, root: Path) -> None:
        self.root = root
        self._bytes: dict[int, bytes] = {}
        self._entries: dict[int, dict[str, tuple[int, bool]]] = {}
        for place in [root, *root.rglob("*")]:
            self.sync(place)

    def sync(self, place: Path) -> None:
        number = place.stat().st_ino
        if place.is_dir():
            self._entries[number] = {
                item.name: (item.stat().st_ino, item.is_dir()) for item in place.iterdir()
            }
        else:
            self._bytes[number] = place.read_bytes()

    def write(self, target: Path) -> None:
        shutil.rmtree(self.root)
        self._write(self.root_number, target)

    @property
    def root_number(self) -> int:
        return next(iter(self._entries))

    def _write(self, number: int, target: Path) -> None:
        target.mkdir()
        for name, (inner, folder) in self._entries.get(number, {}).items():
            if folder:
                self._write(inner, target / name)
            else:
                (target / name).write_bytes(self._bytes.get(inner, b""))


class Steps:
    """Counts file operations below a folder and brings about the fault at one of them."""

    def __init__(self, root: Path, fault: str, at: int) -> None:
        self.root, self.fault, self.at = os.path.realpath(root), fault, at
        self.count = 0
        self.names: list[str] = []
        self.acknowledged: list[int] = []
        self._armed = False
        self.disk = Disk(root) if fault == "power" else None

    def arm(self) -> None:
        sys.addaudithook(self._hook)
        self._sync, self._open, self._flock = os.fsync, builtins.open, fcntl.flock
        os.fsync = self._fsync  # type: ignore[assignment]
        fcntl.flock = self._lock  # type: ignore[assignment]
        durable.open = self._open_to_write  # type: ignore[attr-defined]
        write_part = archive.write_part

        def acknowledge(folder: Path, number: int, table: pa.Table) -> Path:
            path = write_part(folder, number, table)
            self.acknowledged += table["evaluation"].to_pylist()
            ledger(Path(self.root)).write_text(json.dumps(self.acknowledged))
            return path

        archive.write_part = acknowledge
        self._armed = True

    def disarm(self) -> None:
        self._armed = False

    def step(self, name: str) -> None:
        if not self._armed:
            return
        self.count += 1
        self.names.append(name)
        if self.count != self.at:
            return
        if self.fault == "kill":
            os.kill(os.getpid(), signal.SIGKILL)
        if self.disk is not None:
            self._armed = False
            self.disk.write(self.disk.root)
            os._exit(POWER_CUT)
        code = getattr(errno, self.fault)
        raise OSError(code, os.strerror(code))

    def _below(self, path: Any) -> bool:
        return isinstance(path, (str, bytes, os.PathLike)) and os.path.abspath(
            os.fsdecode(path)
        ).startswith(self.root + os.sep)

    def _hook(self, event: str, args: tuple[Any, ...]) -> None:
        if not self._armed:
            return
        if event == "open" and isinstance(args[2], int) and args[2] & WRITING:
            if self._below(args[0]):
                self.step(f"open {kind(args[0])}")
        elif event in CHANGES and self._below(args[0]):
            target = kind(args[1] if event == "os.rename" else args[0])
            self.step(f"{event.removeprefix('os.')} {target}")

    def _fsync(self, handle: int) -> None:
        place = Path(os.readlink(f"/proc/self/fd/{handle}"))
        self.step(f"sync {'folder' if place.is_dir() else kind(place)}")
        self._sync(handle)
        if self.disk is not None:
            self.disk.sync(place)

    def _lock(self, handle: Any, operation: int) -> None:
        number = handle if isinstance(handle, int) else handle.fileno()
        if operation & fcntl.LOCK_EX and os.readlink(f"/proc/self/fd/{number}").endswith(".lock"):
            self.step("lock")
        self._flock(handle, operation)

    def _open_to_write(self, path: Path, mode: str) -> Any:
        file = self._open(path, mode)
        write = file.write

        class Torn:
            def __enter__(inner) -> Any:  # noqa: N805
                file.__enter__()
                return inner

            def __exit__(inner, *error: object) -> None:  # noqa: N805
                file.__exit__(*error)

            def __getattr__(inner, name: str) -> Any:  # noqa: N805
                return getattr(file, name)

            def write(inner, data: bytes) -> None:  # noqa: N805
                self.step(f"write {kind(path)}")
                write(data[: len(data) // 2])
                file.flush()
                self.step(f"write the rest of {kind(path)}")
                write(data[len(data) // 2 :])

        return Torn()


def kind(path: Any) -> str:
    """Name of a file without numbers."""
    name = os.path.basename(os.fsdecode(path))
    return "part" if name.startswith((".part", "part")) else name.rstrip("0123456789").strip(".")


def forked(work: Callable[[], Any]) -> tuple[int, Any]:
    """Do something in a process of its own; its exit status, or minus the signal, and result."""
    reading, writing = os.pipe()
    process = os.fork()
    if not process:
        code = 1
        try:
            os.close(reading)
            result = work()
            os.write(writing, json.dumps(result).encode())
            code = 0
        except BaseException:
            traceback.print_exc()
        finally:
            os._exit(code)
    os.close(writing)
    with os.fdopen(reading, "rb") as pipe:
        text = pipe.read()
    _, status = os.waitpid(process, 0)
    return os.waitstatus_to_exitcode(status), json.loads(text) if text else None


def attempt(root: Path, fault: str, at: int, settings: Settings = SETTINGS) -> dict[str, Any]:
    """Search with a fault at one step; what became of it."""
    steps = Steps(root, fault, at)
    steps.arm()
    try:
        search(root / "results" / "slopes", settings)
        said = ""
    except OptimizerError as error:
        said = str(error)
    steps.disarm()
    return {"steps": steps.names, "said": said}


def chosen(names: list[str], wanted: str) -> list[int]:
    """Steps to try, from 1: ``all``, or some names' first: ``n/m`` is each m-th of them."""
    if wanted == "all":
        return list(range(1, len(names) + 1))
    first = [names.index(name) + 1 for name in dict.fromkeys(names)]
    start, _, each = wanted.partition("/")
    return first[int(start) :: int(each)]


def ledger(root: Path) -> Path:
    """Evaluations that a writer was told are safe; outside of what a fault touches."""
    return root.with_name(f"{root.name}.acknowledged")


def found_after(root: Path) -> dict[str, Any]:
    """What a reader finds before anything is mended, and what is missing of what was safe."""
    folder, there = root / "results" / "slopes", []
    if archive.is_archive(folder):
        table = archive.open_archive(folder).table(["evaluation"])
        there = table["evaluation"].to_pylist() if table.num_rows else []
    safe = json.loads(ledger(root).read_text()) if ledger(root).exists() else []
    return {"rows": len(there), "lost": sorted(set(safe) - set(there))}


def main(root: Path, scenario: str, fault: str, wanted: str) -> None:
    """Try the fault at each step wanted, and go on after it."""
    many_steps()
    search(root / "warm")  # imports what is imported late once, not in each process
    before = root / "before"
    (before / "results").mkdir(parents=True)
    code, _ = forked(lambda: SCENARIOS[scenario](before / "results" / "slopes"))
    assert code == 0
    trial = root / "trial"
    shutil.copytree(before, trial)
    _, counted = forked(lambda: attempt(trial, "none", 0))
    names = counted["steps"]
    for at in chosen(names, wanted):
        place = root / f"step-{at}"
        shutil.copytree(before, place)
        code, told = forked(lambda place=place, at=at: attempt(place, fault, at))
        _, found = forked(lambda place=place: found_after(place))
        again, _ = forked(lambda place=place: search(place / "results" / "slopes"))
        line = {
            "name": names[at - 1],
            "code": code,
            "said": (told or {}).get("said", ""),
            **found,
            "again": again,
            "folder": str(place / "results" / "slopes"),
        }
        print(json.dumps(line), flush=True)


if __name__ == "__main__":
    main(Path(sys.argv[1]), sys.argv[2], sys.argv[3], sys.argv[4])
