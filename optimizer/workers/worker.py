"""What runs inside a worker process."""

from __future__ import annotations

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
from optimizer.workers.dispatch import Chunk, Finished, evaluate_chunk

READY = "ready"
_PARENT_CHECK_S = 1.0
_problems: dict[str, Problem] = {}


def start_worker(parent: int) -> None:
    """Prepare a new worker: deaf to Ctrl-C, which is the parent's to handle, and one thread."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    threadpool_limits(1)
    # A worker whose parent was killed would otherwise wait for minutes and hold its files open.
    threading.Thread(target=_end_with, args=(parent,), daemon=True).start()


def evaluate_in_worker(path: str, chunk: Chunk) -> Finished:
    """Evaluate a chunk of the problem stored under ``path`` by the parent.

    The file is read once for each problem; it lies in a private folder of the parent, so
    nothing foreign is unpickled.
    """
    return evaluate_chunk(_problem(path), chunk)


def serve_rows(pipe: Connection[Any, Any], parent: int, path: str) -> None:
    """Evaluate one chunk after the other that comes through the pipe, until it is closed.

    The process leads a group of its own, so that it can be killed with all it has started.
    """
    if hasattr(os, "setpgid"):
        os.setpgid(0, 0)
    start_worker(parent)
    try:
        problem = _problem(path)
    except ProblemError as error:
        pipe.send(error)
        return
    pipe.send(READY)
    while True:
        try:
            chunk = pipe.recv()
        except (EOFError, OSError):
            return
        try:
            answer: Finished | ProblemError = evaluate_chunk(problem, chunk)
        except ProblemError as error:
            answer = error
        pipe.send(answer)


def _problem(path: str) -> Problem:
    problem = _problems.get(path)
    if problem is None:
        _problems.clear()
        try:
            problem = pickle.loads(Path(path).read_bytes())  # noqa: S301
        except Exception as error:  # rebuilding runs the problem's own code and imports
            msg = f"the problem cannot be rebuilt in a worker process: {error}"
            raise ProblemError(msg) from error
        _problems[path] = problem
    return problem


def _end_with(parent: int) -> None:
    while os.getppid() == parent:
        time.sleep(_PARENT_CHECK_S)
    os._exit(1)
