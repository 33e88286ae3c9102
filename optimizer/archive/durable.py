"""Files that are either there in full or not at all."""

from __future__ import annotations

import contextlib
import errno
import os
from pathlib import Path

from optimizer.errors import storage_error

# Some file systems, above all of networks, have no such operation for folders.
_CANNOT_SYNC = (errno.EINVAL, errno.ENOTSUP)


def write_durably(path: Path, data: bytes) -> None:
    """Write a file so that a crash at any instant leaves the old content or the new.

    The data go to a dot name in the same folder, reach the disk, and take the final name in
    one step. Readers of ``*.parquet`` or of the folder never see the dot name.

    Raises
    ------
    ArchiveError
        If the disk is full, permission is denied or the disk fails; the old file is untouched.
    """
    temporary = path.with_name(f".{path.name}.{os.getpid()}")
    try:
        with open(temporary, "wb") as file:
            file.write(data)
            file.flush()
            os.fsync(file.fileno())
        os.replace(temporary, path)
        sync_folder(path.parent)
    except OSError as error:
        with contextlib.suppress(OSError):
            temporary.unlink(missing_ok=True)
        raise storage_error(error, path, "write") from error


def sync_folder(folder: Path) -> None:
    """Make new, renamed and removed entries of ``folder`` last."""
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    except OSError as error:
        if error.errno not in _CANNOT_SYNC:
            raise
    finally:
        os.close(handle)


def make_folder(folder: Path) -> None:
    """Make ``folder`` and its parents unless they exist, so that they outlast a loss of power.

    Raises
    ------
    ArchiveError
        If it cannot be made.
    """
    try:
        new = [place for place in (folder, *folder.parents) if not place.exists()]
        folder.mkdir(parents=True, exist_ok=True)
        for place in new:
            sync_folder(place.parent)
    except OSError as error:
        raise storage_error(error, folder, "make the folder") from error


def remove(path: Path) -> None:
    """Remove a file if it is there.

    Raises
    ------
    ArchiveError
        If it cannot be removed.
    """
    try:
        path.unlink(missing_ok=True)
    except OSError as error:
        raise storage_error(error, path, "remove") from error


def remove_leftovers(folder: Path) -> None:
    """Remove dot-named files that a killed writer left behind; only the writer may call this."""
    for path in folder.glob(".*.*.*"):
        if path.is_file() and path.name.rsplit(".", 1)[-1].isdigit():
            with contextlib.suppress(OSError):
                path.unlink()
