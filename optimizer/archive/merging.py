"""Which parts are worth putting together.

A run writes a part about once a second, so a night leaves tens of thousands, and opening each
takes longer than reading its rows. Parts of similar size are put together as they pile up: every
row is written again a few times at most, and there are never many parts.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Mapping
from pathlib import Path

MERGE_FROM = 8  # parts; fewer are left as they are at the end of a run
MERGE_MEANWHILE = 32  # parts of similar size, while a run goes on
MERGED_ROWS = 100_000  # of a part put together
_LARGE = MERGED_ROWS // 2


def piled_up(rows: Mapping[Path, int]) -> list[Path]:
    """Return parts of similar size of which there are many; ``rows`` holds the rows of each."""
    alike: dict[int, list[Path]] = defaultdict(list)
    for path, count in rows.items():
        if count < _LARGE:
            alike[int(math.log(max(count, 1), MERGE_MEANWHILE))].append(path)
    most = max(alike.values(), key=len, default=[])
    return most if len(most) >= MERGE_MEANWHILE else []


def small(rows: Mapping[Path, int]) -> list[Path]:
    """Return the small parts at the end of a run, or none if there are few."""
    found = [path for path, count in rows.items() if count < _LARGE]
    return found if len(found) >= MERGE_FROM else []
