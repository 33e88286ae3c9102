"""Errors of this package: each is one sentence that says what, where and what would be right."""

from __future__ import annotations

import errno
from pathlib import Path


class OptimizerError(Exception):
    """Base of every error this package raises on purpose."""


class ProblemError(OptimizerError, ValueError):
    """A problem, its settings or what its evaluation returned breaks the contract."""


class WorkerError(OptimizerError, RuntimeError):
    """Worker processes cannot be started."""


class ClusterError(OptimizerError, RuntimeError):
    """A cluster cannot be reached, is lost, or its machines do not fit together."""


class ArchiveError(OptimizerError, OSError):
    """An archive cannot be read or written."""

    def __str__(self) -> str:
        # OSError formats (errno, text) pairs; here the sentence alone is wanted.
        return str(self.args[0]) if self.args else ""


class ArchiveLockedError(ArchiveError):
    """Another process is writing this archive."""


class ArchiveMismatchError(ArchiveError):
    """An archive belongs to another problem, other settings or another version."""


def storage_error(error: OSError, path: Path, action: str) -> ArchiveError:
    """Turn an error of the operating system into one sentence that names the file.

    Parameters
    ----------
    error : OSError
        What the operating system said.
    path : Path
        The file concerned.
    action : str
        What was being done, as an infinitive: ``"write"``, ``"read"``.
    """
    reasons = {
        errno.ENOSPC: "the disk is full; make room and run the same command again",
        errno.EDQUOT: "the disk quota is used up; make room and run the same command again",
        errno.EACCES: "permission is denied; check the owner and mode of the folder",
        errno.EPERM: "permission is denied; check the owner and mode of the folder",
        errno.EROFS: "the file system is read-only; choose another folder",
        errno.EFBIG: "the file would be larger than allowed; raise the limit (ulimit -f)",
        errno.ENOTDIR: "a part of its path is a file, not a folder",
        errno.EISDIR: "it is a folder, not a file",
        errno.EIO: "the disk reports an input/output error",
    }
    code = error.errno if error.errno is not None else 0
    reason = reasons.get(code, error.strerror or str(error))
    return ArchiveError(f"cannot {action} {path}: {reason} (nothing already stored is lost)")
