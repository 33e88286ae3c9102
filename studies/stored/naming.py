"""Names of searches and designs: which search of which family, and which evaluation of it.

The first search of a family goes by the family's id alone, the others by the id and their number,
such as ``Q12p4s5.2``. That is also the name of the folder a search lies in. A design is named by
its search and the number of its evaluation: ``Q12p4s5-001234``, ``Q12p4s5.2-001234``.
"""

from __future__ import annotations

import re
from collections.abc import Sequence

import numpy as np

from evaluators.machine.winding.winding import Family
from studies.errors import ResultsError

_DESIGN = re.compile(r"(.+)-(\d{1,12})")
_SEARCH = re.compile(r"(.+)\.(\d{1,4})")


def search_name(family: str, search: int) -> str:
    """Name of the `search`-th search of a family, counted from 1."""
    return family if search == 1 else f"{family}.{search}"


def split_search_name(name: str) -> tuple[str, int]:
    """Family and number of a search; a name without a number is the first search."""
    match = _SEARCH.fullmatch(name)
    return (match[1], int(match[2])) if match else (name, 1)


def family_of(name: str) -> str:
    """The family a search belongs to."""
    return split_search_name(name)[0]


def search_names(families: Sequence[str], searches: int) -> tuple[str, ...]:
    """All searches, the first of every family first, so that an early end leaves whole rounds."""
    return tuple(
        search_name(family, search) for search in range(1, searches + 1) for family in families
    )


def search_seed(seed: int, family: Family, search: int) -> int:
    """Seed of one search of a family, made from the seed of the study.

    The first search takes the study's seed itself, in every family. Search k > 1 takes the upper
    31 bits of the first word of ``numpy.random.SeedSequence(seed, spawn_key=(k, slots, pole_pairs,
    suspension_pole_pairs))``, so that no two searches of a study share their random numbers, and
    a study with the next seed repeats none of them.
    """
    if search == 1:
        return seed
    key = (search, family.slots, family.pole_pairs, family.suspension_pole_pairs)
    word = np.random.SeedSequence(seed, spawn_key=key).generate_state(1, np.uint32)[0]
    return int(word) >> 1


def design_id(search: str, evaluation: int) -> str:
    """Name of one evaluated design of a search, such as ``Q12p4s5-001234``."""
    return f"{search}-{evaluation:06d}"


def split_design_id(text: str) -> tuple[str, int]:
    """Name of the search and evaluation number of a design id.

    Raises
    ------
    ResultsError
        If it is none.
    """
    match = _DESIGN.fullmatch(text)
    if match is None:
        msg = (
            f"{text!r} is no design; write family and evaluation as in Q12p4s5-001234, for a "
            "design of the family's second search Q12p4s5.2-001234"
        )
        raise ResultsError(msg)
    return search_name(*split_search_name(match[1])), int(match[2])
