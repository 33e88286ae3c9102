"""How one archive is searched."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

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
