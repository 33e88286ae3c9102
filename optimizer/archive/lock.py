"""One writer for each archive."""

from __future__ import annotations

import contextlib
import os
import socket
from collections.abc import Iterator
from pathlib import Path

from filelock import FileLock, Timeout

from optimizer.errors import ArchiveLockedError, storage_error

LOCK_NAME = ".lock"
WRITER_NAME = ".writer"


@contextlib.contextmanager
def writer_lock(folder: Path) -> Iterator[None]:
    """Hold the lock of an archive.

    The operating system keeps the lock and releases it when the process ends, however it
    ends, so the lock of a dead process does not block.

    Raises
    ------
    ArchiveLockedError
        If another writer, in this process or another, holds it.
    ArchiveError
        If the lock file cannot be made.
    """
    lock = FileLock(folder / LOCK_NAME, timeout=0, thread_local=False)
    try:
        lock.acquire()
    except Timeout as error:
        msg = f"{folder} is being written by {_writer(folder)}; wait until that ends or stop it"
        raise ArchiveLockedError(msg) from error
    except OSError as error:
        raise storage_error(error, folder / LOCK_NAME, "lock") from error
    try:
        with contextlib.suppress(OSError):  # only tells others who is writing
            (folder / WRITER_NAME).write_text(f"process {os.getpid()} on {socket.gethostname()}")
        yield
    finally:
        with contextlib.suppress(OSError):
            (folder / WRITER_NAME).unlink(missing_ok=True)
        lock.release()


def _writer(folder: Path) -> str:
    with contextlib.suppress(OSError, UnicodeDecodeError):
        text = (folder / WRITER_NAME).read_text(encoding="utf-8")[:200]
        if text.isprintable() and text:
            return text
    return "another process"
