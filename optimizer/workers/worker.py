"""What runs inside a worker process."""

from __future__ import annotations

import contextlib
import os
import pickle
import signal
import threading
import time
from multiprocessing.connection import Connection
from pathlib import Path
from typing import Any

from threadpoolctl import threadpool_limits

from optimizer.errors import ProblemError
from optimizer.problem import Problem
from optimizer.workers.dispatch import Finished, evaluate_chunk

BEGUN = "begun"
_PARENT_CHECK_S = 1.0


def serve(descriptor: int, parent: int) -> None:
    """Evaluate one chunk after the other that comes through a pipe, until that is closed.

    Each message is the file in which the parent has stored the problem, and a chunk. The answers
    to it are ``BEGUN`` when all is loaded, then what came of it.

    Parameters
    ----------
    descriptor : int
        Of this end of the pipe.
    parent : int
        Its process; when that ends, so does this one.
    """
    os.set_inheritable(descriptor, False)  # or a program started here would keep the pipe open
    # Ctrl-C is the parent's to handle.
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    threadpool_limits(1)
    # A worker whose parent was killed would otherwise finish what it has in hand first.
    threading.Thread(target=_end_with, args=(parent,), daemon=True).start()
    pipe: Connection[Any, Any] = Connection(descriptor)
    known, problem = "", None
    with contextlib.suppress(EOFError, OSError):  # the parent wants nothing more, or has gone
        while True:
            path, chunk = pipe.recv()
            try:
                if problem is None or path != known:
                    problem, known = _read(path), path
                pipe.send(BEGUN)
                answer: Finished | ProblemError = evaluate_chunk(problem, chunk)
            except ProblemError as error:
                answer = error
            pipe.send(answer)


def _read(path: str) -> Problem:
    """Read a problem; it lies in a private folder of the parent, so nothing foreign is unpickled.

    Raises
    ------
    ProblemError
        If it cannot be rebuilt here.
    """
    try:
        return pickle.loads(Path(path).read_bytes())  # type: ignore[no-any-return]  # noqa: S301
    except Exception as error:  # rebuilding runs the problem's own code and imports
        msg = f"the problem cannot be rebuilt in a worker process: {error}"
        raise ProblemError(msg) from error


def _end_with(parent: int) -> None:
    while os.getppid() == parent:
        time.sleep(_PARENT_CHECK_S)
    os._exit(1)
