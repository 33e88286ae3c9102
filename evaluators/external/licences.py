"""At most so many runs of one program at a time, over all processes of one user on one machine."""

from __future__ import annotations

import hashlib
import os
import stat
import tempfile
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from filelock import FileLock, Timeout

SHORTEST_POLL_S, LONGEST_POLL_S = 5e-3, 0.2


@contextmanager
def licence(program: str, count: int | None) -> Iterator[None]:
    """Hold one of `count` licences of `program` (an absolute path); None for no limit.

    A licence is a lock on a file, which the system gives back when its holder dies.

    Raises
    ------
    OSError
        If the folder of the locks cannot be used.
    """
    if count is None:
        yield
        return
    folder = _folder(program)
    pause = SHORTEST_POLL_S
    while True:
        for number in range(count):
            lock = FileLock(folder / f"{number}.lock")
            try:
                lock.acquire(blocking=False)
            except Timeout:
                continue
            try:
                yield
            finally:
                lock.release()
            return
        time.sleep(pause)
        pause = min(2.0 * pause, LONGEST_POLL_S)


def private_folder(name: str) -> Path:
    """A folder of this user's own below the system's folder of temporary files.

    Raises
    ------
    OSError
        If something else is in its place: the names there can be guessed by others.
    """
    folder = Path(tempfile.gettempdir()) / f"{name}-{os.getuid()}"
    folder.mkdir(mode=0o700, exist_ok=True)
    found = folder.lstat()
    if not stat.S_ISDIR(found.st_mode) or found.st_uid != os.getuid() or found.st_mode & 0o022:
        msg = "is not a folder of this user's own"
        raise PermissionError(0, msg, str(folder))
    return folder


def _folder(program: str) -> Path:
    digest = hashlib.sha256(os.fsencode(program)).hexdigest()[:16]
    folder = private_folder("hovergap-licences") / digest
    folder.mkdir(mode=0o700, exist_ok=True)
    return folder
