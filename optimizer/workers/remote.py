"""What runs inside a worker of a cluster: each of its threads hands its chunk to a process.

So an evaluation that dies or hangs costs its own process and not the cluster's worker, all
processors of a machine are used, and an evaluation finds the same surroundings as on one machine.
"""

from __future__ import annotations

import platform
import tempfile
import threading
import time
from collections import OrderedDict
from collections.abc import Iterable
from dataclasses import dataclass
from functools import cache
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path

from optimizer.errors import ProblemError
from optimizer.problem import Column
from optimizer.workers.crew import Crew
from optimizer.workers.dispatch import Chunk, Finished
from optimizer.workers.pool import store_problem

_IDLE_S = 60.0  # that a process is kept without work: the cluster's machines are shared
_KEPT = 8  # problems; one is in use, others may serve another search on the same cluster


@dataclass(frozen=True)
class Parcel:
    """A problem as it travels: what its outcomes consist of, and the whole of it, pickled."""

    objectives: tuple[str, ...]
    constraints: tuple[str, ...]
    columns: tuple[Column, ...]
    data: bytes


@dataclass(frozen=True)
class Order:
    """One chunk to be evaluated.

    Attributes
    ----------
    problem : str
        Digest of the problem's parcel.
    chunk : Chunk
    time_limit_s : float or None
        As of :class:`optimizer.workers.pool.Pool`.
    versions : tuple of (package, version)
        What must be installed.
    parcel : Parcel or None
        Only for a worker that said it has none.
    """

    problem: str
    chunk: Chunk
    time_limit_s: float | None
    versions: tuple[tuple[str, str], ...]
    parcel: Parcel | None = None


@dataclass(frozen=True)
class Wanted:
    """The worker does not know the problem yet."""


@dataclass(frozen=True)
class Misfit:
    """The worker at this address would give other numbers, or none; the text says why."""

    address: str
    text: str


Answer = Finished | Wanted | Misfit | ProblemError


def installed_versions(packages: Iterable[str]) -> tuple[tuple[str, str], ...]:
    """Versions of Python and of packages, ``"none"`` for what is not installed."""
    return tuple((package, _version(package)) for package in ("python", *packages))


def evaluate_order(order: Order) -> Answer:
    """Evaluate a chunk in a process of this machine."""
    from distributed import get_worker

    worker = get_worker()
    for package, wanted in order.versions:
        found = _version(package)
        if found != wanted:
            return Misfit(worker.address, f"{package} is {found} there and {wanted} here")
    parcel, path = _known(order, Path(worker.local_directory))
    if parcel is None or path is None:
        return Wanted()
    crew = _take_crew()
    try:
        return list(crew.run(parcel, path, [order.chunk], order.time_limit_s))[0]  # noqa: RUF015
    except ProblemError as error:
        return error
    finally:
        _put_crew(crew)


@cache
def _version(package: str) -> str:
    if package == "python":
        return ".".join(platform.python_version_tuple()[:2])
    try:
        return version(package)
    except PackageNotFoundError:
        return "none"


_lock = threading.Lock()
_problems: OrderedDict[str, tuple[Parcel, Path]] = OrderedDict()
_idle: list[tuple[float, Crew]] = []  # with the time since when, the latest last


def _known(order: Order, folder: Path) -> tuple[Parcel | None, Path | None]:
    """The problem of an order, kept from now on if the order brings it."""
    with _lock:
        if order.problem not in _problems and order.parcel is not None:
            private = Path(tempfile.mkdtemp(prefix="problem-", dir=folder))
            path = store_problem(order.parcel.data, private)
            _problems[order.problem] = (order.parcel, path)
        if order.problem not in _problems:
            return None, None
        _problems.move_to_end(order.problem)
        while len(_problems) > _KEPT:
            _, (_, old) = _problems.popitem(last=False)
            old.unlink(missing_ok=True)
        return _problems[order.problem]


def _take_crew() -> Crew:
    with _lock:
        return _idle.pop()[1] if _idle else Crew(1)


def _put_crew(crew: Crew) -> None:
    with _lock:
        if not _idle:
            threading.Thread(target=_dismiss_idle, daemon=True).start()
        _idle.append((time.monotonic(), crew))


def _dismiss_idle() -> None:
    """End processes without work, until none is idle."""
    while True:
        time.sleep(_IDLE_S / 4.0)
        with _lock:
            over = [item for item in _idle if time.monotonic() - item[0] > _IDLE_S]
            _idle[:] = [item for item in _idle if item not in over]
            done = not _idle
        for _, crew in over:
            crew.close()
        if done:
            return
