"""Commands that read a study of a million evaluations; run with ``-m benchmark -s``."""

from __future__ import annotations

import json
import shutil
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest

from optimizer.archive.archive import Archive
from optimizer.archive.parts import part_paths
from optimizer.archive.schema import Rows
from optimizer.fronts import non_dominated
from optimizer.problem import Outcome
from studies.problem import MachineProblem, machine_problem
from studies.running.sweep import search_settings
from studies.shipped.library import find_study
from studies.stored.layout import Request, Results, create

pytestmark = pytest.mark.benchmark

ROWS = 1_000_000
BATCH = 10_000
# Of processor time of a command with the start of Python; wanted of the program. By the clock
# other work on the machine would count.
TIME_LIMIT_S = 10.0
MEMORY_LIMIT = 2e9  # bytes a command may take at its peak; wanted of the program
# Runs a command and says at the end, in a line of its own, what it took.
MEASURED = """
import json, resource, sys
from studies.cli import main
code = 0
try:
    main(sys.argv[1:])
except SystemExit as end:
    code = end.code or 0
use = resource.getrusage(resource.RUSAGE_SELF)
# Not ru_maxrss: that counts what this process was before it became Python, a copy of its parent.
peak = next(line for line in open("/proc/self/status") if line.startswith("VmHWM"))
cpu = use.ru_utime + use.ru_stime
print()
print(json.dumps({"code": code, "memory": 1024 * int(peak.split()[1]), "cpu": cpu}))
"""


def synthetic(problem: MachineProblem, first: int, rows: int) -> Rows:
    """Rows as a search leaves them: it nears a round front, a tenth fails, a third is feasible."""
    random = np.random.default_rng([*problem.task.winding.family.id.encode(), first])
    low = np.array([item.lower for item in problem.variables])
    high = np.array([item.upper for item in problem.variables])
    x = low + random.random((rows, len(low))) * (high - low)
    direction = np.abs(random.standard_normal((rows, len(problem.goals))))
    direction /= np.linalg.norm(direction, axis=1, keepdims=True)
    far = random.exponential(0.5, rows) / (1.0 + first / 20_000)
    objectives = direction * (1.0 + far)[:, None]
    failed = random.random(rows) < 0.1
    margins = random.standard_normal((rows, len(problem.limits))) - 2.0
    objectives[failed], margins[failed] = np.nan, np.nan
    metrics = {
        column.name: np.where(failed, np.nan, random.lognormal(size=rows))
        for column in problem.columns
    }
    outcome = Outcome(
        objectives,
        margins,
        np.where(failed, "invalid_geometry", "ok"),
        np.where(failed, "the tooth tips overlap", ""),
        metrics,
    )
    numbers = first + np.arange(rows)
    when = np.full(rows, 1_800_000_000_000_000 + first)
    return Rows(numbers, numbers // 105, x, outcome, random.random(rows), when)


@pytest.fixture(scope="module")
def study(tmp_path_factory: pytest.TempPathFactory) -> Results:
    """A finished study: six families, parts merged, fronts written."""
    root = tmp_path_factory.mktemp("million")
    shipped = find_study("compressor")
    each = -(-ROWS // len(shipped.families))
    request = Request("compressor (shipped)", shipped.families, each, 1)
    results = create(root, shipped, request)
    for family in shipped.families:
        problem = machine_problem(shipped, family)
        points, numbers = np.zeros((0, len(problem.goals))), np.zeros(0, dtype=np.int64)
        folder = results.search_folder(family)
        with Archive(folder, problem, search_settings(results, problem)) as archive:
            for first in range(0, each, BATCH):
                rows = synthetic(problem, first, min(BATCH, each - first))
                archive.add(rows)
                archive.flush()
                good = rows.outcome.feasible
                points = np.concatenate([points, rows.outcome.objectives[good]])
                numbers = np.concatenate([numbers, rows.evaluations[good]])
                kept = non_dominated(points)
                points, numbers = points[kept], numbers[kept]
            archive.finish(numbers)
        print(f"\n{family}: front of {len(numbers)}, {len(part_paths(folder))} parts")
    return results


@pytest.fixture(scope="module")
def killed(study: Results) -> Results:
    """The same without fronts: what a sweep leaves that was killed."""
    root = study.folder.parents[1] / "killed"
    shutil.copytree(study.folder.parent, root, copy_function=_link)
    folder = root / study.folder.name
    for family in study.study.families:
        for name in ("front.parquet", ".front.crc"):
            (folder / family / name).unlink()
    return Results(folder, study.study, study.request)


def _link(source: str, target: str) -> None:
    Path(target).hardlink_to(source)


def measured(*arguments: str | Path) -> tuple[str, float, dict[str, float]]:
    begin = time.perf_counter()
    done = subprocess.run(
        [sys.executable, "-c", MEASURED, *map(str, arguments)],
        capture_output=True, text=True, check=True,
    )  # fmt: skip
    taken = time.perf_counter() - begin
    text, _, last = done.stdout.rstrip().rpartition("\n")
    use = json.loads(last)
    assert use["code"] == 0, done.stderr
    print(
        f"\n{arguments[0]}: {taken:.2f} s by the clock, {use['cpu']:.2f} s of processor,"
        f" {use['memory'] / 1e6:.0f} MB at the peak"
    )
    return text, taken, use


@pytest.mark.parametrize("state", ["study", "killed"])
@pytest.mark.parametrize("command", ["status", "compare", "inspect"])
def test_a_million_rows(state: str, command: str, request: pytest.FixtureRequest) -> None:
    results: Results = request.getfixturevalue(state)
    last = results.study.families[-1]
    target = {"inspect": [results.folder, f"{last}-100000"]}.get(command, [results.folder])
    _, _, empty = measured("--version")
    text, _, use = measured(command, *target)
    size = sum(
        part.stat().st_size
        for family in results.study.families
        for part in part_paths(results.search_folder(family))
    )
    print(f"{state}: {size / ROWS:.0f} bytes a row; starting takes {empty['cpu']:.2f} s of it")
    assert use["cpu"] < TIME_LIMIT_S
    assert use["memory"] < MEMORY_LIMIT
    assert "166,667" in text or command == "inspect"
