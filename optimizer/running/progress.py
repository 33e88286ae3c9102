"""What a run tells while it goes on and when it ends."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path


@dataclass(frozen=True)
class Progress:
    """State of a run at one moment.

    Parameters
    ----------
    evaluations, budget : int
        Rows stored or about to be, and rows wanted.
    feasible, failed : int
        Rows that meet every constraint; rows that could not be evaluated.
    front_size : int
        Feasible rows that no other feasible row dominates.
    hypervolume : float
        Volume the front dominates, in the box spanned by the best and the worst value per
        objective of the first 20 (or more, to the end of that generation) feasible rows; the
        worst corner is the reference point. 0 until there are so many. The box never moves,
        so the figure never falls within a study, and passes 1 once the front leaves the box.
        From six objectives on it is an estimate.
    rate : float
        New evaluations a second over the last 30 seconds; rows taken from the archive do not
        count. NaN until one was made.
    seconds_left : float
        At that rate; NaN if unknown.
    first_feasible : int, optional
        Evaluation that gave the first feasible row.
    """

    evaluations: int
    budget: int
    feasible: int
    failed: int
    front_size: int
    hypervolume: float
    rate: float
    seconds_left: float
    first_feasible: int | None


@dataclass(frozen=True)
class Summary:
    """What a run leaves behind; the first fields as in :class:`Progress`.

    Parameters
    ----------
    new : int
        Rows this run added to the archive; the others it found there.
    seconds : float
        Wall time of this run.
    stopped : bool
        Whether ``stop`` ended it before the budget was used.
    ended : str
        Which stop rule ended it before that, in words; empty if none did.
    damaged : tuple of Path
        Where parts that could not be read were set aside; their rows were evaluated again.
    folder : Path
        The archive.
    """

    evaluations: int
    budget: int
    feasible: int
    failed: int
    front_size: int
    hypervolume: float
    first_feasible: int | None
    new: int
    seconds: float
    stopped: bool
    damaged: tuple[Path, ...]
    folder: Path
    ended: str = ""
