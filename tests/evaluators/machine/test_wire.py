"""Enamelled wire and how it fills a slot."""

from __future__ import annotations

import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.machine.drive.wire import choose_strands, wire_sizes
from evaluators.machine.losses.copper import winding_resistance
from evaluators.machine.materials.library import Conductor, load

MM = 1e-3

check = OutsideChecks("drive")


@pytest.mark.parametrize(("bare", "grade_1", "grade_2"), [
    (0.200, 0.226, 0.239), (0.315, 0.349, 0.367), (0.500, 0.544, 0.566), (0.710, 0.762, 0.789),
    (0.800, 0.855, 0.884), (1.000, 1.062, 1.094),
])  # fmt: skip
def test_overall_diameters(bare: float, grade_1: float, grade_2: float) -> None:
    for grade, overall in ((1, grade_1), (2, grade_2)):
        sizes = wire_sizes(grade)
        row = int(np.argmin(np.abs(sizes.bare - bare * MM)))
        assert sizes.bare[row] == pytest.approx(bare * MM, abs=1e-9)
        check(
            "overall diameters of enamelled wires, grades 1 and 2",
            sizes.overall[row] / MM,
            overall,
            absolute=0.003,
            unit="mm",
            why="from memory",
            source="IEC 60317-0-1, table 1 (from memory)",
        )


def test_sizes_are_preferred_numbers() -> None:
    """Twenty steps a decade; the lowest decade of the table leaves out some sizes."""
    bare = wire_sizes(1).bare / MM
    number = 20.0 * np.log10(bare)
    check(
        "bare diameters of wires",
        bare,
        10.0 ** (np.round(number) / 20.0),
        relative=0.014,
        why="preferred numbers are rounded by up to 1.3 %",
        source="ISO 3, series R 20",
    )
    assert np.all(np.diff(bare) > 0.0)


def test_enamel_thickens_with_grade_and_size() -> None:
    one, two = wire_sizes(1), wire_sizes(2)
    assert np.all(two.overall > one.overall)
    for sizes in (one, two):
        enamel = sizes.overall - sizes.bare
        assert np.all(np.diff(enamel) >= -1e-9)
        # The thinner the wire, the larger the share of enamel, but for rounding to a micron.
        assert np.all(np.diff(enamel / sizes.bare) < 1e-6 / sizes.bare[:-1])


@pytest.mark.parametrize(("area", "ohm_per_km"), [
    (1.5, 12.1), (2.5, 7.41), (4.0, 4.61), (6.0, 3.08), (10.0, 1.83), (16.0, 1.15), (25.0, 0.727),
    (35.0, 0.524), (50.0, 0.387),
])  # fmt: skip
def test_copper_stays_below_the_limit_of_cable_conductors(area: float, ohm_per_km: float) -> None:
    resistivity = load(Conductor, "Copper").resistivity.at(20.0)
    ours = float(winding_resistance(1.0, 1000.0, area * 1e-6, resistivity))
    check.within(
        "resistance of cable conductors over the largest that is permitted",
        ours / ohm_per_km,
        0.85,
        1.0,
        why="one-sided limit; real cables may have less copper than their name and a lay",
        source="IEC 60228, classes 1 and 2, at 20 °C (from memory)",
    )


def test_strands_by_hand() -> None:
    """50 mm2 of room, 10 turns, wire up to 0.5 mm: the best of five sizes counted by hand."""
    chosen = choose_strands(np.array([10.0]), np.array([50e-6]), np.array([1.0]), 0.5 * MM, 2, 0.8)
    sizes = wire_sizes(2)
    best = 0.0
    for bare, overall in zip(sizes.bare, sizes.overall, strict=True):
        if bare * (1 + 1e-9) >= 0.25 * MM and bare <= 0.5 * MM * (1 + 1e-9):
            strands = int(0.8 * 50e-6 / overall**2 / 10.0)
            best = max(best, 10 * strands * np.pi * bare**2 / 4.0)
    check(
        "copper of the best whole number of strands",
        chosen.copper_area[0],
        best,
        relative=1e-12,
        why="rounding",
        source="all sizes counted one by one",
    )
    assert chosen.per_turn[0] == np.floor(chosen.per_turn[0])
    assert chosen.occupied[0] <= 1.0


def test_copper_is_held_at_what_the_study_allows() -> None:
    turns = np.array([1.0, 7.0, 23.0])
    most = np.full(3, 12e-6)
    chosen = choose_strands(turns, np.full(3, 50e-6), most, 0.4 * MM, 1, 0.9)
    assert np.all(chosen.copper_area <= most * (1.0 + 1e-8))
    # A strand of the finest size tried, 0.2 mm, is what whole strands can lose per turn.
    assert np.all(chosen.copper_area >= most - turns * np.pi * (0.2 * MM) ** 2 / 4.0)


def test_what_does_not_fit_says_so() -> None:
    chosen = choose_strands(np.array([100.0]), np.array([1e-6]), np.array([1.0]), MM, 2, 0.8)
    assert chosen.per_turn[0] == 1.0
    assert chosen.occupied[0] > 1.0


def test_sizes_beyond_the_table_take_its_end() -> None:
    room, most = np.array([1e-3]), np.array([1.0])
    thick = choose_strands(np.array([1.0]), room, most, 10.0 * MM, 2, 0.8)
    assert thick.diameter[0] == pytest.approx(2.0 * MM)
    fine = choose_strands(np.array([1.0]), room, most, 0.02 * MM, 2, 0.8)
    assert fine.diameter[0] == pytest.approx(0.05 * MM)


def test_unknown_grade_is_refused() -> None:
    with pytest.raises(ValueError, match="wire grade = 3 must be 1 or 2"):
        wire_sizes(3)
