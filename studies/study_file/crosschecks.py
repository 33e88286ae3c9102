"""Sections whose keys are names: variables, families, limits, objectives, materials."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any, Literal

from evaluators.machine.geometry.variables import VARIABLES, DesignVariable
from evaluators.machine.metrics import METRIC
from studies.errors import Finding, Path, quoted
from studies.study_file.physical import possible_range, range_words
from studies.study_file.schema import LimitEntry, ObjectiveEntry
from studies.study_file.sections import validated
from studies.suggestions import suggest, unknown

Bounds = tuple[float, float]

NAME = re.compile(r"[A-Za-z0-9][A-Za-z0-9._-]*")
LONGEST_NAME = 64
TURNING = "\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069"
"""Characters that change the direction of writing and so can make a text look like another."""
METRIC_LISTING = "`hovergap metrics` lists all"
VARIABLE = {variable.name: variable for variable in VARIABLES}
MOST_OBJECTIVES = 6  # fronts of more objectives hold nearly every design


@dataclass(frozen=True)
class Limit:
    """One bound of one metric."""

    metric: str
    kind: Literal["at_most", "at_least"]
    value: float

    @property
    def name(self) -> str:
        """Name of its margin in the archive."""
        return f"{self.metric}_{self.kind}"

    @property
    def scale(self) -> float:
        """What a violation is divided by: the size of the limit, or 1 for a limit of zero."""
        return abs(self.value) or 1.0

    def text(self) -> str:
        """The limit as a reader would say it."""
        unit = METRIC[self.metric].unit
        words = "at most" if self.kind == "at_most" else "at least"
        return f"{self.metric} {words} {self.value:g}{'' if unit == '1' else ' ' + unit}"


@dataclass(frozen=True)
class Objective:
    """A weighted sum of metrics (often one metric of weight 1) with its sense."""

    name: str
    terms: tuple[tuple[str, float], ...]
    maximise: bool

    @property
    def sign(self) -> float:
        """Factor that turns the value into one to be minimised."""
        return -1.0 if self.maximise else 1.0


def check_name(name: str) -> list[Finding]:
    """Check a study name: it becomes a folder on every operating system."""
    path = ("study", "name")
    remedy = "use letters, digits, '-', '_' and '.', beginning with a letter or digit"
    if len(name) > LONGEST_NAME:
        problem = f"has {len(name):,} characters (got {quoted(name)})"
        return [Finding(path, problem, f"at most {LONGEST_NAME} will do")]
    if "/" in name or "\\" in name:
        return [Finding(path, f"holds a path separator (got {quoted(name)})", remedy)]
    if not NAME.fullmatch(name) or name.endswith("."):
        return [Finding(path, f"cannot name a folder (got {quoted(name)})", remedy)]
    return []


def check_description(text: str) -> list[Finding]:
    """Check free text: it is printed on terminals, which obey control characters."""
    for position, sign in enumerate(text):
        if (unicodedata.category(sign) == "Cc" and sign not in "\n\t") or sign in TURNING:
            problem = f"holds the control character {sign!a} at place {position + 1}"
            return [Finding(("study", "description"), problem, "take it out")]
    return []


def check_bounds(
    table: Mapping[str, Any], path: Path, required: bool
) -> tuple[dict[str, Bounds], list[Finding]]:
    """Read ``name = [low, high]`` or ``name = number`` for design variables."""
    bounds: dict[str, Bounds] = {}
    findings = []
    for name, value in table.items():
        here = (*path, name)
        if name not in VARIABLE:
            problem = f"{unknown('design variable', name)} (got {quoted(value)})"
            listing = f"known are {', '.join(VARIABLE)}"
            findings.append(Finding(here, problem, suggest(name, VARIABLE, listing)))
            continue
        found = _pair(VARIABLE[name], value, here)
        if isinstance(found, Finding):
            findings.append(found)
        else:
            bounds[name] = found
    if required:
        findings += [
            Finding(
                (*path, variable.name),
                "is missing",
                f"give {variable.definition}: [low, high] or one fixed number, {_span(variable)}",
            )
            for variable in VARIABLES
            if variable.name not in table
        ]
    return bounds, findings


def _pair(variable: DesignVariable, value: object, path: Path) -> Bounds | Finding:
    numbers = value if isinstance(value, list) else [value, value]
    plain = [item for item in numbers if isinstance(item, int | float)]
    if len(plain) != 2 or len(numbers) != 2 or any(isinstance(item, bool) for item in plain):
        problem = f"must be [low, high] or one number (got {quoted(value)})"
        return Finding(path, problem, f"give {variable.definition}, {_span(variable)}")
    low, high = float(plain[0]), float(plain[1])
    if low > high:
        problem = f"the bounds are reversed (got {quoted(value)})"
        return Finding(path, problem, f"write [{high:g}, {low:g}]")
    if low < variable.lowest or high > variable.highest:
        problem = f"lies outside the sensible range (got {quoted(value)})"
        remedy = f"stay {_span(variable)}; is the unit right?"
        return Finding(path, problem, remedy)
    return low, high


def _span(variable: DesignVariable) -> str:
    unit = "" if variable.unit == "1" else f" {variable.unit}"
    return f"between {variable.lowest:g} and {variable.highest:g}{unit}"


def check_limits(table: Mapping[str, Any]) -> tuple[tuple[Limit, ...], list[Finding]]:
    """Read ``metric = { at_most = ..., at_least = ... }``."""
    limits: list[Limit] = []
    findings: list[Finding] = []
    for metric, entry in table.items():
        path: Path = ("limits", metric)
        if metric not in METRIC:
            problem = f"{unknown('metric', metric)} to limit"
            findings.append(Finding(path, problem, suggest(metric, METRIC, METRIC_LISTING)))
            continue
        if not isinstance(entry, dict):
            problem = f"must say on which side the limit lies (got {quoted(entry)})"
            remedy = f"write {metric} = {{ at_most = ... }} or {{ at_least = ... }}"
            findings.append(Finding(path, problem, remedy))
            continue
        found, wrong = validated(LimitEntry, entry, path)
        findings += wrong
        if found is None:
            continue
        both = (found.at_least, found.at_most)
        if both == (None, None):
            remedy = "give at_most, at_least or both"
            findings.append(Finding(path, "limits nothing", remedy))
        if None not in both and both[0] > both[1]:  # type: ignore[operator]
            problem = f"at_least {both[0]:g} lies above at_most {both[1]:g}: no design meets both"
            findings.append(Finding(path, problem, "exchange or correct them"))
            continue
        for kind, value in (("at_least", found.at_least), ("at_most", found.at_most)):
            if value is None:
                continue
            low, high = possible_range(metric)
            if not low <= value <= high:
                problem = f"no design can have such a value (got {value:g})"
                remedy = f"{metric} is {range_words(metric)}"
                findings.append(Finding((*path, kind), problem, remedy))
            limits.append(Limit(metric, "at_most" if kind == "at_most" else "at_least", value))
    return tuple(limits), findings


def check_objectives(entries: object) -> tuple[tuple[Objective, ...], list[Finding]]:
    """Read the list of objectives."""
    if not isinstance(entries, list) or not entries:
        remedy = 'write one [[objectives]] table for each, with metric = "..." and sense'
        return (), [Finding(("objectives",), "must be a list of tables", remedy)]
    objectives: list[Objective] = []
    findings: list[Finding] = []
    if len(entries) > MOST_OBJECTIVES:
        problem = f"{len(entries)} objectives are too many to choose by"
        remedy = f"keep at most {MOST_OBJECTIVES}; make the others limits or a weighted sum"
        findings.append(Finding(("objectives",), problem, remedy))
    for index, entry in enumerate(entries):
        path: Path = ("objectives", index)
        found, wrong = validated(ObjectiveEntry, entry, path)
        findings += wrong
        if found is None:
            # What is right in the entry is still checked, so that one run tells every mistake.
            refused = {item.path[len(path)] for item in wrong if len(item.path) > len(path)}
            rest = {k: v for k, v in entry.items() if k not in refused} if refused else None
            found = validated(ObjectiveEntry, rest, path)[0] if rest and "metric" in rest else None
            if found is not None:
                findings += _objective(found, path)[1]
            continue
        objective, wrong = _objective(found, path)
        findings += wrong
        if objective is None:
            continue
        if objective.name in {item.name for item in objectives}:
            problem = f"two objectives are called {quoted(objective.name)}"
            findings.append(Finding(path, problem, "give each its own metric or name"))
        objectives.append(objective)
    return tuple(objectives), findings


def _objective(entry: ObjectiveEntry, path: Path) -> tuple[Objective | None, list[Finding]]:
    if (entry.metric is None) == (entry.weighted_sum is None):
        problem = "must have either metric or weighted_sum"
        return None, [Finding(path, problem, "give exactly one of them")]
    if entry.metric is not None:
        terms: dict[str, float] = {entry.metric: 1.0}
        name = entry.name or entry.metric
        places: dict[str, Path] = {entry.metric: (*path, "metric")}
    else:
        terms = entry.weighted_sum or {}
        name = entry.name or ""
        places = {metric: (*path, "weighted_sum", metric) for metric in terms}
        if not name:
            problem, remedy = "a weighted sum needs a name", 'add name = "..."'
            return None, [Finding(path, problem, remedy)]
        if not any(terms.values()):
            remedy = "give metric names with weights other than zero"
            return None, [Finding((*path, "weighted_sum"), "sums nothing", remedy)]
    if not NAME.fullmatch(name) or len(name) > LONGEST_NAME:
        problem = f"cannot name a column (got {quoted(name)})"
        return None, [Finding((*path, "name"), problem, "use letters, digits, '-', '_' and '.'")]
    findings = [
        Finding(
            places[metric],
            unknown("metric", metric),
            suggest(metric, METRIC, METRIC_LISTING),
        )
        for metric in terms
        if metric not in METRIC
    ]
    if findings:
        return None, findings
    return Objective(name, tuple(terms.items()), entry.sense == "maximise"), []


def check_material(kind: str, name: str, known: Iterable[str], key: str) -> list[Finding]:
    """Check the name of one material."""
    names = list(known)
    if name in names:
        return []
    problem = unknown(kind.replace("_", " "), name)
    remedy = suggest(name, names, f"`hovergap materials` lists all, such as {names[0]!r}")
    return [Finding(("materials", key), problem, remedy)]


LEAST_SHARE = 100  # evaluations a search needs on average before its family can be judged


def check_search(table: object, families: int) -> list[Finding]:
    """Mistakes in [search] that its keys alone do not show."""
    if not isinstance(table, dict):
        return []
    found = []
    if "stagnation_gain" in table and "stagnation_generations" not in table:
        problem = "has no effect without stagnation_generations"
        found.append(Finding(("search", "stagnation_gain"), problem, "state both or leave it out"))
    total, each = table.get("total_evaluations"), table.get("searches_per_family", 1)
    if isinstance(total, int) and isinstance(each, int) and total > 0:
        short = too_few_in_all(total, families, each)
        if short:
            found.append(Finding(("search", "total_evaluations"), *short))
    return found


def too_few_in_all(total: int, families: int, searches: int) -> tuple[str, str] | None:
    """What is wrong with a total that leaves each search too little, and what would be right."""
    least = LEAST_SHARE * families * max(searches, 1)
    if total >= least:
        return None
    several = f" with {searches} searches each" if searches > 1 else ""
    fewer = "families or searches" if searches > 1 else "families"
    return (
        f"is too few for {families} families{several} (got {total})",
        f"give at least {least}, or leave out {fewer}",
    )
