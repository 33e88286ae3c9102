"""Lines that are redrawn in place on a terminal, and written one after the other elsewhere."""

from __future__ import annotations

import os
import shutil
import sys
from typing import TextIO

WIDE = 200  # characters of a line where nothing limits it


class Screen:
    """Shows a block of lines again and again.

    Parameters
    ----------
    stream : TextIO, optional
        By default standard output. A terminal is redrawn in place; a pipe or file gets each
        block once, and nothing while it stays the same.
    """

    def __init__(self, stream: TextIO | None = None) -> None:
        self.stream = stream or sys.stdout
        self.live = self.stream.isatty() and os.environ.get("TERM", "") not in ("", "dumb")
        self._height = 0
        self._last: list[str] = []

    @property
    def width(self) -> int:
        """Characters that fit in a line."""
        return shutil.get_terminal_size().columns - 1 if self.live else WIDE

    def show(self, lines: list[str]) -> None:
        """Show a block in place of the last one."""
        if not self.live:
            if lines != self._last:
                self.stream.write("\n".join(lines) + "\n\n")
                self.stream.flush()
            self._last = lines
            return
        size = shutil.get_terminal_size()
        room = max(1, size.lines - 1)
        if len(lines) > room:
            lines = [*lines[: room - 1], f"and {len(lines) - room + 1} more lines"]
        cut = [line[: size.columns - 1] for line in lines]
        up = f"\x1b[{self._height}A" if self._height else ""
        # To the start of the old block, clear to the end of the screen, write anew.
        self.stream.write(f"{up}\r\x1b[J" + "\n".join(cut) + "\n")
        self.stream.flush()
        self._height = len(cut)
