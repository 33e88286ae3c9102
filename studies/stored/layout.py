"""The results folder of one study: the frozen study file, what was asked for, the families.

``RESULTS/STUDY/study.toml`` is the study file byte for byte, ``study.json`` says where it came
from and what was asked for on the command line, and each search of a family has a folder of its
own.
"""

from __future__ import annotations

import errno
import json
import os
import shutil
import tomllib
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from dataclasses import asdict, dataclass, replace
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path
from typing import Any

from optimizer.archive.durable import sync_folder
from studies.errors import Path as KeyPath
from studies.errors import ResultsError, StorageError, StudiesError, dotted, quoted
from studies.stored.processes import alive
from studies.study_file.definition import Study, study_from

STUDY_FILE = "study.toml"
REQUEST_FILE = "study.json"
LAYOUT = 1


@dataclass(frozen=True)
class Request:
    """What a sweep was asked for.

    Attributes
    ----------
    origin : str
        Absolute path of the study file, or ``name (shipped)``.
    families : tuple of str
        Families to search.
    evaluations_per_family : int
    seed : int
    hovergap : str
        Version that wrote it.
    searches_per_family : int
        Independent searches of each family.
    """

    origin: str
    families: tuple[str, ...]
    evaluations_per_family: int
    seed: int
    hovergap: str = ""
    searches_per_family: int = 1

    def table(self) -> dict[str, Any]:
        """Content of ``study.json``."""
        return {"layout": LAYOUT, **asdict(self), "families": list(self.families)}


@dataclass(frozen=True)
class Results:
    """An opened results folder of one study."""

    folder: Path
    study: Study
    request: Request

    def search_folder(self, search: str) -> Path:
        """Where the evaluations of one search of a family lie; see `studies.stored.naming`."""
        return self.folder / search


def program_version() -> str:
    """Version of the installed program, or ``unknown`` where it is run uninstalled."""
    try:
        return version("hovergap")
    except PackageNotFoundError:
        return "unknown"


def create(root: Path, study: Study, request: Request) -> Results:
    """Make the results folder of a study that has none; whole or not at all.

    Raises
    ------
    ResultsError
        If the folder exists.
    StorageError
        If it cannot be written.
    """
    folder = root / study.name
    if folder.exists() or folder.is_symlink():
        raise ResultsError(_occupied(folder, study))
    request = replace(request, hovergap=program_version())
    draft = root / f".{study.name}.{os.getpid()}"
    with storage(folder, "create"):
        _make_folder(root)
        _remove_drafts(root, study.name)
        try:
            draft.mkdir()
            _write(draft / STUDY_FILE, study.content)
            _write(draft / REQUEST_FILE, _json(request))
            sync_folder(draft)
            # Fails if another process has made the folder meanwhile and put something in it.
            draft.rename(folder)
            sync_folder(root)
        except OSError as error:
            shutil.rmtree(draft, ignore_errors=True)
            if error.errno in (errno.EEXIST, errno.ENOTEMPTY):
                raise ResultsError(_occupied(folder, study)) from None
            raise
    return Results(folder, study, request)


def open_results(folder: Path) -> Results:
    """Open a results folder.

    Raises
    ------
    ResultsError
        If it is no results folder of a study, or its frozen study is damaged.
    """
    file = folder / STUDY_FILE
    with storage(folder, "read"):
        if not folder.is_dir():
            near = folder.parent
            there = [item.name for item in studies_in(near)] if near.is_dir() else []
            listing = f"; in {near} there are {', '.join(there)}" if there else ""
            msg = f"{folder}: there is no such results folder{listing}"
            raise ResultsError(msg)
        if not file.is_file():
            inner = [str(item) for item in studies_in(folder)]
            listing = f"; give one of {', '.join(inner)}" if inner else ""
            msg = f"{folder}: holds no {STUDY_FILE}, so it is no results folder of a study{listing}"
            raise ResultsError(msg)
        content = file.read_bytes()
    study = study_from(content, str(file), stored=True)
    return Results(folder, study, _request(folder, study))


def studies_in(root: Path) -> list[Path]:
    """Results folders of studies directly below `root`, in alphabetical order."""
    return sorted(
        item for item in root.iterdir() if item.name[:1] != "." and (item / STUDY_FILE).is_file()
    )


def save_request(results: Results, request: Request) -> Results:
    """Replace what was asked for, such as a larger budget."""
    if request == results.request:
        return results
    with storage(results.folder, "write"):
        draft = results.folder / f".{REQUEST_FILE}.{os.getpid()}"
        try:
            _write(draft, _json(request))
            draft.replace(results.folder / REQUEST_FILE)
            sync_folder(results.folder)
        except OSError:
            with suppress(OSError):
                draft.unlink()
            raise
    return replace(results, request=request)


def changes(old: bytes, new: bytes) -> list[str]:
    """What differs between two study files, one line a key; empty if only comments differ."""
    tables = []
    for content in (old, new):
        try:
            tables.append(tomllib.loads(content.decode("utf-8-sig")))
        except (tomllib.TOMLDecodeError, UnicodeDecodeError, RecursionError, ValueError):
            return ["the file can no longer be read as TOML"]
    return changed_keys(*tables)


def changed_keys(old: dict[str, Any], new: dict[str, Any]) -> list[str]:
    """What differs between two tables of study files, one line a key."""
    before, after = dict(_leaves((), old)), dict(_leaves((), new))
    lines = []
    for path in [*before, *(item for item in after if item not in before)]:
        if path not in after:
            lines.append(f"{dotted(path)}: {quoted(before[path])} was taken out")
        elif path not in before:
            lines.append(f"{dotted(path)}: {quoted(after[path])} was added")
        elif before[path] != after[path]:
            lines.append(f"{dotted(path)}: {quoted(before[path])} became {quoted(after[path])}")
    return lines


@contextmanager
def storage(place: Path, action: str) -> Iterator[None]:
    """Turn an error of the operating system into one sentence.

    Raises
    ------
    StorageError
        Naming place and cause.
    """
    try:
        yield
    except OSError as error:
        if isinstance(error, StudiesError):
            raise
        causes = {
            errno.ENOSPC: "the disk is full; make room and run the command again",
            errno.EDQUOT: "the disk quota is used up; make room and run the command again",
            errno.EACCES: "permission is denied; check the owner and mode of the folder",
            errno.EPERM: "permission is denied; check the owner and mode of the folder",
            errno.EROFS: "the file system is read-only; choose another with --results",
            errno.ENOTDIR: "a part of the path is a file, not a folder",
            errno.EEXIST: "a file of this name is in the way",
        }
        if error.errno == errno.ENOENT and not place.parent.is_dir():
            causes[errno.ENOENT] = f"there is no folder {place.parent}; make it first"
        cause = causes.get(error.errno or 0, (error.strerror or str(error)).lower())
        msg = f"{place}: cannot {action}: {cause}"
        raise StorageError(msg) from None


def _leaves(path: KeyPath, value: object) -> Iterator[tuple[KeyPath, object]]:
    if isinstance(value, dict) and value:
        for key, item in value.items():
            yield from _leaves((*path, key), item)
    elif isinstance(value, list) and any(isinstance(item, dict) for item in value):
        for index, item in enumerate(value):
            yield from _leaves((*path, index), item)
    else:
        yield path, value


def _occupied(folder: Path, study: Study) -> str:
    file = folder / STUDY_FILE
    if not file.is_file():
        return f"{folder}: is there already and is no results folder; choose another with --results"
    differing = changes(file.read_bytes(), study.content)
    if not differing:
        return f"{folder}: has results already; go on with: hovergap resume {folder}"
    listing = "\n".join(f"  {line}" for line in differing)
    return (
        f"{folder}: holds results of another study of the same name; rename one of them, or go on "
        f"with the stored one: hovergap resume {folder}\nit differs in\n{listing}"
    )


def _request(folder: Path, study: Study) -> Request:
    file = folder / REQUEST_FILE
    with storage(file, "read"):
        content = file.read_bytes() if file.is_file() else b"{}"
    try:
        table = json.loads(content)
        if not table:  # written by hand, or lost: the study itself says what is wanted
            search = study.search
            return Request(
                "",
                study.families,
                search.evaluations_per_family,
                search.seed,
                searches_per_family=search.searches_per_family,
            )
        if table["layout"] != LAYOUT:
            msg = f"{file}: layout {quoted(table['layout'])} is of another version of hovergap"
            raise ResultsError(msg)
        return Request(
            origin=str(table["origin"]),
            families=tuple(str(item) for item in table["families"]),
            evaluations_per_family=int(table["evaluations_per_family"]),
            seed=int(table["seed"]),
            hovergap=str(table["hovergap"]),
            searches_per_family=int(table.get("searches_per_family", 1)),
        )
    except (ValueError, KeyError, TypeError):
        msg = (
            f"{file}: is damaged; delete it, then `hovergap resume {folder}` takes budget and seed "
            "from the study itself"
        )
        raise ResultsError(msg) from None


def _json(request: Request) -> bytes:
    return (json.dumps(request.table(), indent=2) + "\n").encode()


def _make_folder(folder: Path) -> None:
    """Make a folder and its parents so that they outlast a loss of power."""
    new = [place for place in (folder, *folder.parents) if not place.exists()]
    folder.mkdir(parents=True, exist_ok=True)
    for place in new:
        sync_folder(place.parent)


def _remove_drafts(root: Path, study: str) -> None:
    """Remove what processes left behind that were killed while they made this folder."""
    for draft in root.glob(f".{study}.*"):
        process = draft.name.rpartition(".")[2]
        if process.isdecimal() and not alive(int(process)):
            shutil.rmtree(draft, ignore_errors=True)


def _write(file: Path, content: bytes) -> None:
    with file.open("wb") as stream:
        stream.write(content)
        stream.flush()
        os.fsync(stream.fileno())
