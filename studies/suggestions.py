"""What the user probably meant: the same name with another unit, or a name spelt almost alike."""

from __future__ import annotations

import difflib
from collections.abc import Iterable

from studies.errors import quoted

_UNIT_WORDS = """m mm um cm km nm inch mm2 cm2 m2 L W mW kW MW rpm krpm rps V mV kV A mA kA
N mN kN Nm mNm H mH uH Hz kHz T mT s ms us min h C K F Pa kPa MPa GPa bar deg rad g kg percent
kVA m2K mK m3 uPa J kgK"""
UNITS = frozenset(_UNIT_WORDS.split())
LISTED = 12  # names are listed in full up to here
SIMILAR = 0.6  # difflib's own default, which catches one or two slips in a word


def stem(name: str) -> str:
    """`name` without its unit suffix: ``rotor_radius_mm`` gives ``rotor_radius``."""
    parts = name.split("_")
    while len(parts) > 1 and parts[-1] in UNITS:
        parts.pop()
    return "_".join(parts)


def suffix(name: str) -> str:
    """Unit suffix of `name`: ``rotor_radius_mm`` gives ``mm``; empty if it has none."""
    return name[len(stem(name)) + 1 :]


def suggest(name: str, known: Iterable[str], listing: str = "") -> str:
    """A remedy for the unknown `name`.

    Parameters
    ----------
    name : str
        What the user wrote.
    known : iterable of str
        What exists.
    listing : str
        Where all names can be read, for lists too long for a message.
    """
    names = list(known)
    same = [item for item in names if stem(item) == stem(name) and item != name]
    if same and stem(name) not in UNITS:
        return f"write {same[0]!r}: the unit is part of the name, so convert the value too"
    lower = {item.lower(): item for item in names}
    close = difflib.get_close_matches(name.lower()[:100], lower, n=1, cutoff=SIMILAR)
    if close:
        return f"did you mean {lower[close[0]]!r}?"
    if names and len(names) <= LISTED:
        return f"known are {', '.join(names)}"
    return listing or f"known are {', '.join(names[:LISTED])} ..."


def unknown(kind: str, name: object) -> str:
    """The problem sentence for an unknown name."""
    return f"there is no {kind} {quoted(name)}"
