"""A comparison of families in words, tables and comma-separated values."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from textwrap import fill

from evaluators.machine.metrics import METRIC
from studies.comparison.certainty import FamilySearches, order_certainty
from studies.comparison.certainty_text import certainty_text
from studies.comparison.numbers import (
    BINDING,
    KEY_METRICS,
    LOSSES,
    REFERENCE,
    Comparison,
    Member,
    extremes,
)
from studies.stored.verified import VerifiedFamily
from studies.stored.violations import least_violating
from studies.tables import csv_text, number, percent, text_table, wide_table

MUCH = 0.5  # share of a front that is worth a sentence when another family covers it


def comparison_text(comparison: Comparison) -> str:
    """Everything, section by section."""
    sections = [
        _overview(comparison),
        _verified(comparison),
        _statement(comparison),
        certainty_text(comparison),
    ]
    if any(member.compromise is not None for member in comparison.members):
        if len(comparison.members) > 1:
            sections += [
                _pairs(
                    "Coverage: share of the column's front that the row's front equals or beats",
                    comparison,
                    {pair: percent(value) for pair, value in comparison.coverage.items()},
                ),
                _pairs(
                    "Additive epsilon: shift on the common scale after which the row's front "
                    "equals or\nbeats all of the column's; negative: it does already",
                    comparison,
                    {pair: number(value, 3) for pair, value in comparison.epsilon.items()},
                ),
            ]
        sections += [
            _extremes(comparison),
            _compromises(comparison),
            _losses(comparison),
            _binding(comparison),
        ]
    return "\n\n".join(section for section in sections if section)


def _overview(comparison: Comparison) -> str:
    rows = []
    for member in comparison.members:
        evaluations, feasible, failed = member.stored.counts
        rows.append(
            [
                member.label,
                f"{evaluations:,}",
                percent(feasible / evaluations) if evaluations else "-",
                f"{failed:,}",
                str(len(member.stored.front_ids)),
                number(member.hypervolume, 3),
                percent(member.joint_share),
            ]
        )
    head = ["family", "evaluations", "feasible", "failed", "front", "hypervolume", "of joint front"]
    table = text_table(head, rows)
    if not any(len(member.stored.front_ids) for member in comparison.members):
        return table
    scale = ", ".join(
        f"{goal.name} {number(goal.sign * low)} to {number(goal.sign * high)}"
        for goal, low, high in zip(
            comparison.objectives,
            comparison.ideal.tolist(),
            comparison.nadir.tolist(),
            strict=True,
        )
    )
    note = (
        f"Common scale, 0 to 1: {scale}. Hypervolume is the share of the box up to {REFERENCE:g} "
        "in every objective that a front dominates; the joint front holds the designs no other "
        "family beats."
    )
    return f"{table}\n{fill(note, 100)}"


def _verified(comparison: Comparison) -> str:
    """How much of the fronts was verified; empty if verified values do not count."""
    rows = []
    partly = False
    for member in comparison.members:
        if isinstance(member.stored, VerifiedFamily):
            counts = member.stored.verified_counts
            cells = (counts.front, counts.verified, counts.broke_limit, counts.failed)
            rows.append([member.label, counts.evaluator, *map(str, cells)])
            partly |= not member.stored.only and counts.verified < counts.front
    if not rows:
        return ""
    head = ["family", "verified by", "searched front", "verified", "broke a limit", "failed"]
    note = (
        "Verified values count, and designs that broke a limit or failed when verified are left "
        "out."
    )
    if partly:
        note += (
            " The other designs keep the values of the search, which may flatter them: verify "
            "whole fronts with `hovergap verify --front`, or compare verified designs alone with "
            "--verified-only."
        )
    return f"{text_table(head, rows, left=2)}\n{fill(note, 100)}"


def _statement(comparison: Comparison) -> str:
    """Which families are dominated by which, and which have nothing to show."""
    lines = []
    for member in comparison.members:
        if member.compromise is None and member.stored.counts[1]:
            lines.append(f"{member.label} has no verified design that meets all limits.")
        elif member.compromise is None:
            near = least_violating(member.stored, list(member.limits), 1)
            nearest = ""
            if near:
                worst = {name: m for name, m in near[0].margins.items() if m > 0.0}
                said = ", ".join(f"{name} by {percent(m)}" for name, m in worst.items())
                nearest = f"; the nearest, {near[0].design}, misses {said}"
            lines.append(f"{member.label} has no feasible design{nearest}.")
    for family in dict.fromkeys(a for a, _ in comparison.dominated):
        by = [b for a, b in comparison.dominated if a == family]
        lines.append(
            f"{family} is dominated by {_listed(by)}: every design of its front is equalled or "
            "beaten there."
        )
    beaten = {a for a, _ in comparison.dominated}
    for member in comparison.members:
        if member.compromise is None or member.label in beaten:
            continue
        equal = [
            b
            for (b, a), share in comparison.coverage.items()
            if a == member.label and share == 1.0 == comparison.coverage[a, b]
        ]
        if equal:
            lines.append(f"{member.label} has the same front as {_listed(equal)}.")
            continue
        if member.joint_count == 0:
            lines.append(
                f"{member.label} is dominated by the other families together: none of its designs "
                "is on the joint front."
            )
            continue
        much = [
            (b, share)
            for (b, a), share in comparison.coverage.items()
            if a == member.label and share >= MUCH
        ]
        if much:
            b, share = max(much, key=lambda item: item[1])
            lines.append(
                f"{member.label} is not dominated, but {b} equals or beats {percent(share)} of "
                "its front."
            )
    if not lines:
        lines.append("No family is dominated by another.")
    return "\n".join(lines)


def _listed(names: Sequence[str]) -> str:
    return names[0] if len(names) == 1 else f"{', '.join(names[:-1])} and {names[-1]}"


def _pairs(title: str, comparison: Comparison, cells: dict[tuple[str, str], str]) -> str:
    labels = [member.label for member in comparison.members]
    rows = [[a, *(cells.get((a, b), "") for b in labels)] for a in labels]
    return f"{title}\n{wide_table(['', *labels], rows)}"


def _extremes(comparison: Comparison) -> str:
    rows = []
    for member in comparison.members:
        best = extremes(comparison, member)
        if best:
            cells = [f"{number(value)} ({design})" for value, design in best.values()]
            rows.append([member.label, *cells])
    head = ["family", *(goal.name for goal in comparison.objectives)]
    return f"Best of each objective\n{text_table(head, rows, left=len(head))}"


def _chosen(comparison: Comparison) -> Iterator[tuple[Member, str, dict[str, float]]]:
    for member in comparison.members:
        if member.compromise is not None:
            yield (
                member,
                member.stored.front_ids[member.compromise],
                member.stored.front_row(member.compromise),
            )


def _compromises(comparison: Comparison) -> str:
    chosen = list(_chosen(comparison))
    goals = {goal.name: goal for goal in comparison.objectives}
    rows = [
        [name, "", *(number(goal.sign * row[f"objective:{name}"]) for _, _, row in chosen)]
        for name, goal in goals.items()
        if name not in METRIC
    ]
    currencies = {member.currency for member, _, _ in chosen}
    currency = currencies.pop() if len(currencies) == 1 else ""
    single = [name for name in goals if name in METRIC]
    for name in dict.fromkeys([*single, *KEY_METRICS]):
        values = [row.get(name) for _, _, row in chosen]
        if all(value is not None for value in values):
            unit = {"1": "", "money": currency}.get(METRIC[name].unit, METRIC[name].unit)
            rows.append([name, unit, *(number(v or 0.0) for v in values)])
    head = ["best compromise", "", *(design for _, design, _ in chosen)]
    table = wide_table(head, rows, left=2)
    return f"Nearest to the best of all objectives on the common scale\n{table}"


def _losses(comparison: Comparison) -> str:
    chosen = list(_chosen(comparison))
    rows = []
    for name in LOSSES:
        values = [row.get(name) for _, _, row in chosen]
        if all(value is not None for value in values):
            rows.append([name, *(number(value or 0.0) for value in values)])
    head = ["losses of these, W", *(design for _, design, _ in chosen)]
    return wide_table(head, rows) if rows else ""


def _binding(comparison: Comparison) -> str:
    names = list(dict.fromkeys(n for member in comparison.members for n in member.binding))
    if not names:
        return "No limit binds any front."
    rows = [
        [name, *(percent(member.binding.get(name, 0.0)) for member in comparison.members)]
        for name in names
    ]
    head = ["limit that binds", *(member.label for member in comparison.members)]
    return f"Share of each front within {percent(BINDING)} of a limit\n{wide_table(head, rows)}"


def summary_csv(comparison: Comparison) -> str:
    """One line a family, with the hypervolume of each search where some have several."""
    goals = comparison.objectives
    certainty = order_certainty(comparison)
    searches = {family.label: family for family in certainty.families} if certainty else {}
    most = max(map(len, searches.values()), default=0)
    head = [
        "study",
        "family",
        "evaluations",
        "feasible",
        "failed",
        "front_size",
        "hypervolume",
        "joint_front_share",
        *(f"best:{goal.name}" for goal in goals),
        "compromise_design",
        *(f"compromise:{name}" for name in METRIC),
        *_search_head(most),
    ]
    rows: list[list[object]] = []
    for member in comparison.members:
        best = extremes(comparison, member)
        row = {} if member.compromise is None else member.stored.front_row(member.compromise)
        design = "" if member.compromise is None else member.stored.front_ids[member.compromise]
        rows.append(
            [
                member.stored.study,
                member.stored.family,
                *member.stored.counts,
                len(member.stored.front_ids),
                member.hypervolume,
                member.joint_share,
                *(best[goal.name][0] if best else "" for goal in goals),
                design,
                *(row.get(name, "") for name in METRIC),
                *(_search_cells(searches[member.label], most) if searches else ()),
            ]
        )
    return csv_text(head, rows)


def _search_head(most: int) -> list[str]:
    if not most:
        return []
    spans = [f"hypervolume_{word}" for word in ("smallest", "median", "largest")]
    return ["searches", *spans, *(f"hypervolume:{search}" for search in range(1, most + 1))]


def _search_cells(family: FamilySearches, most: int) -> list[object]:
    volumes = family.hypervolumes
    each = volumes.tolist()
    return [
        len(family),
        float(volumes.min()),
        family.median,
        float(volumes.max()),
        *each,
        *[""] * (most - len(each)),
    ]


def front_csv(comparison: Comparison) -> str:
    """One line for each design of all fronts, with all stored columns."""
    names: list[str] = []
    for member in comparison.members:
        names += [name for name in member.stored.front.column_names if name not in names]
    rows = [
        [
            member.stored.study,
            member.stored.family,
            design,
            *(row.get(name, "") for name in names),
        ]
        for member in comparison.members
        for design, row in zip(
            member.stored.front_ids, member.stored.front.to_pylist(), strict=True
        )
    ]
    return csv_text(["study", "family", "design", *names], rows)
