"""Immutable Parquet parts: one file each, checked before anything in it is believed.

A part is called ``part-<number>-<crc>.parquet``, with the CRC-32 of the whole file in its name.
Every page carries its own checksum too, which other readers of Parquet can verify; but those
leave out the headers and the footer, where a changed byte can read as valid wrong data.
"""

from __future__ import annotations

import contextlib
import hashlib
import re
import zlib
from collections.abc import Iterator, Sequence
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq

from optimizer.archive.durable import sync_folder, write_durably
from optimizer.errors import storage_error

QUARANTINE = "quarantine"
_BLOCK = 1 << 20
_NAME = re.compile(r"part-(\d{8,})(?:-([0-9a-f]{8}))?\.parquet")


class DamagedPartError(Exception):
    """A part cannot be read or is not what was written; never leaves this package."""


class ForeignPartError(DamagedPartError):
    """A part is sound, but belongs to another archive; never leaves this package either."""


def encode(table: pa.Table) -> bytes:
    """Return the bytes of a Parquet file with a checksum on every page."""
    texts = [field.name for field in table.schema if pa.types.is_string(field.type)]
    sink = pa.BufferOutputStream()
    pq.write_table(
        table,
        sink,
        compression="zstd",
        use_dictionary=texts,
        write_page_checksum=True,
        row_group_size=100_000,
    )
    return bytes(memoryview(sink.getvalue()))


def part_paths(folder: Path) -> list[Path]:
    """Return the parts of an archive in the order in which they were written."""
    try:
        found = [path for path in folder.iterdir() if _NAME.fullmatch(path.name)]
    except OSError as error:
        raise storage_error(error, folder, "read") from error
    return sorted(found, key=lambda path: (part_number(path), path.name))


def parts_digest(folder: Path) -> bytes:
    """Return a digest of which parts there are; their names tell their content."""
    names = "\n".join(path.name for path in part_paths(folder))
    return hashlib.sha256(names.encode()).hexdigest().encode()


def part_number(path: Path) -> int:
    """Return the number in the name of a part."""
    match = _NAME.fullmatch(path.name)
    return int(match[1]) if match else -1


def next_number(folder: Path) -> int:
    """Return a number no part has, set aside or not."""
    aside = folder / QUARANTINE
    paths = part_paths(folder) + (part_paths(aside) if aside.is_dir() else [])
    return max((part_number(path) for path in paths), default=-1) + 1


def write_part(folder: Path, number: int, table: pa.Table) -> Path:
    """Write a table as the part of that number.

    Raises
    ------
    ArchiveError
        If it cannot be written; nothing under a part's name is left behind then.
    """
    data = encode(table)
    path = folder / f"part-{number:08d}-{zlib.crc32(data):08x}.parquet"
    write_durably(path, data)
    return path


def check_part(path: Path) -> None:
    """Hold every byte of a part against the checksum in its name.

    Raises
    ------
    DamagedPartError
        If it was changed or cut short.
    FileNotFoundError
        If there is no such file.
    ArchiveError
        If it cannot be opened.
    """
    match = _NAME.fullmatch(path.name)
    if match and match[2] and file_checksum(path) != match[2]:
        msg = "its bytes do not match the checksum in its name"
        raise DamagedPartError(msg)


def file_checksum(path: Path) -> str:
    """CRC-32 of a file as eight hexadecimal digits.

    Raises
    ------
    FileNotFoundError
        If there is no such file.
    ArchiveError
        If it cannot be opened.
    """
    checksum = 0
    try:
        with open(path, "rb") as file:
            while block := file.read(_BLOCK):
                checksum = zlib.crc32(block, checksum)
    except FileNotFoundError:
        raise
    except OSError as error:
        raise storage_error(error, path, "read") from error
    return f"{checksum:08x}"


def part_schema(path: Path) -> pa.Schema:
    """Return the columns of a part and what they say of themselves, from its footer.

    Raises
    ------
    DamagedPartError
        If it cannot be read.
    FileNotFoundError
        If there is no such file.
    """
    with _reading(path):
        return pq.read_schema(path)


def read_part(path: Path, columns: Sequence[str] | None = None) -> pa.Table:
    """Read some columns of a part, or all; pages are checked, :func:`check_part` is not called.

    Raises
    ------
    DamagedPartError
        If it cannot be read, or has no such column.
    FileNotFoundError
        If there is no such file.
    """
    with (
        _reading(path),
        pa.OSFile(str(path)) as source,
        pq.ParquetFile(source, page_checksum_verification=True) as file,
    ):
        names = set(file.schema_arrow.names)
        missing = [name for name in columns or [] if name not in names]
        if missing:
            msg = f"it has no column {missing[0]}"
            raise DamagedPartError(msg)
        return file.read(columns=None if columns is None else list(columns))


@contextlib.contextmanager
def _reading(path: Path) -> Iterator[None]:
    try:
        yield
    except FileNotFoundError:
        raise
    except PermissionError as error:
        raise storage_error(error, path, "read") from error
    # What Arrow raises for a broken file: OSError for a page, ArrowInvalid (a ValueError) and
    # other ArrowExceptions for the footer, and these two for text and sizes out of order.
    except (OSError, pa.ArrowException, UnicodeDecodeError, MemoryError) as error:
        raise DamagedPartError(str(error).partition("\n")[0]) from error


def set_aside(path: Path) -> Path:
    """Move a damaged part to the ``quarantine`` folder beside it and return its new path.

    Raises
    ------
    ArchiveError
        If it cannot be moved.
    """
    aside = path.parent / QUARANTINE / path.name
    try:
        aside.parent.mkdir(exist_ok=True)
        path.replace(aside)
        # The new place first: after a loss of power it may lie in both, never in neither.
        for folder in (aside.parent, path.parent):
            sync_folder(folder)
        return aside
    except OSError as error:
        raise storage_error(error, path, "set aside") from error
