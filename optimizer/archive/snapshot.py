"""State of a search on disk: a shortcut for resuming, never the only copy.

The archive holds every outcome, and telling them to a new search gives the same state again.
The snapshot saves that time. It holds plain arrays and JSON, so reading it runs nothing.
"""

from __future__ import annotations

import hashlib
import io
import json
import zipfile
import zlib
from pathlib import Path
from typing import Any

import numpy as np

from optimizer.archive.durable import write_durably
from optimizer.problem import AnyArray, FloatArray, Outcome
from optimizer.search import SearchState

STATE_NAME = "state.npz"
_VALUES = "values"
_LARGEST_FILE = 2_000_000_000  # bytes


def write_snapshot(folder: Path, state: SearchState, told: dict[str, Any]) -> None:
    """Write a state, and what it was told, with the names that :func:`read_snapshot` returns.

    Raises
    ------
    ArchiveError
        If it cannot be written; an older snapshot stays.
    """
    text = json.dumps({"search": state.values, "told": told})
    file = io.BytesIO()
    values = np.frombuffer(text.encode(), dtype=np.uint8)
    np.savez(file, allow_pickle=False, **{_VALUES: values}, **state.arrays)
    write_durably(folder / STATE_NAME, file.getvalue())


def read_snapshot(folder: Path) -> tuple[SearchState, dict[str, Any]] | None:
    """Return what was written, or None if it is missing or damaged."""
    path = folder / STATE_NAME
    try:
        if path.stat().st_size > _LARGEST_FILE:
            return None
        with np.load(path, allow_pickle=False) as file:
            arrays: dict[str, AnyArray] = {name: file[name] for name in file.files}
        content = json.loads(arrays.pop(_VALUES).tobytes())
        return SearchState(arrays, content["search"]), content["told"]
    except (OSError, ValueError, KeyError, EOFError, TypeError, NotImplementedError):
        return None
    except (zipfile.BadZipFile, zlib.error, RecursionError, MemoryError):
        return None


def digest(before: str, x: FloatArray, outcome: Outcome) -> str:
    """Chain the rows of a generation to the digest of all before it."""
    chain = hashlib.blake2b(before.encode(), digest_size=16)
    ok = outcome.ok
    for array in (x, outcome.objectives[ok], outcome.constraints[ok], ok):
        chain.update(np.ascontiguousarray(array).tobytes())
    return chain.hexdigest()
