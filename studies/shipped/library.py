"""The studies that are shipped with the package, found by name."""

from __future__ import annotations

from importlib import resources
from importlib.resources.abc import Traversable
from pathlib import Path

from studies.errors import StudiesError
from studies.study_file.definition import Study, load_study, study_from
from studies.suggestions import suggest


def shipped() -> dict[str, Traversable]:
    """Shipped study files by name, in alphabetical order."""
    found = {
        item.name.removesuffix(".toml"): item
        for item in resources.files("studies.shipped").iterdir()
        if item.name.endswith(".toml")
    }
    return dict(sorted(found.items()))


def find_study(name: str) -> Study:
    """Load a study file, or the shipped study of that name where no such file exists.

    Raises
    ------
    StudiesError
        If there is neither, or the file is wrong.
    """
    file = Path(name)
    known = shipped()
    bare = "/" not in name and "\\" not in name
    if bare and name in known and not file.is_file():
        return study_from(known[name].read_bytes(), f"{name} (shipped)")
    if bare and not name.endswith(".toml") and "\0" not in name and not file.exists():
        msg = f"{name}: there is neither a file nor a shipped study of this name; " + suggest(
            name, known
        )
        raise StudiesError(msg)
    return load_study(file)
