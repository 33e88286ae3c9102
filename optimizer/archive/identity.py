"""What an archive belongs to: written once beside its parts, and again into each of them."""

from __future__ import annotations

import json
from collections import Counter
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import pyarrow as pa

from optimizer.archive.parts import (
    DamagedPartError,
    ForeignPartError,
    part_paths,
    part_schema,
)
from optimizer.errors import ArchiveError, storage_error
from optimizer.problem import Problem
from optimizer.settings import Settings

SCHEMA_VERSION = 1
# Of the search: raised when the same seed no longer gives the same designs.
SEARCH_VERSION = "decomposition 2"
VERSION_KEY = b"optimizer.schema_version"
IDENTITY_KEY = b"optimizer.identity"
IDENTITY_NAME = "archive.json"
_LARGEST_IDENTITY = 10_000_000  # bytes
_DIGEST = "_digest"  # ending of labels that no reader can make sense of
_MOST_SAID = 4  # columns

Identity = dict[str, Any]


def identity_of(problem: Problem, settings: Settings) -> Identity:
    """Return what must agree when an archive is continued, as JSON values."""
    identity = {
        "schema_version": SCHEMA_VERSION,
        "search": SEARCH_VERSION,
        "seed": settings.seed,
        "population": settings.population,
        "chunk": settings.chunk,
        "evaluator": settings.evaluator,
        "evaluator_version": settings.evaluator_version,
        "labels": dict(settings.labels),
        "variables": [
            [v.name, float(v.lower), float(v.upper), *(["integer"] if v.integer else [])]
            for v in problem.variables
        ],
        "objectives": list(problem.objectives),
        "constraints": list(problem.constraints),
        "columns": [[c.name, c.kind] for c in problem.columns],
    }
    copy: Identity = json.loads(json.dumps(identity))
    return copy


def read_identity(folder: Path) -> Identity | None:
    """Return what the parts of a folder belong to; None for a new folder.

    It is what ``archive.json`` says; where that is missing, damaged or another archive's, what
    most parts say.

    Raises
    ------
    ArchiveError
        If a newer version wrote it, or it cannot be read.
    """
    identity = written_identity(folder)
    if identity is not None:
        check_version(identity, folder)
        if _agreeing(folder, identity):
            return identity
    said = [item for item in map(_sound_identity, part_paths(folder)) if item is not None]
    if not said:
        return identity
    texts = Counter(json.dumps(item, sort_keys=True) for item in said)
    most: Identity = json.loads(texts.most_common(1)[0][0])
    check_version(most, folder)
    return most


def check_version(identity: Mapping[str, Any], place: Path) -> None:
    """Refuse what a newer version of the program wrote.

    Raises
    ------
    ArchiveError
    """
    version = identity["schema_version"]
    if version > SCHEMA_VERSION:
        msg = (
            f"{place} has schema version {version}; this version reads up to {SCHEMA_VERSION}:"
            " update the program"
        )
        raise ArchiveError(msg)


def check_owner(path: Path, schema: pa.Schema, identity: Mapping[str, Any]) -> None:
    """Check that a part belongs to the archive it lies in.

    Raises
    ------
    ForeignPartError
        If it belongs to another; the text says what differs.
    ArchiveError
        If a newer version wrote it.
    """
    found = identity_in(schema)
    if found is None:
        msg = "it does not say which study it belongs to"
        raise ForeignPartError(msg)
    check_version(found, path)
    if found != identity:
        raise ForeignPartError("; ".join(differences(found, identity)))


def identity_in(schema: pa.Schema) -> Identity | None:
    """Return what a part says it belongs to; None if it does not."""
    return _identity((schema.metadata or {}).get(IDENTITY_KEY, b""))


def differences(there: Mapping[str, Any], here: Mapping[str, Any]) -> list[str]:
    """Say in words what differs between two identities, what the user knows first."""
    said = [
        f"{_name(key)} {a!r} there and {b!r} here"
        for key, a, b in _changed(_labels(there), _labels(here))
        if not key.endswith(_DIGEST)
    ]
    for key, word in _WORDS.items():
        a, b = there.get(key), here.get(key)
        if a != b:
            said.append(f"{word} {a!r} there and {b!r} here")
    said += _bounds(there, here)
    for key, word in _LISTS.items():
        said += _one_sided(word, _names(there.get(key)), _names(here.get(key)))
    for key, _, _ in [] if said else _changed(_labels(there), _labels(here)):
        said.append(f"settings of the {key.removesuffix(_DIGEST)} that have no name here")
    return said or ["settings that have no name here"]


_WORDS = {
    "evaluator": "evaluator",
    "evaluator_version": "version of the evaluator",
    "seed": "seed",
    "population": "population",
    "chunk": "designs per call",
    "search": "search",
    "schema_version": "schema version",
}
_LISTS = {"objectives": "objective", "constraints": "limit", "columns": "column"}


def _name(label: str) -> str:
    return label.replace("_", " ")


def _labels(identity: Mapping[str, Any]) -> Mapping[str, Any]:
    labels = identity.get("labels")
    return labels if isinstance(labels, dict) else {}


def _changed(there: Mapping[str, Any], here: Mapping[str, Any]) -> list[tuple[str, Any, Any]]:
    keys = dict.fromkeys([*here, *there])
    return [(key, there.get(key), here.get(key)) for key in keys if there.get(key) != here.get(key)]


def _bounds(there: Mapping[str, Any], here: Mapping[str, Any]) -> list[str]:
    tables = [
        {str(item[0]): item[1:] for item in identity.get("variables", []) if _is_row(item)}
        for identity in (there, here)
    ]
    said = _one_sided("variable", list(tables[0]), list(tables[1]))
    for name, a, b in _changed(*tables):
        if a is not None and b is not None:
            said.append(f"{name} {_range(a)} there and {_range(b)} here")
    return said


def _is_row(item: object) -> bool:
    return isinstance(item, list) and bool(item)


def _range(values: Sequence[Any]) -> str:
    if len(values) < 2:
        return "without bounds"
    low, high, *kind = values
    text = f"fixed at {low:.10g}" if low == high else f"from {low:.10g} to {high:.10g}"
    return " ".join([text, *map(str, kind)])


def _names(items: object) -> list[str]:
    values = items if isinstance(items, list) else []
    return [str(item[0]) if _is_row(item) else str(item) for item in values]


def _one_sided(word: str, there: list[str], here: list[str]) -> list[str]:
    said = []
    for names, others, place in ((there, here, "there"), (here, there, "here")):
        odd = [name for name in names if name not in others]
        if odd:
            more = f" and {len(odd) - _MOST_SAID} more" if len(odd) > _MOST_SAID else ""
            said.append(f"{word} {', '.join(odd[:_MOST_SAID])}{more} only {place}")
    if not said and there != here:
        said.append(f"the {word}s in another order")
    return said


def _agreeing(folder: Path, identity: Identity) -> bool:
    """Whether the first sound part says the same; True if there is none."""
    for path in part_paths(folder):
        found = _sound_identity(path)
        if found is not None:
            return found == identity
    return True


def _sound_identity(path: Path) -> Identity | None:
    try:
        return identity_in(part_schema(path))
    except (DamagedPartError, FileNotFoundError):
        return None


def written_identity(folder: Path) -> Identity | None:
    """Return what ``archive.json`` says; None if it is missing or damaged.

    Raises
    ------
    ArchiveError
        If it cannot be read.
    """
    path = folder / IDENTITY_NAME
    if not path.is_file():
        return None
    try:
        with open(path, "rb") as file:
            return _identity(file.read(_LARGEST_IDENTITY))
    except OSError as error:
        raise storage_error(error, path, "read") from error


def _identity(text: bytes) -> Identity | None:
    try:
        value = json.loads(text)
    except (ValueError, RecursionError):
        return None
    if not isinstance(value, dict) or not isinstance(value.get("schema_version"), int):
        return None
    names = value.get("objectives")
    return value if isinstance(names, list) and all(isinstance(n, str) for n in names) else None
