"""Values of designs computed again by another evaluator, as the report shows them."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from studies.errors import ResultsError
from studies.stored.families import StoredFamily
from studies.stored.naming import design_id
from studies.stored.verified import read_verified, verified_evaluators


@dataclass(frozen=True)
class Verified:
    """One design's verified metrics and which evaluator gave them."""

    evaluator: str
    evaluator_version: str
    metrics: dict[str, float]


def verified_values(stored: StoredFamily) -> dict[str, Verified]:
    """Verified values of one family by design; empty if there are none.

    Of several evaluators the one used last counts; designs it could not evaluate are left out.

    Raises
    ------
    ResultsError
        If some of them cannot be read.
    """
    return {
        design_id(search.name, evaluation): values
        for search in stored.searches
        for evaluation, values in _of_search(search.folder).items()
    }


def _of_search(folder: Path) -> dict[int, Verified]:
    names = verified_evaluators(folder)
    if not names:
        return {}
    found = read_verified(folder, names[-1])
    if found.damaged:
        msg = (
            f"{found.damaged[0]}: cannot be read as verified values; `hovergap verify "
            f"{folder.parent}` sets it aside and verifies its designs again"
        )
        raise ResultsError(msg)
    return {
        evaluation: Verified(
            str(row.values["evaluator"]), str(row.values["evaluator_version"]), row.metrics
        )
        for evaluation, row in found.rows.items()
        if row.ok
    }
