"""One generation while it fills with outcomes, in whatever order they come."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from optimizer.errors import ArchiveMismatchError
from optimizer.problem import BoolArray, FloatArray, IntArray, Outcome

_MISSING = "not evaluated"


class Generation:
    """Designs asked for, and what is known of them.

    Parameters
    ----------
    number, first : int
        Of the generation, and of its first evaluation.
    x : (N, v) array
    objectives, constraints : int
    """

    def __init__(
        self, number: int, first: int, x: FloatArray, objectives: int, constraints: int
    ) -> None:
        self.number, self.first, self.x = number, first, x
        self.present: BoolArray = np.zeros(len(x), dtype=np.bool_)
        self._objectives = np.full((len(x), objectives), np.nan)
        self._constraints = np.full((len(x), constraints), np.nan)
        self._status = np.full(len(x), _MISSING, dtype=object)

    def __len__(self) -> int:
        return len(self.x)

    def fill(self, rows: IntArray, outcome: Outcome) -> None:
        """Enter the outcomes of ``rows`` (n,), counted from 0."""
        self.present[rows] = True
        self._objectives[rows] = outcome.objectives
        self._constraints[rows] = outcome.constraints
        self._status[rows] = outcome.status

    def recall(self, present: BoolArray, x: FloatArray, outcome: Outcome, where: str) -> None:
        """Enter what an archive holds, ``x`` and ``outcome`` of the rows ``present`` (N,).

        Raises
        ------
        ArchiveMismatchError
            If the designs stored are not those asked for, to the last bit.
        """
        different = np.flatnonzero((self.x[present] != x).any(axis=1))
        if len(different):
            number = self.first + int(np.flatnonzero(present)[different[0]])
            msg = (
                f"{where}: evaluation {number} is not the design this search asks for, so the"
                " archive was made by another version of the program or its libraries;"
                " continue it with that version, or begin another folder"
            )
            raise ArchiveMismatchError(msg)
        self.fill(np.flatnonzero(present), outcome)

    def chunks(self, size: int, end: int) -> Iterator[tuple[int, IntArray]]:
        """Chunks with rows still missing below evaluation ``end``.

        Yields
        ------
        start : int
            First row of the chunk, which holds ``size`` rows or those left of the generation.
        rows : (n,) array of int
            Those of them to be stored.
        """
        missing = ~self.present & (self.first + np.arange(len(self)) < end)
        for start in range(0, len(self), size):
            rows = start + np.flatnonzero(missing[start : start + size])
            if len(rows):
                yield start, rows

    def outcome(self) -> Outcome:
        """Return all rows; those not evaluated have a status that is not ``"ok"``."""
        return Outcome(self._objectives, self._constraints, self._status.astype(np.str_))
