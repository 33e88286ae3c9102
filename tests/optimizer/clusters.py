"""Clusters of processes on this machine, reached through its own address only."""

from __future__ import annotations

import contextlib
import json
import os
import signal
import subprocess
import sys
import time
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Self

STARTED_WITHIN_S = 60.0  # on a busy machine


class LocalCluster:
    """A scheduler and workers as separate processes.

    Parameters
    ----------
    folder : Path
        For their files.
    environment : mapping
    workers : int
        With one thread each.
    nanny : bool
        Whether workers that die are started again.
    """

    def __init__(
        self, folder: Path, environment: Mapping[str, str], workers: int = 2, nanny: bool = True
    ) -> None:
        self._folder = folder
        self._environment = {
            **environment,
            # One death is enough: whom to blame is found out here.
            "DASK_DISTRIBUTED__SCHEDULER__ALLOWED_FAILURES": "0",
        }
        self.file = folder / "scheduler.json"
        self._log = (folder / "log").open("w")
        self._processes: list[subprocess.Popen[bytes]] = []
        self.scheduler = self._start(
            "scheduler", "--host", "127.0.0.1", "--port", "0", "--scheduler-file", str(self.file)
        )
        self.add_workers(workers, nanny)

    @property
    def address(self) -> str:
        """Of the scheduler."""
        deadline = time.monotonic() + STARTED_WITHIN_S
        while time.monotonic() < deadline:
            with contextlib.suppress(FileNotFoundError, ValueError):
                return str(json.loads(self.file.read_text())["address"])
            time.sleep(0.05)
        raise TimeoutError((self._folder / "log").read_text())

    def add_workers(self, workers: int, nanny: bool = True) -> None:
        """Start workers."""
        self._start(
            *("worker", "--host", "127.0.0.1", "--scheduler-file", str(self.file)),
            *("--nworkers", str(workers), "--nthreads", "1"),
            *("--nanny" if nanny else "--no-nanny", "--local-directory", str(self._folder)),
        )

    def _start(self, *arguments: str) -> subprocess.Popen[bytes]:
        process = subprocess.Popen(
            [sys.executable, "-m", "dask", *arguments, "--no-dashboard"],
            stdout=self._log,
            stderr=self._log,
            cwd=self._folder,
            env=self._environment,
            process_group=0,
        )
        self._processes.append(process)
        return process

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *raised: object) -> None:
        for process in reversed(self._processes):
            with contextlib.suppress(ProcessLookupError):
                os.killpg(process.pid, signal.SIGKILL)
            process.wait()
        self._log.close()


@contextlib.contextmanager
def local_cluster(folder: Path, environment: Mapping[str, str], **options: int) -> Iterator[str]:
    """Address of a cluster for a while."""
    with LocalCluster(folder, environment, **options) as cluster:
        yield cluster.address
