"""Why families ended before their budget was used, beside their archives."""

from __future__ import annotations

import json
from dataclasses import asdict, dataclass

from optimizer.archive.durable import write_durably
from studies.stored.layout import Results

ENDED_FILE = "ended.json"
_LARGEST = 10_000_000  # bytes


@dataclass(frozen=True)
class Ended:
    """How one family ended.

    Attributes
    ----------
    evaluations : int
        It held then; with more the note is out of date.
    reason : str
    final : bool
        Whether going on would end it again; False if only the time ran out.
    """

    evaluations: int
    reason: str
    final: bool

    @property
    def state(self) -> str:
        """The state of the family in words."""
        return f"ended: {self.reason}" if self.final else f"begun: {self.reason}"


def ended_families(results: Results) -> dict[str, Ended]:
    """Notes by family; none if the file is missing or damaged, for it only informs."""
    file = results.folder / ENDED_FILE
    try:
        if file.stat().st_size > _LARGEST:
            return {}
        table = json.loads(file.read_bytes())
        return {
            str(family): Ended(int(note["evaluations"]), str(note["reason"]), bool(note["final"]))
            for family, note in table.items()
        }
    except (OSError, ValueError, KeyError, TypeError, AttributeError, RecursionError):
        return {}


def note_end(results: Results, family: str, ended: Ended | None) -> None:
    """Write how a family ended, or take back what was written.

    Raises
    ------
    ArchiveError
        If it cannot be written.
    """
    notes = ended_families(results)
    if notes.get(family) == ended:
        return
    notes.pop(family, None)
    if ended is not None:
        notes[family] = ended
    text = json.dumps({name: asdict(note) for name, note in notes.items()}, indent=2)
    write_durably(results.folder / ENDED_FILE, (text + "\n").encode())
