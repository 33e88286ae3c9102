"""What a run tells while it goes on and when it ends."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

from optimizer.errors import ProblemError


@dataclass(frozen=True)
class Settings:
    """How one archive is searched.

    All but ``budget`` decide which designs are evaluated, so all but ``budget`` must stay the
    same when an archive is continued; a larger budget extends it.

    Parameters
    ----------
    budget : int
        Evaluations the archive shall hold.
    seed : int
        Seed of the search, >= 0.
    population : int, optional
        Wanted population; default about 40, from four objectives on about 100.
    chunk : int
        Designs evaluated by one call. Fixed by the study, never by the number of workers,
        because the last bits of an array operation may depend on the length of the array.
    evaluator, evaluator_version : str
        Stored in every row.
    labels : mapping of str to str
        What else must agree when the archive is continued, for example a digest of the study.
    """

    budget: int
    seed: int = 1
    population: int | None = None
    chunk: int = 25
    evaluator: str = ""
    evaluator_version: str = ""
    labels: Mapping[str, str] = field(default_factory=dict)

    def __post_init__(self) -> None:
        if isinstance(self.seed, int) and self.seed >= 2**63:
            msg = f"seed is {self.seed!r}; a whole number below 2**63 is wanted"
            raise ProblemError(msg)
        checks = {"budget": (self.budget, 1), "seed": (self.seed, 0), "chunk": (self.chunk, 1)}
        if self.population is not None:
            checks["population"] = (self.population, 4)
        for name, (value, least) in checks.items():
            if isinstance(value, bool) or not isinstance(value, int) or value < least:
                msg = f"{name} is {value!r}; a whole number of at least {least} is wanted"
                raise ProblemError(msg)


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
