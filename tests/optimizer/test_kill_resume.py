"""A run killed at any moment goes on to the archive of a run never killed."""

from __future__ import annotations

import random
import subprocess
import sys
import textwrap
import time
from pathlib import Path

import pytest

from optimizer.archive.archive import open_archive

BUDGET = 1_730
SCRIPT = """
    import sys, time
    import numpy as np
    from optimizer.archive import archive
    from optimizer.running import runner
    from optimizer.workers.dispatch import Serial
    from optimizer.workers.pool import Pool
    from optimizer.problem import Column, Outcome, Variable
    from optimizer.settings import Settings

    # Many parts and snapshots, so that kills fall into the midst of writing them.
    archive.SHORTEST_INTERVAL_S = 0.01
    archive.LARGEST_SHARE = 0.0
    runner.SNAPSHOT_INTERVAL_S = 0.03

    class Box:
        variables = tuple(Variable(f"v{i}", -1.0, 1.0) for i in range(5))
        objectives = ("first", "second")
        constraints = ("above",)
        columns = (Column("norm"),)

        def evaluate(self, x):
            time.sleep(0.01)
            rest = (x[:, 1:] ** 2).sum(axis=1)
            values = np.column_stack([x[:, 0] ** 2 + rest, (x[:, 0] - 1.0) ** 2 + rest])
            status = np.where(np.modf(np.abs(x[:, 2]) * 1e5)[0] < 0.2, "failed", "ok")
            return Outcome(values, 0.2 - x[:, :1], status, status, {"norm": rest})

    if __name__ == "__main__":
        folder, workers = sys.argv[1], int(sys.argv[2])
        with (Pool(workers) if workers else Serial()) as dispatcher:
            runner.run(Box(), folder, Settings(budget=%d, seed=3), dispatcher)
"""


def start(tmp_path: Path, folder: Path, workers: int, environment) -> subprocess.Popen[bytes]:
    script = tmp_path / "box.py"
    script.write_text(textwrap.dedent(SCRIPT % BUDGET))
    command = [sys.executable, str(script), str(folder), str(workers)]
    return subprocess.Popen(command, env=environment)


@pytest.mark.parametrize(
    ("workers", "kills"), [(0, 4), *(pytest.param(n, 10, marks=pytest.mark.slow) for n in (0, 2))]
)
def test_kills_leave_no_trace(tmp_path, python_path, rows_of, workers, kills) -> None:
    with start(tmp_path, tmp_path / "whole", 0, python_path) as whole:
        assert whole.wait(timeout=120) == 0
    folder = tmp_path / "killed"
    # Wherever the clock of this machine puts them, the moments are another set every time.
    moments = random.Random(workers)
    seen = []
    for _ in range(kills):
        with start(tmp_path, folder, workers, python_path) as run:
            begun = time.monotonic()
            # Once it has begun to work: importing takes longer than the kills are apart.
            count = len(list(folder.glob("part-*"))) if folder.exists() else 0
            while run.poll() is None and time.monotonic() - begun < 60.0:
                if len(list(folder.glob("part-*"))) > count:
                    break
                time.sleep(0.002)
            time.sleep(moments.uniform(0.0, 0.06))
            run.kill()
        if folder.exists():
            seen.append(open_archive(folder).rows)
    with start(tmp_path, folder, workers, python_path) as last:
        assert last.wait(timeout=120) == 0
    assert seen == sorted(seen)  # no kill took a stored row away
    assert 0 < seen[0] < seen[-1] < BUDGET  # they fell into the run, not before or after it
    assert rows_of(folder).equals(rows_of(tmp_path / "whole"))
    assert open_archive(folder).damaged == ()
    assert not (folder / "quarantine").exists()
    names = [path.name for path in folder.iterdir()]
    assert not [name for name in names if name.startswith((".part", ".state"))]
