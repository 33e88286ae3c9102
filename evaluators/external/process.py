"""One run of a program outside: in its own process group, within a time and output limit."""

from __future__ import annotations

import contextlib
import os
import signal
import subprocess
import time
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Literal

from evaluators.external.guard import GUARD
from evaluators.external.wording import plain

OUTPUT = "output.txt"
LARGEST_OUTPUT = 64 << 20  # bytes of standard output and error together
TAIL_BYTES = 2000
TAIL_LINES = 3
LONGEST_TAIL = 240  # characters
SHORTEST_POLL_S, LONGEST_POLL_S = 1e-3, 50e-3


@dataclass(frozen=True)
class Ended:
    """How a run ended.

    Attributes
    ----------
    how : str
        ``ended``, ``timed out``, ``too much output``, or ``not started``.
    code : int
        Exit code, negative for a signal; 0 where the program was killed from here.
    last_words : str
        End of what it printed, on one line; for ``not started`` the cause.
    """

    how: Literal["ended", "timed out", "too much output", "not started"]
    code: int
    last_words: str


def run_program(program: Sequence[str], folder: Path, timeout_s: float) -> Ended:
    """Run `program` in `folder` and wait; nothing of its process group is alive afterwards.

    Standard input is empty; standard output and error go to ``output.txt`` in `folder`.
    """
    file = folder / OUTPUT
    GUARD.ready()
    with file.open("wb") as stream:
        try:
            process = subprocess.Popen(  # noqa: S603  the user has consented to this program
                list(program),
                cwd=folder,
                stdin=subprocess.DEVNULL,
                stdout=stream,
                stderr=subprocess.STDOUT,
                start_new_session=True,
            )
        except OSError as error:
            return Ended("not started", 0, (error.strerror or str(error)).lower())
        how: Literal["ended", "timed out", "too much output"] = "ended"
        try:
            GUARD.started(process.pid)
            deadline = time.monotonic() + timeout_s
            pause = SHORTEST_POLL_S
            while not _has_ended(process.pid):
                if time.monotonic() >= deadline:
                    how = "timed out"
                    break
                if os.fstat(stream.fileno()).st_size > LARGEST_OUTPUT:
                    how = "too much output"
                    break
                time.sleep(max(0.0, min(pause, deadline - time.monotonic())))
                pause = min(2.0 * pause, LONGEST_POLL_S)
        finally:
            # While the leader is not reaped its number cannot belong to anybody else.
            with contextlib.suppress(ProcessLookupError, PermissionError):
                os.killpg(process.pid, signal.SIGKILL)
            process.wait()
            GUARD.ended(process.pid)
    return Ended(how, process.returncode if how == "ended" else 0, _tail(file))


def _has_ended(child: int) -> bool:
    """Whether the child has ended, without reaping it."""
    return os.waitid(os.P_PID, child, os.WEXITED | os.WNOHANG | os.WNOWAIT) is not None


def _tail(file: Path) -> str:
    """Last lines the program printed, on one line."""
    with file.open("rb") as stream:
        size = stream.seek(0, os.SEEK_END)
        stream.seek(max(0, size - TAIL_BYTES))
        text = stream.read(TAIL_BYTES).decode("utf-8", errors="replace")
    lines = [plain(line, LONGEST_TAIL) for line in text.splitlines()]
    words = "; ".join([line for line in lines if line][-TAIL_LINES:])
    return words if len(words) <= LONGEST_TAIL else f"...{words[3 - LONGEST_TAIL :]}"
