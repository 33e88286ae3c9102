"""The documents name files that are there."""

from __future__ import annotations

import re
from fnmatch import fnmatch
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
ROOMS = ("optimizer", "evaluators", "studies", "tests")
DOCUMENTS = ("README.md", "DEVELOPERS.md", "evaluators/NEGLECTED.md", "results/README.md")
NAMED = re.compile(r"`((?:[\w*.-]+/)*[\w*.-]+\.(?:py|md))`|\]\((?!https?:)([^)#]+)\)")


def files() -> list[str]:
    """Every file of the project, as ``/`` and its path."""
    found = [*ROOT.glob("*.*"), *(ROOT / "results").glob("*.md")]
    found += [path for room in ROOMS for path in (ROOT / room).rglob("*.*")]
    return ["/" + path.relative_to(ROOT).as_posix() for path in found]


@pytest.mark.parametrize("document", DOCUMENTS)
def test_files_that_are_named_exist(document: str) -> None:
    known = files()
    names = {a or b for a, b in NAMED.findall((ROOT / document).read_text())}
    # A room is often left out where the text is about it.
    missing = [
        name for name in names if not any(fnmatch(path, f"*/{name.lstrip('./')}") for path in known)
    ]
    assert missing == []
