"""Why a family has no feasible design: which limits are broken, and what comes nearest."""

from __future__ import annotations

import re
from collections import Counter

from studies.stored.families import StoredFamily, stored_family
from studies.stored.layout import Results
from studies.stored.violations import least_violating, violation_statistics
from studies.tables import number, percent, text_table

SHOWN_DESIGNS = 3
SHOWN_REASONS = 3
NUMBER = re.compile(r"\d[\d.e+-]*")


def explain(results: Results, family: str, designs: int = SHOWN_DESIGNS) -> str:
    """Say it in a table of limits and a list of the least-violating designs.

    Parameters
    ----------
    results : Results
    family : str
    designs : int
        How many of the nearest designs to give.
    """
    stored = stored_family(results, family)
    limits = {limit.name: limit for limit in results.study.limits}
    statistics = violation_statistics(stored, list(limits))
    if not statistics:
        return f"{family}: no design could be evaluated{_reasons(stored)}"
    broken = sorted(
        (item for item in statistics.items() if item[1][0] > 0.0),
        key=lambda item: item[1],
        reverse=True,
    )
    rows = []
    for name, (share, least) in broken:
        best = f"missed by {percent(least)}" if least > 0.0 else "met by some"
        rows.append([limits[name].text(), percent(share), best])
    lines = [
        f"{family}: no feasible design was found. Limits broken, worst first:",
        text_table(["limit", "broken by", "best design"], rows, left=1),
    ]
    nearest = least_violating(stored, list(limits), designs)
    if nearest:
        lines.append("Nearest to feasible:")
    for item in nearest:
        row = stored.row(item.design)
        said = []
        for name, margin in item.margins.items():
            if margin > 0.0:
                limit = limits[name]
                side = limit.text().removeprefix(f"{limit.metric} ")
                said.append(f"{limit.metric} {number(row[limit.metric])} ({side})")
        lines.append(f"  {item.design}: {', '.join(said)}")
    return "\n".join(lines)


def _reasons(stored: StoredFamily) -> str:
    """The commonest reasons of failed rows, alike but for their numbers counted as one."""
    examples: dict[str, str] = {}
    counts: Counter[str] = Counter()
    for reason in stored.table(["reason"])["reason"].to_pylist():
        kind = NUMBER.sub("#", reason)
        counts[kind] += 1
        examples.setdefault(kind, reason)
    common = [
        f"  {count:,} times, for example: {examples[kind]}"
        for kind, count in counts.most_common(SHOWN_REASONS)
    ]
    return "; commonest reasons:\n" + "\n".join(common) if common else ""
