"""Evaluating on many machines: those of a cluster that Dask's scheduler keeps together."""

from __future__ import annotations

import contextlib
import hashlib
import logging
import time
import uuid
import warnings
from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import Any

from optimizer.errors import ClusterError, ProblemError
from optimizer.problem import Problem
from optimizer.workers.dispatch import Chunk, Closing, Finished
from optimizer.workers.errands import Errand, Errands
from optimizer.workers.pool import checked_limit, pickled
from optimizer.workers.remote import (
    Misfit,
    Order,
    Parcel,
    Wanted,
    evaluate_order,
    installed_versions,
)

PER_THREAD = 2  # chunks outstanding for each thread of a worker: the next is there when one is done
CONNECT_S = 10.0
PATIENCE_S = 600.0  # without any worker
PACKAGES = ("hovergap", "numpy", "scipy", "numba")  # what the last bits of a number depend on
_REFUSALS = 3  # errors of the cluster itself that one chunk may meet
_POLL_S = 0.003
_LOOK_S = 1.0  # between looks at who is there


class Cluster(Closing):
    """Evaluates chunks on the workers of a cluster, as many as there are at any time.

    Chunks are the same as on one machine, and so are the rows, if the same versions are installed
    everywhere and the processors are of one kind. Workers that lack the problem ask for it. A
    chunk whose worker is lost is given to another; one that loses worker after worker is evaluated
    with nothing beside it, then row by row, and a row of which workers die even then becomes a
    failed row with the reason ``"worker died"``.

    Whoever reaches the scheduler's port can run any code on all these machines, and this process
    trusts what they answer.

    Parameters
    ----------
    address : str
        Of the scheduler, such as ``tcp://10.0.0.5:8786``, or the file it has written.
    time_limit_s : float, optional
        As of :class:`optimizer.workers.pool.Pool`.
    packages : iterable of str
        Further packages that must have the same version everywhere.
    patience_s : float
        Seconds to wait while there is no worker.

    Raises
    ------
    ProblemError
        If an argument is out of range.
    ClusterError
        If Dask's package ``distributed`` is missing or nobody answers.
    """

    def __init__(
        self,
        address: str,
        time_limit_s: float | None = None,
        packages: Iterable[str] = (),
        patience_s: float = PATIENCE_S,
    ) -> None:
        self.address, self.time_limit_s = address, checked_limit(time_limit_s)
        self.patience_s = patience_s
        self._versions = installed_versions(dict.fromkeys([*PACKAGES, *packages]))
        self._sent: tuple[Problem, str, Parcel] | None = None
        self._threads, self._seen_at, self._looked_at = 0, time.monotonic(), -_LOOK_S
        self._client = _connected(address)

    def run(self, problem: Problem, chunks: Iterable[Chunk]) -> Iterator[Finished]:
        """Evaluate every chunk; see :class:`optimizer.workers.dispatch.Dispatcher`.

        Raises
        ------
        ClusterError
            If the scheduler is lost, there is no worker for too long, or a worker does not fit.
        """
        work = Errands(problem, chunks)
        running: dict[Any, Errand] = {}
        completed = self._completed()
        try:
            while True:
                self._look()
                while len(running) < self.window and (errand := work.next(len(running))):
                    future = self._submit(problem, errand)
                    running[future] = errand
                    completed.add(future)
                if not running:
                    return
                for future, result in completed.next_batch(block=False):
                    errand = running.pop(future)
                    done = self._settled(work, errand, future.status, result)
                    if done is not None:
                        yield done
                if not completed.has_ready():
                    time.sleep(_POLL_S)
        finally:
            self._cancel(list(running))

    @property
    def window(self) -> int:
        """Chunks that may be outstanding, by the workers seen last."""
        return max(1, PER_THREAD * self._threads)

    def close(self) -> None:
        """Leave the cluster; its workers stay."""
        with contextlib.suppress(Exception):  # whatever has become of it, it is left
            self._client.close(timeout=_LOOK_S)

    def _completed(self) -> Any:
        from distributed import as_completed

        return as_completed(loop=self._client.loop, with_results=True, raise_errors=False)

    def _submit(self, problem: Problem, errand: Errand) -> Any:
        digest, parcel = self._parcel(problem)
        order = Order(
            digest,
            errand.unit.chunk,
            self.time_limit_s,
            self._versions,
            parcel if errand.wanted else None,
        )
        try:
            # To whichever worker: where only the one that asked would do, or would be preferred,
            # an errand waits for ever once that is gone.
            return self._client.submit(
                evaluate_order, order, key=f"evaluate-{uuid.uuid4().hex}", pure=False
            )
        except Exception as error:  # of the client's many parts
            raise self._lost(error) from error

    def _parcel(self, problem: Problem) -> tuple[str, Parcel]:
        if self._sent is None or self._sent[0] is not problem:
            data = pickled(problem)
            parcel = Parcel(
                tuple(problem.objectives), tuple(problem.constraints), tuple(problem.columns), data
            )
            self._sent = (problem, hashlib.sha256(data).hexdigest(), parcel)
        return self._sent[1:]

    def _settled(self, work: Errands, errand: Errand, status: str, result: Any) -> Finished | None:
        """Take what came of an errand; returns a chunk that is complete by that."""
        work.back(errand)
        if status != "finished":
            return self._broken(work, errand, status, result)
        if isinstance(result, Finished):
            return errand.unit.settle(result)
        if isinstance(result, Wanted):
            errand.wanted = True
            work.again(errand)
            return None
        if isinstance(result, Misfit):
            msg = (
                f"the worker {result.address} of the cluster does not fit: {result.text}; install "
                "the same versions on every machine"
            )
            raise ClusterError(msg)
        if isinstance(result, ProblemError):
            raise result
        msg = f"the cluster {self.address} answered with {type(result).__name__}"
        raise ClusterError(msg)

    def _broken(self, work: Errands, errand: Errand, status: str, result: Any) -> Finished | None:
        from distributed import KilledWorker

        error = result[1] if isinstance(result, tuple) else result
        if isinstance(error, KilledWorker):
            return work.killed(errand)
        errand.refusals += 1
        if self._client.status != "running":
            raise self._lost(error)
        if errand.refusals >= _REFUSALS:
            text = " ".join(f"{type(error).__name__}: {error}".split())
            msg = (
                f"the cluster {self.address} cannot evaluate ({status}: {text}); is the same "
                "version of this program installed on its scheduler and workers?"
            )
            raise ClusterError(msg)
        work.again(errand)
        return None

    def _look(self) -> None:
        """See now and then who is there.

        Raises
        ------
        ClusterError
            If the scheduler is lost, or no worker has been there for too long.
        """
        now = time.monotonic()
        if now - self._looked_at < _LOOK_S:
            return
        try:
            if self._client.status != "running":
                raise self._lost(None)
            self._threads = sum(self._client.nthreads().values())
        except (OSError, RuntimeError, AttributeError) as error:
            raise self._lost(error) from error
        self._looked_at = now
        if self._threads:
            self._seen_at = now
        elif now - self._seen_at > self.patience_s:
            msg = (
                f"the cluster {self.address} has had no worker for {self.patience_s:g} s; start "
                "workers and go on"
            )
            raise ClusterError(msg)

    def _lost(self, error: BaseException | None) -> ClusterError:
        if isinstance(error, ClusterError):
            return error
        return ClusterError(f"the scheduler of the cluster {self.address} is lost")

    def _cancel(self, futures: list[Any]) -> None:
        if futures and self._client.status == "running":
            with contextlib.suppress(Exception):  # it may be lost meanwhile
                self._client.cancel(futures)


def _connected(address: str) -> Any:
    """A client of a scheduler.

    Raises
    ------
    ClusterError
        If there is none.
    """
    try:
        from distributed import Client, Security
    except ImportError as error:
        msg = (
            "a cluster needs the package distributed, which is not installed; install it with: "
            "pip install 'hovergap[cluster]'"
        )
        raise ClusterError(msg) from error
    # What it would say is said here, in one sentence each.
    for name in ("distributed", "distributed.client", "distributed.core"):
        logging.getLogger(name).setLevel(logging.CRITICAL)
    where: dict[str, Any] = {"address": address}
    try:
        if Path(address).is_file():
            where = {"scheduler_file": address}
        security = Security()
        if address.startswith("tls:") and not security.get_connection_args("client")["ssl_context"]:
            msg = "tls needs the certificates that Dask's configuration names, comm.tls.client"
            raise ClusterError(msg)
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # of versions, which every worker compares itself
            return Client(**where, security=security, timeout=CONNECT_S, set_as_default=False)
    except Exception as error:  # wrong schemes, names, ports, files, certificates, versions
        text = " ".join(str(error).split()) or type(error).__name__
        msg = (
            f"no scheduler of a cluster answers at {address!r} ({text}); give its address, such as "
            "tcp://10.0.0.5:8786, or the file it has written"
        )
        raise ClusterError(msg) from error
