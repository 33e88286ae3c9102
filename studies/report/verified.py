"""Values of front designs computed again by a finer evaluator, where somebody stored them.

They lie beside the front as ``verified.parquet``: one row a design with its ``evaluation``,
``evaluator``, ``evaluator_version`` and any metrics by name.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq

from evaluators.machine.metrics import METRIC
from studies.errors import ResultsError

VERIFIED_FILE = "verified.parquet"


@dataclass(frozen=True)
class Verified:
    """One design's verified metrics and which evaluator gave them."""

    evaluator: str
    evaluator_version: str
    metrics: dict[str, float]


def verified_values(folder: Path) -> dict[int, Verified]:
    """Verified values of one family by evaluation number; empty if there are none.

    Raises
    ------
    ResultsError
        If the file is there but cannot be read.
    """
    file = folder / VERIFIED_FILE
    if not file.is_file():
        return {}
    try:
        rows = pq.read_table(file, page_checksum_verification=True).to_pylist()
        return {
            int(row["evaluation"]): Verified(
                str(row["evaluator"]),
                str(row["evaluator_version"]),
                {
                    name: float(value)
                    for name, value in row.items()
                    if name in METRIC and value is not None and math.isfinite(value)
                },
            )
            for row in rows
        }
    except (OSError, pa.ArrowException, KeyError, TypeError, ValueError) as error:
        msg = f"{file}: cannot be read as verified values: {error}"
        raise ResultsError(msg) from None
