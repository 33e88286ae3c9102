"""A small process that outlives a killed evaluator just long enough to end its programs.

A worker that is killed cannot clean up: the program it started would go on, hold its licence and
its memory. So each process that starts programs also starts this one, tells it through a pipe
which process groups are alive, and the end of the pipe means that their keeper is gone.
"""

from __future__ import annotations

import atexit
import contextlib
import os
import signal
import subprocess
import sys


def watch() -> None:
    """Read ``+group`` and ``-group`` until the pipe ends; then kill the groups left."""
    alive: set[int] = set()
    for line in sys.stdin.buffer:
        change = alive.add if line[:1] == b"+" else alive.discard
        change(int(line[1:]))
    for group in alive:
        with contextlib.suppress(ProcessLookupError, PermissionError):
            os.killpg(group, signal.SIGKILL)


class Guard:
    """This process's line to its guard, started on first use."""

    def __init__(self) -> None:
        self._process: subprocess.Popen[bytes] | None = None
        self._owner = 0

    def ready(self) -> None:
        """Start the guard, before the first program rather than after it."""
        self._running()

    def started(self, group: int) -> None:
        """A process group is alive."""
        self._tell(b"+%d\n" % group)

    def ended(self, group: int) -> None:
        """A process group is gone."""
        self._tell(b"-%d\n" % group)

    def close(self) -> None:
        """Let the guard end."""
        if self._process is not None and self._process.stdin and self._owner == os.getpid():
            with contextlib.suppress(BrokenPipeError):
                self._process.stdin.close()
            self._process.wait()
        self._process = None

    def _tell(self, line: bytes) -> None:
        for _ in range(2):  # a guard that was killed is replaced
            stream = self._running().stdin
            if stream is None:
                return
            try:
                stream.write(line)
                stream.flush()
            except BrokenPipeError:
                self.close()
            else:
                return

    def _running(self) -> subprocess.Popen[bytes]:
        if self._process is None or self._owner != os.getpid():  # a forked copy has its own
            self._owner = os.getpid()
            self._process = subprocess.Popen(  # noqa: S603  our own file
                [sys.executable, "-I", "-S", __file__],
                stdin=subprocess.PIPE,
                stdout=subprocess.DEVNULL,
                stderr=subprocess.DEVNULL,
                start_new_session=True,  # Ctrl-C is not meant for it
            )
            atexit.register(self.close)
        return self._process


GUARD = Guard()

if __name__ == "__main__":
    watch()
