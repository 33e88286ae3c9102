"""One worker process, seen from the process that started it."""

from __future__ import annotations

import contextlib
import json
import os
import signal
import subprocess
import sys
import time
from multiprocessing import Pipe
from pathlib import Path
from typing import Any

from optimizer.workers.dispatch import THREAD_VARIABLES
from optimizer.workers.units import Unit

_GRACE_S = 5.0  # for a worker to end by itself when nothing is left to do
# The import path goes along as an argument: programs that an evaluation starts would inherit it
# from the environment. Nothing of this process' state does.
_CODE = (
    "import json, sys; sys.path[:] = json.loads(sys.argv[1]); "
    "from optimizer.workers.worker import serve; serve(int(sys.argv[2]), int(sys.argv[3]))"
)


class Child:
    """One process that evaluates one unit after the other.

    It is started afresh, not forked, and leads a group of its own, so that it can be killed with
    all it has started.
    """

    def __init__(self) -> None:
        self.pipe, theirs = Pipe()
        with theirs:  # its end must not stay open here, or nobody would see that it died
            path = json.dumps([os.path.abspath(entry) for entry in sys.path])
            number = theirs.fileno()
            self.process = subprocess.Popen(  # noqa: S603
                [sys.executable, "-P", "-c", _CODE, path, str(number), str(os.getpid())],
                stdin=subprocess.DEVNULL,
                pass_fds=(number,),
                env={**os.environ, **dict.fromkeys(THREAD_VARIABLES, "1")},
                process_group=0,
            )
        self.unit: Unit | None = None
        self.since: float | None = None  # when the unit in hand began
        self.began_once = False

    def give(self, problem: Path, unit: Unit) -> None:
        """Hand over a unit."""
        self.unit, self.since = unit, None
        with contextlib.suppress(OSError):  # it has died, which is seen when its answer is read
            self.pipe.send((str(problem), unit.chunk))

    def begin(self) -> None:
        """Time the unit in hand from now on: the problem has been loaded."""
        self.since, self.began_once = time.monotonic(), True

    def answer(self) -> Any:
        """What it sent next, or None if it has sent nothing.

        Raises
        ------
        EOFError
            If it has ended.
        """
        try:
            if self.pipe.poll():
                return self.pipe.recv()
            # What it left running may hold the pipe open.
            ended = self.process.poll() is not None and not self.pipe.poll()
        except OSError:
            ended = True
        if ended:
            raise EOFError
        return None

    def strike(self) -> None:
        """End it and what it started, whatever they are doing, without waiting for it."""
        with contextlib.suppress(ProcessLookupError, PermissionError):
            os.killpg(self.process.pid, signal.SIGKILL)
        self.process.kill()

    def kill(self) -> None:
        """End it and what it started, and let go of it."""
        self.strike()
        self.process.wait()
        self.pipe.close()

    def end(self) -> None:
        """Let it end by itself."""
        self.pipe.close()
        try:
            self.process.wait(_GRACE_S)
        except subprocess.TimeoutExpired:
            self.kill()
