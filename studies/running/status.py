"""State of a study's results, also while they are being written."""

from __future__ import annotations

from typing import Any

from optimizer.archive.lock import LOCK_NAME, writer_lock
from optimizer.errors import ArchiveError, ArchiveLockedError
from studies.running.ended import ended_families
from studies.stored.families import stored_families
from studies.stored.layout import Results
from studies.stored.naming import family_of, search_names, split_search_name


def study_status(results: Results) -> dict[str, Any]:
    """State of every search of every family as values of JSON."""
    budget = results.request.evaluations_per_family
    asked = tuple(item for item in results.study.families if item in results.request.families)
    wanted = search_names(asked, results.request.searches_per_family)
    stored = {item.name: item for family in stored_families(results) for item in family.searches}
    notes = ended_families(results)
    families: list[dict[str, Any]] = []
    damaged: list[str] = []
    for name in _names(results, wanted, tuple(stored)):
        family, search = split_search_name(name)
        entry: dict[str, Any] = {
            "family": family,
            "search": search,
            "evaluations": 0,
            "budget": budget if name in wanted else 0,
            "feasible": 0,
            "failed": 0,
            "front_size": 0,
            "ended": False,
            "state": "not begun" if name in wanted else "left out",
        }
        if name in stored:
            evaluations, feasible, failed = stored[name].counts
            entry |= {
                "evaluations": evaluations,
                "feasible": feasible,
                "failed": failed,
                "front_size": stored[name].front.num_rows,
            }
            if name in wanted:
                entry["state"] = "complete" if evaluations >= budget else "begun"
            note = notes.get(name)
            if name in wanted and note is not None and evaluations == note.evaluations < budget:
                entry |= {"state": note.state, "ended": note.final}
            damaged += [str(path) for path in stored[name].reader.damaged]
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


def _names(results: Results, wanted: tuple[str, ...], stored: tuple[str, ...]) -> tuple[str, ...]:
    """Searches that are asked for or stored, and families never searched, in the study's order."""
    first = results.study.families
    return tuple(
        sorted(
            {*first, *wanted, *stored},
            key=lambda name: (first.index(family_of(name)), split_search_name(name)[1]),
        )
    )


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
