"""Ctrl-C: the first finishes what is in hand, the second stops at once."""

from __future__ import annotations

import signal
import sys
from types import FrameType
from typing import Self

HANDLED = (signal.SIGINT, signal.SIGTERM)


class Interruption:
    """While entered, SIGINT and SIGTERM set `asked` instead of ending the process."""

    def __init__(self) -> None:
        self.asked = False
        self.signal = signal.SIGINT
        self._before: dict[signal.Signals, object] = {}

    def __call__(self) -> bool:
        """Whether to stop; the form the search asks in."""
        return self.asked

    @property
    def exit_code(self) -> int:
        """128 plus the number of the signal, as shells have it."""
        return 128 + int(self.signal)

    def __enter__(self) -> Self:
        self._before = {item: signal.signal(item, self._handle) for item in HANDLED}
        return self

    def __exit__(self, *raised: object) -> None:
        for item, handler in self._before.items():
            # Once all is stored, a further Ctrl-C must not spoil the last words and exit code.
            ended = self.asked and item == signal.SIGINT
            signal.signal(item, signal.SIG_IGN if ended else handler)  # type: ignore[arg-type]

    def _handle(self, number: int, frame: FrameType | None) -> None:
        del frame
        if self.asked:
            raise KeyboardInterrupt
        self.asked = True
        self.signal = signal.Signals(number)
        sys.stderr.write("\nfinishing the designs in hand; once more stops at once\n")
        sys.stderr.flush()
