"""Enamelled round wire: standard sizes, and which of them fills a slot best."""

from __future__ import annotations

import tomllib
from functools import lru_cache
from importlib import resources
from typing import NamedTuple

import numpy as np

from evaluators.machine.quantity import FloatArray

MILLI = 1e-3
FINEST_SHARE = 0.5  # of the largest permitted diameter; thinner strands waste the slot on enamel


class WireSizes(NamedTuple):
    """Standard sizes in m, thinnest first."""

    bare: FloatArray
    overall: FloatArray


class Strands(NamedTuple):
    """Wires of n designs, arrays (n,)."""

    diameter: FloatArray
    """Bare diameter in m."""
    per_turn: FloatArray
    """Parallel strands of one turn, a whole number."""
    copper_area: FloatArray
    """Bare copper of one coil side, all turns, in m2."""
    occupied: FloatArray
    """Share of the places in the slot that wires take, at most 1 if they fit."""


@lru_cache(maxsize=2)
def wire_sizes(grade: int) -> WireSizes:
    """Return the sizes of IEC 60317-0-1 with the largest overall diameter of a grade.

    Raises
    ------
    ValueError
        If the grade is not 1 or 2.
    """
    if grade not in (1, 2):
        msg = f"wire grade = {grade} must be 1 or 2"
        raise ValueError(msg)
    data = resources.files("evaluators.machine.materials") / "data"
    table = tomllib.loads((data / "wire.toml").read_text("utf-8"))
    bare, overall = (np.array(table[key]) * MILLI for key in ("bare_mm", f"grade_{grade}_mm"))
    for column in (bare, overall):
        column.setflags(write=False)
    return WireSizes(bare, overall)


def choose_strands(
    turns: FloatArray,
    room: FloatArray,
    most_copper: FloatArray,
    largest_diameter: float,
    grade: int,
    packing: float,
) -> Strands:
    """Return the standard wire and the strands a turn that put most copper into a coil side.

    A wire takes a square of its overall diameter, divided by `packing`.

    Parameters
    ----------
    turns : array (n,)
        Of one coil.
    room : array (n,)
        Insulated area of the slot for one coil side, m2.
    most_copper : array (n,)
        Largest bare copper area of one coil side, m2.
    largest_diameter : float
        Bare, m; sizes from half of it upwards are tried.
    grade : int
        Of the enamel.
    packing : float
        Number of wires times the square of their overall diameter over the room: 1 for a square
        grid, 1.155 for the densest.

    Notes
    -----
    If not even one strand a turn of the finest size tried fits, that is what is returned, with
    `Strands.occupied` above 1.
    """
    sizes = wire_sizes(grade)
    small = 1.0 - 1e-9  # a size equal to a bound counts as inside it
    tried = (sizes.bare * small <= largest_diameter) & (
        sizes.bare >= FINEST_SHARE * largest_diameter * small
    )
    if not tried.any():
        tried[0 if largest_diameter < sizes.bare[0] else -1] = True
    bare, overall = sizes.bare[tried], sizes.overall[tried]
    section = 0.25 * np.pi * bare**2
    places = packing * room[:, None] / overall**2
    fitting = np.minimum(places, most_copper[:, None] / section * (1.0 + 1e-9))
    strands = np.maximum(np.floor(fitting / turns[:, None]), 0.0)
    copper = strands * turns[:, None] * section
    best = np.argmax(copper, axis=1)
    rows = np.arange(turns.size)
    per_turn = np.maximum(strands[rows, best], 1.0)
    return Strands(
        diameter=bare[best],
        per_turn=per_turn,
        copper_area=per_turn * turns * section[best],
        occupied=per_turn * turns / places[rows, best],
    )
