"""A decision in words and as JSON."""

from __future__ import annotations

from math import isnan
from textwrap import fill
from typing import Any

from studies.choice.decision import Decision, Ranked
from studies.choice.preferences import Criterion, Preferences
from studies.inspection.design import CAUTIONS
from studies.stored.identity import study_digest
from studies.stored.layout import program_version
from studies.tables import number, percent, wide_table

FORMAT = "hovergap decision"
FORMAT_VERSION = 1
METHODS = {
    "achievement": "augmented achievement scalarising function (Wierzbicki 1980)",
    "sum": "weighted sum of criteria scaled from their best (0) to their worst (1) on the front "
    "(Zadeh 1963)",
}


def preferences_text(wanted: Preferences) -> str:
    """What was asked for."""
    lines = [f"Ranked by the {METHODS[wanted.method]}."]
    for item in wanted.criteria:
        level = "" if item.aspiration is None else f", aspired to {_amount(item, item.aspiration)}"
        word = "maximise" if item.maximise else "minimise"
        lines.append(f"  {word} {item.name}, weight {item.weight:g}{level}")
    lines += [f"  only {limit.text()}" for limit in wanted.limits]
    if wanted.prices:
        listing = ", ".join(f"{name} {value:g} per kg" for name, value in wanted.prices.items())
        lines.append(f"  prices: {listing}")
    if wanted.market != "base":
        lines.append(f"  prices: the study's {wanted.market} market")
    return "\n".join(lines)


def _amount(item: Criterion, value: float) -> str:
    return f"{number(value)}{'' if item.unit in ('', '1', 'money') else ' ' + item.unit}"


def ranking_text(decision: Decision) -> str:
    """Best few of each family with what each gives away."""
    criteria = decision.wanted.criteria
    head = ["place", "design", "score", *(item.name for item in criteria), "held back by"]
    rows = []
    for item in decision.ranked:
        cells = [
            f"{number(value)} {_away(*loss)}"
            for value, *loss in zip(item.values.tolist(), *_losses(decision, item), strict=True)
        ]
        name = _name(item)
        held = criteria[item.deciding].name
        rows.append([str(item.place), name, f"{item.score:.4f}", *cells, held])
    best = [
        f"  {item.name}: {_amount(item, float(value))} ({design})"
        for item, value, design in zip(
            criteria, decision.best.tolist(), decision.best_design, strict=True
        )
    ]
    empty = [pool for pool in decision.pools if not len(pool.values)]
    lines = [
        f"{sum(len(pool.values) for pool in decision.pools):,} designs meet all limits. In "
        "brackets what a design gives away against the best value of all:",
        *best,
        "",
        wide_table(head, rows, left=2),
    ]
    lines += [f"{pool.label}: {empty_text(pool.feasible_before)}" for pool in empty]
    return "\n".join(lines)


def empty_text(before: int) -> str:
    """Why a family has no candidate."""
    if not before:
        return "no stored design meets the limits of the study"
    return f"none of {before:,} designs that meet the study's limits meets those given here"


def _name(item: Ranked) -> str:
    folder = item.pool.label.rpartition("/")[0]
    return f"{folder}/{item.design}" if folder else item.design


def _losses(decision: Decision, item: Ranked) -> tuple[list[float], list[float]]:
    return decision.given_away(item).tolist(), decision.given_share(item).tolist()


def _away(loss: float, share: float) -> str:
    if loss <= 0.0:
        return "(best)"
    return f"({number(loss, 3)})" if isnan(share) else f"({percent(share)})"


def reasons(decision: Decision, because: str) -> list[str]:
    """Why the design was taken, sentence by sentence."""
    taken = decision.taken
    total = sum(len(pool.values) for pool in decision.pools)
    criteria = decision.wanted.criteria
    said = [f"It takes place {taken.place} of {total:,} designs that meet all limits."]
    for item, value, loss, share in zip(
        criteria, taken.values.tolist(), *_losses(decision, taken), strict=True
    ):
        away = _amount(item, loss) if isnan(share) else percent(share)
        text = f"{item.name} is {_amount(item, value)}, "
        text += "the best of all" if loss <= 0.0 else f"{away} off the best of all"
        if item.aspiration is not None:
            met = item.sign * (value - item.aspiration) <= 0.0
            verb = "meets" if met else "misses"
            text += f"; it {verb} the aspiration of {_amount(item, item.aspiration)}"
        said.append(f"{text}.")
    said.append(f"What holds it back most is {criteria[taken.deciding].name}.")
    others = [item for item in decision.ranked if item.pool is not taken.pool]
    if others:
        said.append(
            f"The best of the other families is {_name(others[0])} at place {others[0].place}."
        )
    if because:
        said.append(f"In the words of who decided: {because}")
    return said


def decision_text(decision: Decision, because: str, when: str) -> str:
    """The file a colleague reads."""
    taken = decision.taken
    folders = dict.fromkeys(str(pool.results.folder) for pool in decision.pools)
    parts = [
        f"Decision of {when}: {taken.design} of study {taken.pool.results.study.name}",
        "Chosen from " + ", ".join(folders),
        preferences_text(decision.wanted),
        "Reasons\n" + "\n".join(_bullet(text) for text in reasons(decision, because)),
        ranking_text(decision),
        "Before anything is built\n" + "\n".join(_bullet(text) for text in CAUTIONS),
        f"Written by hovergap {program_version()}.",
    ]
    return "\n\n".join(parts) + "\n"


def _bullet(text: str) -> str:
    return fill(text, 96, initial_indent="- ", subsequent_indent="  ")


def decision_json(decision: Decision, because: str, when: str) -> dict[str, Any]:
    """The same as values of JSON."""
    wanted, taken = decision.wanted, decision.taken
    return {
        "format": FORMAT,
        "format_version": FORMAT_VERSION,
        "decided_at": when,
        "hovergap": program_version(),
        "study": taken.pool.results.study.name,
        "design": taken.design,
        "place": taken.place,
        "reasons": reasons(decision, because),
        "because": because,
        "method": wanted.method,
        "criteria": [
            {
                "name": item.name,
                "unit": item.unit,
                "sense": "maximise" if item.maximise else "minimise",
                "weight": item.weight,
                "aspiration": item.aspiration,
                "best": float(best),
                "best_design": design,
            }
            for item, best, design in zip(
                wanted.criteria, decision.best.tolist(), decision.best_design, strict=True
            )
        ],
        "limits": [{"metric": item.metric, item.kind: item.value} for item in wanted.limits],
        "prices_per_kg": dict(wanted.prices),
        "market": wanted.market,
        "candidates": [
            {
                "family": pool.label,
                "folder": str(pool.results.folder),
                "study_digest": study_digest(pool.results.study),
                "meet_study_limits": pool.feasible_before,
                "meet_all_limits": len(pool.values),
            }
            for pool in decision.pools
        ],
        "ranking": [
            {
                "place": item.place,
                "design": item.design,
                "family": item.pool.label,
                "score": item.score,
                "values": _by_name(wanted, item.values.tolist()),
                "given_away": _by_name(wanted, decision.given_away(item).tolist()),
                "held_back_by": wanted.criteria[item.deciding].name,
            }
            for item in decision.ranked
        ],
    }


def _by_name(wanted: Preferences, values: list[float]) -> dict[str, float]:
    return {item.name: value for item, value in zip(wanted.criteria, values, strict=True)}
