"""A folder of exported files: written without touching what is there, cautions beside them."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from textwrap import fill
from typing import Any

from optimizer.archive.durable import make_folder, write_durably
from studies.errors import StorageError
from studies.inspection.design import CAUTIONS, SHORT_CAUTIONS
from studies.stored.layout import program_version, storage

README = "README.txt"


@dataclass(frozen=True)
class ExportedFile:
    """One file with a sentence on what it holds."""

    name: str
    content: bytes
    description: str


def text_file(name: str, text: str, description: str) -> ExportedFile:
    """A file of UTF-8 text."""
    return ExportedFile(name, text.encode(), description)


def json_file(name: str, content: Mapping[str, Any], description: str) -> ExportedFile:
    """A JSON file with the cautions; NaN and infinity, which JSON does not know, are refused."""
    whole = {**content, "cautions": list(CAUTIONS)}
    text = json.dumps(whole, indent=2, allow_nan=False, ensure_ascii=False)
    return text_file(name, text + "\n", description)


def svg_file(name: str, svg: str, description: str) -> ExportedFile:
    """A drawing with the short cautions as its description, which viewers show or read out."""
    head, rest = svg.split(">", 1)
    return text_file(name, f"{head}><desc>{' '.join(SHORT_CAUTIONS)}</desc>{rest}", description)


def write_folder(
    folder: Path, files: list[ExportedFile], title: str, notes: list[str], force: bool
) -> list[Path]:
    """Write all files and a README.txt, or nothing if one of them is there already.

    Parameters
    ----------
    folder : Path
        Made if it does not exist.
    files : list of ExportedFile
    title : str
        First line of the README.
    notes : list of str
        Paragraphs below it.
    force : bool
        Replace files of the same names.

    Raises
    ------
    StorageError
        If a file is in the way, or the folder cannot be written.
    """
    everything = [*files, text_file(README, _readme(files, title, notes), "")]
    with storage(folder, "read"):
        present = [item.name for item in everything if (folder / item.name).exists()]
    if present and not force:
        more = f" and {len(present) - 1} more" if len(present) > 1 else ""
        msg = (
            f"{folder / present[0]}{more}: exists already and is left alone; add --force to replace"
        )
        raise StorageError(msg)
    make_folder(folder)
    for item in everything:
        write_durably(folder / item.name, item.content)
    return [folder / item.name for item in everything]


def _readme(files: list[ExportedFile], title: str, notes: list[str]) -> str:
    width = max((len(item.name) for item in files), default=0) + 2
    listing = [
        fill(
            f"{item.name:<{width}}{item.description}",
            96,
            subsequent_indent=" " * width,
            break_on_hyphens=False,
        )
        for item in files
    ]
    cautions = [fill(item, 96, initial_indent="- ", subsequent_indent="  ") for item in CAUTIONS]
    parts = [
        f"{title}\nWritten by hovergap {program_version()}.",
        *(fill(" ".join(note.split()), 96) for note in notes),
        "Files\n" + "\n".join(listing),
        "Before anything is built\n" + "\n".join(cautions),
    ]
    return "\n\n".join(parts) + "\n"
