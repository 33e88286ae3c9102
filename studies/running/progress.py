"""Progress of a sweep: a line kept up to date on a terminal, plain lines elsewhere."""

from __future__ import annotations

import math
import shutil
import sys
import time
from collections.abc import Callable
from threading import RLock
from typing import TextIO

from optimizer.running.progress import Progress

PLAIN_INTERVAL_S = 5.0
SCREEN_INTERVAL_S = 0.1


class StatusLine:
    """One line kept up to date on a terminal; elsewhere a plain line now and then.

    Parameters
    ----------
    stream : TextIO, optional
        By default standard output.
    """

    def __init__(self, stream: TextIO | None = None) -> None:
        self.stream = stream or sys.stdout
        self.terminal = self.stream.isatty()
        self._shown_at = -math.inf
        self._width = 0
        self._turn = RLock()  # searches that go on side by side tell of themselves

    def put(self, text: Callable[[], str]) -> None:
        """Show what `text` returns if the last showing is long enough ago."""
        interval = SCREEN_INTERVAL_S if self.terminal else PLAIN_INTERVAL_S
        with self._turn:
            now = time.monotonic()
            if now - self._shown_at < interval:
                return
            self._shown_at = now
            if self.terminal:
                columns = shutil.get_terminal_size().columns - 1
                self._overwrite(text()[:columns])
            else:
                self._write(f"{text()}\n")

    def say(self, text: str) -> None:
        """Write lines of their own, taking the place of a kept line."""
        with self._turn:
            if self._width:
                self._overwrite("")
                self._write("\r")
                self._width = 0
            self._write(f"{text}\n")

    def _overwrite(self, text: str) -> None:
        self._write("\r" + text.ljust(self._width))
        self._width = len(text)

    def _write(self, text: str) -> None:
        self.stream.write(text)
        self.stream.flush()


class ProgressLine(StatusLine):
    """Shows the progress of searches, one after the other or side by side.

    Parameters
    ----------
    searches : tuple of str
        All searches of this sweep, in order, for the time left in all.
    stream : TextIO, optional
        By default standard output.
    """

    def __init__(self, searches: tuple[str, ...], stream: TextIO | None = None) -> None:
        super().__init__(stream)
        self._later = list(searches)
        self._states: dict[str, Progress] = {}

    def show(self, search: str, state: Progress) -> None:
        """Show the state of a search, if the last showing is long enough ago or it is new."""
        with self._turn:
            if search not in self._states:
                self._shown_at = -math.inf
            if search in self._later:
                self._later.remove(search)
            self._states[search] = state
            self.put(self._text)

    def finish(self, search: str) -> None:
        """Show no more of a search."""
        with self._turn:
            self._states.pop(search, None)

    def _text(self) -> str:
        if len(self._states) > 1:
            return self._side_by_side()
        ((search, state),) = self._states.items()
        done, later = state.evaluations, len(self._later)
        share = state.feasible / done if done else 0.0
        parts = [f"{search}  {done:,}/{state.budget:,}"]
        known = math.isfinite(state.rate) and state.rate > 0.0
        if known:
            left = f"left {duration(state.seconds_left)}"
            if later:
                left += f", all {duration(state.seconds_left + later * state.budget / state.rate)}"
            parts.append(left)
        # The most wanted stands first, because a narrow terminal cuts the end.
        parts.append(f"feasible {100.0 * share:.1f} %")
        if state.hypervolume > 0.0:
            parts.append(f"hypervolume {state.hypervolume:.3f}")
        parts.append(f"front {state.front_size}")
        if known:
            parts.append(speed(state.rate))
        return "  ".join(parts)

    def _side_by_side(self) -> str:
        states = self._states.values()
        rate = sum(item.rate for item in states if math.isfinite(item.rate))
        parts = [f"{name}  {item.evaluations:,}" for name, item in self._states.items()]
        if rate > 0.0:
            left = sum(item.budget - item.evaluations for item in states)
            left += len(self._later) * max(item.budget for item in states)
            # The most wanted stands first, because a narrow terminal cuts the end.
            parts = [f"all left {duration(left / rate)}", speed(rate), *parts]
        return "  ".join(parts)


def speed(rate: float) -> str:
    """Evaluations a second."""
    return f"{rate:.0f}/s" if rate >= 10.0 else f"{rate:.2f}/s"


def duration(seconds: float) -> str:
    """Seconds as ``m:ss`` or ``h:mm:ss``; a dash if unknown."""
    if not math.isfinite(seconds):
        return "-"
    whole = max(0, round(seconds))
    hours, rest = divmod(whole, 3600)
    minutes, rest = divmod(rest, 60)
    return f"{hours}:{minutes:02d}:{rest:02d}" if hours else f"{minutes}:{rest:02d}"
