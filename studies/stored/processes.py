"""Whether the process lives whose number a file carries."""

from __future__ import annotations

import os


def alive(process: int) -> bool:
    """Whether a process of this number runs on this machine, whoever owns it."""
    try:
        os.kill(process, 0)
    except ProcessLookupError:
        return False
    except (PermissionError, OverflowError):
        return True
    return True
