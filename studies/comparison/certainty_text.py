"""How sure the order of the families is, in words and tables."""

from __future__ import annotations

from textwrap import fill

from studies.comparison.certainty import LEVEL, Certainty, Pair, needed_searches, order_certainty
from studies.comparison.numbers import Comparison
from studies.stored.verified import VerifiedFamily
from studies.tables import number, percent, text_table, wide_table

WIDTH = 100
SMALLEST = 0.001
HEADING = "How sure is this order: hypervolume of each search alone, on the common scale"


def certainty_text(comparison: Comparison) -> str:
    """The section of `hovergap compare`; a line where nothing can be said."""
    certainty = order_certainty(comparison)
    if certainty is not None:
        sections = [f"{HEADING}\n{_spans(certainty)}", *map(_filled, statements(certainty))]
        if len(certainty.families) > 2:
            sections.append(_matrix(certainty))
        return "\n".join(sections)
    if not any(len(member.stored.front_ids) for member in comparison.members):
        return ""
    if any(isinstance(member.stored, VerifiedFamily) for member in comparison.members):
        several = any(len(member.stored.searches) > 1 for member in comparison.members)
        said = "How sure the order is can only be told by the values of the search itself."
        return said if several else ""
    return once_only(comparison)


def once_only(comparison: Comparison) -> str:
    """What to say where every family was searched once."""
    families = len(comparison.members)
    if families < 2:
        return ""
    return (
        "One search of each family says nothing about chance: "
        f"`hovergap resume {comparison.members[0].results.folder} --searches "
        f"{needed_searches(families)}` adds more."
    )


def _spans(certainty: Certainty) -> str:
    rows = [
        [
            family.label,
            str(len(family)),
            number(float(family.hypervolumes.min()), 3),
            number(family.median, 3),
            number(float(family.hypervolumes.max()), 3),
        ]
        for family in certainty.families
    ]
    return text_table(["family", "searches", "smallest", "median", "largest"], rows)


def statements(certainty: Certainty) -> list[str]:
    """Sentences: what can be decided, who is before whom, and all families together."""
    said = [*_efforts(certainty)]
    if not certainty.pairs:
        return said
    counted = len(certainty.pairs)
    fewest, most = min(map(len, certainty.families)), max(map(len, certainty.families))
    if not certainty.can_decide:
        with_all = (
            f", {p_value(min(certainty.least_p * counted, 1.0))} with all {counted} pairs of "
            "families counted"
            if counted > 1
            else ""
        )
        said.append(
            f"{_searches(fewest, most)} of a family cannot tell it from another, even if all "
            f"agree: p is {p_value(certainty.least_p)} at best{with_all}. To get to {LEVEL:g}, "
            f"at least {certainty.needed} searches of each are needed."
        )
    said += [_sentence(pair, counted) for pair in certainty.neighbours()]
    overall = certainty.overall
    if overall is not None:
        verdict = (
            "some of the families differ by more than chance"
            if overall.p <= LEVEL
            else "chance alone could have made all of these differences"
        )
        how = "all" if overall.exact else "random"
        said.append(
            f"All families together: Kruskal and Wallis's H = {number(overall.statistic, 3)}, "
            f"p {_against(overall.p)} ({overall.orders:,} {how} orders of the ranks): {verdict}."
        )
    said.append(
        "p: chance of a difference at least as large if the two families were equal (rank-sum "
        "test, exact, two-sided: Mann and Whitney 1947)"
        + (f"; with all {counted} pairs counted: Holm 1979." if counted > 1 else ".")
    )
    return said


def _efforts(certainty: Certainty) -> list[str]:
    fewest, most = certainty.efforts
    if fewest == most:
        return []
    return [
        f"The searches have from {fewest:,} to {most:,} evaluations, so part of their differences "
        "may be effort."
    ]


def _sentence(pair: Pair, counted: int) -> str:
    several = f"; {p_value(pair.corrected)} with all {counted} pairs counted" if counted > 1 else ""
    verdict = "hardly chance" if pair.sure else "may be chance"
    if pair.sure and pair.probability < 0.5:
        # Possible with many searches: the test looks at all ranks, the order at the middle ones.
        verdict += ", and against the order of their medians"
    if pair.equal == pair.pairs:
        return f"{pair.first} and {pair.second} reach the same in all pairs of searches (p = 1)."
    ties = f" and equal in {pair.equal}" if pair.equal else ""
    return (
        f"{pair.first} is before {pair.second} in {pair.ahead} of {pair.pairs} pairs of searches"
        f"{ties} (p {_against(pair.p)}{several}): {verdict}."
    )


def _matrix(certainty: Certainty) -> str:
    labels = [family.label for family in certainty.families]
    cells: dict[tuple[str, str], str] = {}
    for pair in certainty.pairs:
        mark = " *" if pair.sure else "  "
        cells[pair.first, pair.second] = f"{percent(pair.probability)}{mark}"
        cells[pair.second, pair.first] = f"{percent(1.0 - pair.probability)}{mark}"
    rows = [[a, *(cells.get((a, b), "") for b in labels)] for a in labels]
    note = (
        "Chance that one search of the row's family reaches more than one of the column's, ties "
        "counted half (Vargha and Delaney 2000)"
    )
    if any(pair.sure for pair in certainty.pairs):
        note += f"; *: p is {LEVEL:g} or less with all pairs counted"
    return f"\n{_filled(note + '.')}\n{wide_table(['', *labels], rows)}"


def p_value(p: float) -> str:
    """A p-value with two digits, or as less than a thousandth."""
    if p < SMALLEST:
        return f"below {SMALLEST:g}"
    return "1" if p >= 0.995 else f"{p:.2g}"


def _against(p: float) -> str:
    return p_value(p) if p < SMALLEST else f"= {p_value(p)}"


def _searches(fewest: int, most: int) -> str:
    return f"{fewest} searches" if fewest == most else f"{fewest} to {most} searches"


def _filled(text: str) -> str:
    return fill(text, WIDTH)
