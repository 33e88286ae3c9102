"""Which families a study searches: listed one by one, or by a rule over slots and pole pairs."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from evaluators.machine.winding.families import (
    Refusal,
    WindingError,
    design_winding,
    enumerate_families,
)
from evaluators.machine.winding.winding import Winding
from studies.errors import Finding, Path, quoted
from studies.study_file.crosschecks import Bounds, check_bounds
from studies.study_file.schema import FamilyEntry
from studies.study_file.sections import validated
from studies.suggestions import suggest, unknown

FAMILY_ID = re.compile(r"Q(\d{1,3})p(\d{1,2})s(\d{1,2})")
KEYS = ("list", "slots", "pole_pairs", "variables")
SLOT_RANGE = (3, 360)
POLE_PAIR_RANGE = (1, 60)
MOST_COMBINATIONS = 2000  # keeps the longest rule within seconds


@dataclass(frozen=True)
class FamilyChoice:
    """Windings to search, what the rule left out, and bounds of single families."""

    windings: tuple[Winding, ...]
    refused: tuple[Refusal, ...]
    bounds: Mapping[str, Mapping[str, Bounds]]


def check_families(table: object) -> tuple[FamilyChoice, list[Finding]]:
    """Read the section ``families``."""
    path: Path = ("families",)
    if not isinstance(table, dict):
        problem = f"must be a table (got {quoted(table)})"
        return FamilyChoice((), (), {}), [Finding(path, problem, "write [families] above its keys")]
    findings = [
        Finding((*path, key), f"{unknown('key', key)} in this section", suggest(key, KEYS))
        for key in table
        if key not in KEYS
    ]
    listed = "list" in table
    ruled = "slots" in table or "pole_pairs" in table
    windings: list[Winding] = []
    refused: list[Refusal] = []
    if listed == ruled:
        problem = "both a list and a rule" if listed else "neither a list nor a rule"
        remedy = 'give list = ["Q12p4s5", ...], or slots = [...] with pole_pairs = [...]'
        findings.append(Finding(path, f"{problem} of families", remedy))
    elif listed:
        windings, wrong = _listed(table["list"])
        findings += wrong
    else:
        windings, refused, wrong = _ruled(table)
        findings += wrong
    bounds, wrong = _own_bounds(table.get("variables", {}), windings, bool(findings))
    return FamilyChoice(tuple(windings), tuple(refused), bounds), findings + wrong


def _listed(entries: object) -> tuple[list[Winding], list[Finding]]:
    path: Path = ("families", "list")
    if not isinstance(entries, list) or not entries:
        problem = f"must be a list of families (got {quoted(entries)})"
        return [], [Finding(path, problem, 'write ["Q12p4s5", ...]')]
    windings: list[Winding] = []
    findings: list[Finding] = []
    for index, entry in enumerate(entries):
        here = (*path, index)
        found, wrong = _entry(entry, here)
        findings += wrong
        if found is None:
            continue
        try:
            winding = design_winding(
                found.slots, found.pole_pairs, found.suspension_pole_pairs, found.coil_pitch
            )
        except WindingError as error:
            remedy = "`hovergap families` lists what can be wound"
            findings.append(Finding(here, str(error), remedy))
            continue
        if winding.family.id in {item.family.id for item in windings}:
            problem = f"{winding.family.id} is listed twice"
            findings.append(Finding(here, problem, "list each family once, with one coil pitch"))
            continue
        windings.append(winding)
    return windings, findings


def _entry(entry: object, path: Path) -> tuple[FamilyEntry | None, list[Finding]]:
    """A family written as its id, as id with coil pitch, or in full."""
    table = entry
    identity = entry if isinstance(entry, str) else None
    if isinstance(entry, dict) and "id" in entry:
        identity = entry["id"]
        table = {key: value for key, value in entry.items() if key != "id"}
    if identity is not None:
        match = FAMILY_ID.fullmatch(identity) if isinstance(identity, str) else None
        if match is None:
            problem = f"{quoted(identity)} is no family"
            remedy = "write slots, pole pairs and suspension pole pairs as in 'Q12p4s5'"
            return None, [Finding(path, problem, remedy)]
        numbers = dict(
            zip(
                ("slots", "pole_pairs", "suspension_pole_pairs"),
                (int(group) for group in match.groups()),
                strict=True,
            )
        )
        table = {**(table if isinstance(table, dict) else {}), **numbers}
    if not isinstance(table, dict):
        problem = f"is no family (got {quoted(entry)})"
        return None, [Finding(path, problem, "write 'Q12p4s5' or { id = ..., coil_pitch = ... }")]
    return validated(FamilyEntry, table, path)


def _ruled(table: Mapping[str, Any]) -> tuple[list[Winding], list[Refusal], list[Finding]]:
    slots, wrong_slots = _numbers(table.get("slots"), "slots", SLOT_RANGE)
    pairs, wrong_pairs = _numbers(table.get("pole_pairs"), "pole_pairs", POLE_PAIR_RANGE)
    findings = wrong_slots + wrong_pairs
    path: Path = ("families",)
    if findings:
        return [], [], findings
    if 2 * len(slots) * len(pairs) > MOST_COMBINATIONS:
        problem = f"the rule makes {2 * len(slots) * len(pairs):,} combinations"
        remedy = f"keep it below {MOST_COMBINATIONS:,}"
        return [], [], [Finding(path, problem, remedy)]
    results = enumerate_families(slots, pairs)
    windings = [item for item in results if isinstance(item, Winding)]
    refused = [item for item in results if isinstance(item, Refusal)]
    if not windings:
        problem = f"none of these can be wound, for example {refused[0].reason}"
        remedy = "`hovergap families` lists what can be wound"
        return [], refused, [Finding(path, problem, remedy)]
    return windings, refused, []


def _numbers(value: object, key: str, span: tuple[int, int]) -> tuple[list[int], list[Finding]]:
    path: Path = ("families", key)
    wanted = f"give a list of whole numbers from {span[0]} to {span[1]}"
    if not isinstance(value, list) or not value:
        got = "is missing" if value is None else f"must be a list (got {quoted(value)})"
        return [], [Finding(path, got, wanted)]
    numbers: list[int] = []
    findings = []
    for index, item in enumerate(value):
        here = (*path, index)
        if isinstance(item, bool) or not isinstance(item, int) or not span[0] <= item <= span[1]:
            findings.append(Finding(here, f"cannot be used (got {quoted(item)})", wanted))
        elif item in numbers:
            findings.append(Finding(here, f"{item} is listed twice", "list it once"))
        else:
            numbers.append(item)
    return numbers, findings


def _own_bounds(
    table: object, windings: list[Winding], incomplete: bool
) -> tuple[dict[str, dict[str, Bounds]], list[Finding]]:
    path: Path = ("families", "variables")
    if not isinstance(table, dict):
        problem = f"must be a table (got {quoted(table)})"
        return {}, [Finding(path, problem, "write [families.variables.Q12p4s5] above the bounds")]
    known = [winding.family.id for winding in windings]
    bounds: dict[str, dict[str, Bounds]] = {}
    findings: list[Finding] = []
    for family, entry in table.items():
        here = (*path, family)
        if family not in known:
            if not incomplete:  # else the family may only be missing because of another mistake
                problem = f"{unknown('family', family)} in this study"
                findings.append(Finding(here, problem, suggest(family, known)))
        elif not isinstance(entry, dict):
            problem = f"must be a table of bounds (got {quoted(entry)})"
            findings.append(Finding(here, problem, f"write [families.variables.{family}] above"))
        else:
            bounds[family], wrong = check_bounds(entry, here, required=False)
            findings += wrong
    return bounds, findings
