"""State of a study's results, also while they are being written."""

from __future__ import annotations

from typing import Any

from optimizer.archive.lock import LOCK_NAME, writer_lock
from optimizer.errors import ArchiveError, ArchiveLockedError
from studies.running.ended import ended_families
from studies.stored.families import stored_families
from studies.stored.layout import Results


def study_status(results: Results) -> dict[str, Any]:
    """State of every family as values of JSON."""
    budget = results.request.evaluations_per_family
    stored = {item.family: item for item in stored_families(results)}
    notes = ended_families(results)
    families: list[dict[str, Any]] = []
    damaged: list[str] = []
    for family in results.study.families:
        wanted = family in results.request.families
        entry: dict[str, Any] = {
            "family": family,
            "evaluations": 0,
            "budget": budget if wanted else 0,
            "feasible": 0,
            "failed": 0,
            "front_size": 0,
            "ended": False,
            "state": "not begun" if wanted else "left out",
        }
        if family in stored:
            evaluations, feasible, failed = stored[family].counts
            entry |= {
                "evaluations": evaluations,
                "feasible": feasible,
                "failed": failed,
                "front_size": stored[family].front.num_rows,
                "state": "complete" if evaluations >= budget else "begun",
            }
            note = notes.get(family)
            if note is not None and evaluations == note.evaluations < budget:
                entry |= {"state": note.state, "ended": note.final}
            damaged += [str(path) for path in stored[family].reader.damaged]
        families.append(entry)
    if being_written(results):
        state = "being searched now"
    elif all(entry["state"] in ("complete", "left out") or entry["ended"] for entry in families):
        state = "complete"
    else:
        state = f"to be continued with: hovergap resume {results.folder}"
    return {
        "study": results.study.name,
        "folder": str(results.folder),
        "state": state,
        "seed": results.request.seed,
        "families": families,
        "damaged_parts": damaged,
    }


def being_written(results: Results) -> bool:
    """Whether some process holds the study's lock."""
    if not (results.folder / LOCK_NAME).exists():
        return False
    try:
        with writer_lock(results.folder):
            return False
    except ArchiveLockedError:
        return True
    except ArchiveError:  # a folder that may only be read is not written by this user either
        return False
