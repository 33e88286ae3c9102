"""Which study the evaluations in a folder belong to, and how it differs from the one there."""

from __future__ import annotations

import hashlib
import json
import tomllib
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from optimizer.archive.identity import differences
from studies.errors import ResultsError
from studies.stored.layout import STUDY_FILE, Results, changed_keys, studies_in
from studies.stored.naming import split_search_name
from studies.study_file.definition import Study

SPENDING_KEYS = (
    "evaluations_per_family",
    "searches_per_family",
    "total_evaluations",
    "stagnation_generations",
    "stagnation_gain",
    "feasible_within",
    "wall_time_min",
    "time_limit_s",
)
"""Keys of [search] that decide how many designs are evaluated, but not which."""
MOST_SAID = 5  # keys in one message


def study_digest(study: Study) -> str:
    """SHA-256 of what decides the results: the study without its description and its budgets.

    Comments and layout do not count, so they may be edited in the frozen copy too.
    """
    text = json.dumps(_deciding(study.content), sort_keys=True)
    return hashlib.sha256(text.encode()).hexdigest()


def labels_of(study: Study, search: str) -> dict[str, str]:
    """What an archive is labelled with; `search` is the name of one of the study's searches."""
    name, number = split_search_name(search)
    family = study.winding(name).family
    return {
        "study": study.name,
        "study_digest": study_digest(study),
        "family": family.id,
        "coil_pitch": str(family.coil_pitch),
        **({"search": str(number)} if number > 1 else {}),
    }


def check_owner(results: Results, search: str, settings: Mapping[str, Any]) -> None:
    """Check that an archive belongs to the study it lies in.

    Parameters
    ----------
    results : Results
    search : str
        Name of the search whose folder it lies in.
    settings : mapping
        What the archive says it belongs to.

    Raises
    ------
    ResultsError
        Saying what differs, in the words of the study file where the other study is at hand.
    """
    study, labels = results.study, settings.get("labels", {})
    family = split_search_name(search)[0]
    here = {
        **settings,
        "labels": {**labels, **{k: v for k, v in labels_of(study, search).items() if k in labels}},
        "objectives": [goal.name for goal in study.objectives],
        "constraints": [limit.name for limit in study.limits],
    }
    if here == settings:
        return
    digest = labels.get("study_digest")
    other = _content_of(results, digest) if digest != study_digest(study) else None
    if other is not None:
        lines = changed_keys(_deciding(other), _deciding(study.content))
        more = [f"and {len(lines) - MOST_SAID} more"] if len(lines) > MOST_SAID else []
        said = [*lines[:MOST_SAID], *more]
    else:
        bounds = study.bounds[family]
        here["variables"] = [
            [name, *map(float, bounds[name]), *kind] if name in bounds else [name, low, high, *kind]
            for name, low, high, *kind in settings.get("variables", [])
        ]
        if settings.get("evaluator") and digest != study_digest(study):
            here["evaluator"] = study.evaluator.name
        said = differences(settings, here)
    msg = (
        f"{results.folder / search}: holds another study than {results.folder / STUDY_FILE} says"
        f" ({'; '.join(said)}); put the study or the folder {search} back"
    )
    raise ResultsError(msg)


def _deciding(content: bytes) -> dict[str, Any]:
    table = tomllib.loads(content.decode("utf-8-sig"))
    table["study"].pop("description", None)
    for key in SPENDING_KEYS:
        table.get("search", {}).pop(key, None)
    for key in ("list", "slots", "pole_pairs"):  # each family has its own archive
        table["families"].pop(key, None)
    return table


def _content_of(results: Results, digest: object) -> bytes | None:
    """The study file of that digest, if it lies in the same results or where this one came from."""
    folders = studies_in(results.folder.parent)
    for file in [Path(results.request.origin), *(folder / STUDY_FILE for folder in folders)]:
        try:
            content = file.read_bytes()
            text = json.dumps(_deciding(content), sort_keys=True)
        except (OSError, ValueError, KeyError, AttributeError, RecursionError):
            continue
        if hashlib.sha256(text.encode()).hexdigest() == digest:
            return content
    return None
