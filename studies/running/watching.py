"""A sweep seen from another process: reads parts as they appear, takes no lock, writes nothing."""

from __future__ import annotations

import re
import socket
import time
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from optimizer.archive.lock import WRITER_NAME
from optimizer.archive.parts import DamagedPartError, part_paths, read_part
from optimizer.fronts import Front
from studies.running.ended import ended_families
from studies.running.progress import duration
from studies.stored.families import matrix
from studies.stored.layout import Results
from studies.stored.naming import search_names
from studies.stored.processes import alive
from studies.tables import number, percent, text_table

WINDOW_S = 30.0  # over which the rate is taken
WRITER = re.compile(r"process (\d{1,10}) on (.{1,120})")


@dataclass
class SearchWatch:
    """What is known of one search of a family, brought up to date by `refresh`.

    Parts never change once they are there, so each is read once; at the end of a run the searching
    process merges them, and rows that come again under another name are known by their number.
    """

    name: str
    folder: Path
    objectives: tuple[str, ...]
    read: set[str] = field(default_factory=set)
    known: NDArray[np.bool_] = field(default_factory=lambda: np.zeros(0, dtype=np.bool_))
    feasible: int = 0
    failed: int = 0
    finished: NDArray[np.float64] = field(default_factory=lambda: np.zeros(0))
    front: Front = field(init=False)

    def __post_init__(self) -> None:
        self.front = Front(len(self.objectives))

    @property
    def evaluations(self) -> int:
        """Rows read so far."""
        return int(np.count_nonzero(self.known))

    def refresh(self) -> None:
        """Read the parts that have appeared since."""
        names = [f"objective:{name}" for name in self.objectives]
        wanted = ["evaluation", "feasible", "status", "finished_at", *names]
        for path in part_paths(self.folder) if self.folder.is_dir() else []:
            if path.name in self.read:
                continue
            try:
                table = read_part(path, wanted)
            except (DamagedPartError, FileNotFoundError):
                continue  # merged away meanwhile, or damaged: `hovergap status` names it
            self.read.add(path.name)
            self._add(table, names)

    def _add(self, table: pa.Table, names: list[str]) -> None:
        numbers = table["evaluation"].to_numpy().astype(np.int64)
        if not len(numbers):
            return
        if numbers.max() >= len(self.known):
            grown = np.zeros(int(numbers.max()) + 1, dtype=np.bool_)
            grown[: len(self.known)] = self.known
            self.known = grown
        new = ~self.known[numbers]
        self.known[numbers] = True
        feasible = table["feasible"].to_numpy() & new
        failed = np.asarray(table["status"].to_pylist()) != "ok"
        self.feasible += int(np.count_nonzero(feasible))
        self.failed += int(np.count_nonzero(failed & new))
        seconds = table["finished_at"].to_numpy().astype("datetime64[us]").astype(np.int64) * 1e-6
        self.finished = np.concatenate([self.finished, seconds[new]])
        self.front.add(matrix(table, names)[feasible], numbers[feasible])

    def rate(self, now: float) -> float:
        """Evaluations a second over the last `WINDOW_S`; NaN if there were none."""
        recent = self.finished[self.finished > now - WINDOW_S]
        if len(recent) < 2:
            return float("nan")
        begin = float(recent.min())
        return float(np.count_nonzero(recent > begin) / max(now - begin, 1e-3))


@dataclass
class StudyWatch:
    """All searches of one study that a sweep was asked for."""

    results: Results
    searches: tuple[SearchWatch, ...] = ()

    @classmethod
    def of(cls, results: Results) -> StudyWatch:
        """Watch the searches of the last request."""
        watch = cls(results)
        watch.follow(results)
        return watch

    def follow(self, results: Results) -> None:
        """Watch the searches of a newer request, keeping what is known of those there are."""
        goals = tuple(goal.name for goal in results.study.objectives)
        request = results.request
        wanted = tuple(item for item in results.study.families if item in request.families)
        known = {item.name: item for item in self.searches}
        self.results = results
        self.searches = tuple(
            known.get(name) or SearchWatch(name, results.search_folder(name), goals)
            for name in search_names(wanted, request.searches_per_family)
        )

    @property
    def budget(self) -> int:
        """Evaluations wanted of each search."""
        return self.results.request.evaluations_per_family

    @property
    def complete(self) -> bool:
        """Whether every search has its evaluations or was ended before."""
        notes = ended_families(self.results)
        ended = {
            item.name
            for item in self.searches
            if item.name in notes
            and notes[item.name].final
            and notes[item.name].evaluations == item.evaluations
        }
        return all(item.evaluations >= self.budget or item.name in ended for item in self.searches)

    def refresh(self) -> None:
        """Read what is new."""
        for item in self.searches:
            item.refresh()

    def lines(self, width: int) -> list[str]:
        """The state as a table, each line at most `width` characters."""
        now = time.time()
        goals = self.results.study.objectives
        rows = []
        for item in self.searches:
            rate = item.rate(now)
            left = (self.budget - item.evaluations) / rate if rate > 0.0 else float("nan")
            points = item.front.points
            best = [
                number(goal.sign * float(points[:, column].min())) if len(points) else "-"
                for column, goal in enumerate(goals)
            ]
            done = item.evaluations >= self.budget
            rows.append(
                [
                    item.name,
                    f"{item.evaluations:,}/{self.budget:,}",
                    percent(item.feasible / item.evaluations) if item.evaluations else "-",
                    f"{item.failed:,}",
                    "" if done else _per_second(rate),
                    "complete" if done else duration(left),
                    str(len(item.front)),
                    *best,
                ]
            )
        best_of = [f"best {goal.name}" for goal in goals]
        first = "family" if self.results.request.searches_per_family == 1 else "search"
        head = [first, "evaluations", "feasible", "failed", "rate", "left", "front", *best_of]
        return [line[:width] for line in text_table(head, rows).split("\n")]


def _per_second(rate: float) -> str:
    if np.isnan(rate):
        return "-"
    return f"{rate:.0f}/s" if rate >= 10.0 else f"{rate:.2g}/s"


def writer_of(folder: Path) -> str:
    """Who writes in a folder, or an empty text if nobody does.

    Read from the note the writer leaves, not by trying its lock, which could keep a sweep from
    starting. A note left by a killed process of this machine is recognised by its number.
    """
    try:
        text = (folder / WRITER_NAME).read_text(encoding="utf-8")[:200]
    except (OSError, UnicodeDecodeError):
        return ""
    match = WRITER.fullmatch(text.strip())
    if match is None:
        return ""
    process, host = int(match[1]), match[2]
    if host == socket.gethostname() and not alive(process):
        return ""
    return f"process {process}" if host == socket.gethostname() else f"process {process} on {host}"
