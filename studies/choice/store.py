"""Decisions beside a study: numbered, whole or not at all, never replaced."""

from __future__ import annotations

import json
import os
import re
from collections.abc import Mapping
from contextlib import suppress
from pathlib import Path
from typing import Any

from studies.stored.layout import storage

FOLDER = "decisions"
NAME = re.compile(r"decision-(\d+)\.(json|txt)")


def store_decision(folder: Path, content: Mapping[str, Any], text: str) -> tuple[Path, Path]:
    """Write the next decision of a study as JSON and as text.

    Parameters
    ----------
    folder : Path
        Results folder of the study.
    content : mapping
    text : str

    Raises
    ------
    StorageError
        If they cannot be written; older decisions are untouched whatever happens.
    """
    place = folder / FOLDER
    data = (json.dumps(content, indent=2, allow_nan=False, ensure_ascii=False) + "\n").encode()
    with storage(place, "write"):
        place.mkdir(exist_ok=True)
        number = 1 + max(_numbers(place), default=0)
        while True:
            written = place / f"decision-{number:04d}.json"
            # The JSON file claims the number; only then is the text written under it.
            if _write_new(written, data) and _write_new(written.with_suffix(".txt"), text.encode()):
                return written, written.with_suffix(".txt")
            number += 1


def _numbers(place: Path) -> list[int]:
    matches = [NAME.fullmatch(item.name) for item in place.iterdir()]
    return [int(match[1]) for match in matches if match]


def _write_new(file: Path, data: bytes) -> bool:
    """Write a file that is not there yet, complete from its first instant; False if it is."""
    draft = file.with_name(f".{file.name}.{os.getpid()}")
    try:
        with draft.open("wb") as stream:
            stream.write(data)
            stream.flush()
            os.fsync(stream.fileno())
        os.link(draft, file)  # unlike a rename, this fails if the name is taken
    except FileExistsError:
        return False
    finally:
        with suppress(OSError):
            draft.unlink()
    handle = os.open(file.parent, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
    return True
