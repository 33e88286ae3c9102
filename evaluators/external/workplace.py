"""The working folder of one design: made for a run, kept or removed after it."""

from __future__ import annotations

import hashlib
import shutil
import tempfile
from collections.abc import Mapping
from contextlib import suppress
from pathlib import Path

from evaluators.external.licences import private_folder
from evaluators.external.settings import ExternalSettings

REASON = "reason.txt"


class Workplace:
    """Makes and clears working folders below one folder."""

    def __init__(self, settings: ExternalSettings) -> None:
        self._settings = settings
        self._failures = 0

    def open(self, files: Mapping[str, bytes]) -> Path:
        """A new folder that holds `files`.

        Raises
        ------
        OSError
            If it cannot be made.
        """
        if self._settings.folder:
            root = Path(self._settings.folder).absolute()
            root.mkdir(parents=True, exist_ok=True)
        else:
            root = private_folder("hovergap-external")
        folder = Path(tempfile.mkdtemp(prefix="running-", dir=root))
        for name, content in files.items():
            (folder / name).write_bytes(content)
        return folder

    def close(self, folder: Path, name: str, reason: str) -> None:
        """Remove the folder, or keep it as `name`; `reason` is empty where all went well."""
        keep = self._settings.keep == "all"
        if reason and self._settings.keep == "failed":
            keep = self._failures < self._settings.kept_failures
            self._failures += 1
        if not keep:
            shutil.rmtree(folder, ignore_errors=True)
            return
        kept = folder.with_name(name)
        with suppress(OSError):  # the run has its result; a folder less is no reason to lose it
            if reason:
                (folder / REASON).write_text(f"{reason}\n", encoding="utf-8")
            shutil.rmtree(kept, ignore_errors=True)  # of an earlier run of the same design
            folder.rename(kept)


def folder_name(request: bytes) -> str:
    """Name under which a design's folder is kept, the same for the same request."""
    return f"design-{hashlib.sha256(request).hexdigest()[:12]}"
