"""Made ``layout_1`` beside this file: results as the first version of their layout has them.

Run once for each new layout or schema version, by the code that writes it, and never again: what
it wrote must stay readable. The toy evaluator of these tests has to be installed, as the fixture
``site`` of ``conftest.py`` does. ``python tests/studies/golden/make.py STUDY.toml FOLDER``
"""

from __future__ import annotations

import sys
from pathlib import Path

from studies.cli import main as hovergap
from studies.stored.layout import Request, create
from studies.study_file.definition import study_from


def command(*arguments: str) -> None:
    hovergap([*arguments], standalone_mode=False)


def main(file: Path, root: Path) -> None:
    study = study_from(file.read_bytes(), str(file))
    # The study file has gone since, which is no reason to stop.
    request = Request("/nowhere/small.toml", study.families, 30, study.search.seed)
    folder = str(create(root, study, request).folder)
    command("resume", folder, "--workers", "1")
    command("verify", folder, "--evaluator", "toy_finer", "--family", "Q6p2s1", "--top", "2")
    command("choose", folder, "--because", "the cheapest will do")
    for lock in root.rglob(".lock"):
        lock.unlink()


if __name__ == "__main__":
    main(Path(sys.argv[1]), Path(sys.argv[2]))
