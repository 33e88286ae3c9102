"""Designs that were evaluated before are answered from what was stored."""

from __future__ import annotations

import hashlib

import numpy as np

from optimizer.problem import AnyArray, FloatArray, IntArray, Outcome

_NONE = -1


class Repeats:
    """Which evaluation was the first of each design, to the last bit."""

    def __init__(self) -> None:
        self._first: dict[bytes, int] = {}

    def sources(self, first: int, x: FloatArray) -> IntArray:
        """Take in designs and return for each the earlier evaluation of the same one, or -1.

        Parameters
        ----------
        first : int
            Evaluation of the first row.
        x : (n, v) array

        Returns
        -------
        (n,) array of int
        """
        found = np.full(len(x), _NONE)
        for row, values in enumerate(np.ascontiguousarray(x + 0.0)):  # -0 is 0
            # Less memory than the values: a study may hold millions of them.
            key = hashlib.blake2b(values.tobytes(), digest_size=16).digest()
            number = self._first.setdefault(key, first + row)
            if number != first + row:
                found[row] = number
        return found


def as_repeat(outcome: Outcome, sources: IntArray) -> Outcome:
    """Say in each row which evaluation it repeats."""
    reasons = [
        f"{reason}; repeat of evaluation {source}" if reason else f"repeat of evaluation {source}"
        for reason, source in zip(outcome.reason.tolist(), sources.tolist(), strict=True)
    ]
    columns: dict[str, AnyArray] = dict(outcome.columns)
    return Outcome(
        outcome.objectives, outcome.constraints, outcome.status, np.array(reasons), columns
    )
