"""The slot as its mouth shows it: closed forms of channels, finite elements for tapers."""

from __future__ import annotations

import machines
import numpy as np
import pytest
from outside import OutsideChecks
from slot_solution import solve_slot

from evaluators.analytic.slots import mouth
from evaluators.machine.geometry.cross_sections import CrossSections

check = OutsideChecks("field")


def slot(numbers: machines.Numbers = (12, 4, 5), **changes: float) -> CrossSections:
    return machines.sections(machines.task(*numbers), machines.designs(**changes))


def channel(depth: float, width: float, wound: float) -> CrossSections:
    """A slot so far out that its walls are parallel: a channel in the plane, lengths in m."""
    far, slots = 1e3, 300_000
    pitch = 2.0 * np.pi * far / slots
    family = machines.task(6, 2, 1).winding.family
    family = type(family)(slots, 2, 1, 1)
    near = [0.1 * far, 0.2 * far, 0.3 * far, 0.4 * far]
    values = [*near, far, far + 0.5 * (depth - wound), far + depth - wound, far + depth, far + 9.0]
    return CrossSections(
        family,
        *(np.array([value]) for value in (*values, pitch - width, 0.5 * (pitch - width), 0.8)),
    )


def test_uniform_channel_is_a_short_circuited_line() -> None:
    # A ~ cosh(k pi/w (bottom - x)) cos/sin(k pi y/w): potential over current of mode k is
    # coth(k pi depth/w) / (k pi/2) in half-widths.
    depth, width, modes = 6e-3, 12e-3, 7
    answer = mouth(channel(depth, width, 4e-3), modes)
    wave = np.pi * np.arange(1, modes + 1) / width
    expected = 1.0 / (0.5 * width * wave * np.tanh(wave * depth))
    why = "the walls open by a slot pitch over 1 km, 1e-5 of the width"
    check(
        "modes of a slot with parallel walls",
        np.diag(answer.compliance[0]),
        expected,
        relative=1e-4,
        why=why,
        source="separation of variables in a channel",
    )
    rest = answer.compliance[0] - np.diag(np.diag(answer.compliance[0]))
    assert np.abs(rest).max() < 1e-4
    assert np.abs(answer.current_share).max() < 1e-4


def test_leakage_of_a_rectangular_slot() -> None:
    answer = mouth(channel(18e-3, 6e-3, 15e-3), 5)
    check(
        "leakage permeance of a rectangular slot",
        answer.permeance[0],
        15.0 / 18.0 + 3.0 / 6.0,
        relative=1e-4,
        why="the walls open by a slot pitch over 1 km, 1e-5 of the width",
        source="h/(3 b) of the wound part and h'/b above it: Pyrhonen et al., 2014, ch. 4",
    )


def test_wound_part_with_parallel_tooth() -> None:
    # The same integral by fine steps: enclosed current squared over r times angle.
    sections = slot(tip_span_ratio=1.0)
    radius = np.linspace(sections.wedge_radius[0], sections.slot_radius[0], 20_001)
    angle = sections.slot_angle(radius[None])[0]
    piece = 0.5 * np.diff(radius) * (radius[1:] * angle[1:] + radius[:-1] * angle[:-1])
    enclosed = np.append(np.cumsum(piece[::-1])[::-1], 0.0) / piece.sum()
    wound = np.trapezoid(enclosed**2 / (radius * angle), radius)
    above = np.linspace(sections.bore_radius[0], sections.wedge_radius[0], 20_001)
    passage = np.trapezoid(1.0 / (above * sections.slot_angle(above[None])[0]), above)
    check.within(
        "leakage of a slot between parallel-sided teeth over that of a one-dimensional field",
        mouth(sections, 5).permeance[0] / (wound + passage),
        1.0,
        1.005,
        why="with straight walls the field across the slot hardly varies; flux that is free to "
        "vary finds more ways, never fewer",
        source="enclosed current squared over r times angle, by fine steps",
    )


TAPERS = {
    "half-closed": ((12, 4, 5), {}, 0.025),
    "straight": ((12, 4, 5), {"tip_span_ratio": 1.0}, 0.004),
    "pointed": ((12, 4, 5), {"tip_span_ratio": 0.6}, 0.010),
    "nearly closed, wide slot": ((6, 2, 1), {"tip_span_ratio": 1.8}, 0.06),
    "high wedge": ((24, 4, 5), {"wedge_height_mm": 4.0}, 0.015),
}


@pytest.mark.parametrize(("numbers", "changes", "error"), TAPERS.values(), ids=TAPERS.keys())
def test_taper_against_finite_elements(
    numbers: machines.Numbers,
    changes: dict[str, float],
    error: float,
) -> None:
    """`error` is that of the leakage with the evaluator's five modes."""
    sections = slot(numbers, **changes)
    compliance, share, permeance = solve_slot(sections, 5)
    answer = mouth(sections, 5)
    words = {
        "why": "modes of a channel lack the slope of the field at an oblique wall and converge "
        "with 1/modes only; five of them",
        "source": "finite elements (scikit-fem), converged to 1e-5",
    }
    name = next(name for name, taper in TAPERS.items() if taper == (numbers, changes, error))
    what = f"leakage permeance of a slot, {name}"
    check(what, answer.permeance[0], permeance, relative=error, **words)
    # What counts for the gap: potentials per current, the lowest mode most.
    what = "potential per current of the lowest mode of tapered slots"
    check(what, answer.compliance[0, 0, 0], compliance[0, 0], relative=0.02, **words)
    what = "potentials per current of all modes of tapered slots, over the lowest"
    lowest = compliance[0, 0]
    check(what, answer.compliance[0] / lowest, compliance / lowest, absolute=0.03, **words)
    what = "share of the slot's current in the modes of tapered slots"
    check(what, answer.current_share[0], share, absolute=0.008, **words)
    assert np.sign(answer.current_share[0, 1]) == np.sign(share[1])
    finer = mouth(sections, 20)
    left, coarse = (abs(item.permeance[0] / permeance - 1.0) for item in (finer, answer))
    # Six steps of the wedge and the wound part taken as one-dimensional leave half a per cent.
    assert left < max(0.6 * coarse, 0.005)


def test_depth_of_the_slot_matters_only_when_shallow() -> None:
    deep = mouth(slot(slot_depth_ratio=0.5, tip_span_ratio=1.0), 5)
    deeper = mouth(slot(slot_depth_ratio=1.0, tip_span_ratio=1.0), 5)
    np.testing.assert_allclose(deep.compliance, deeper.compliance, rtol=1e-3)
    assert (deeper.permeance > deep.permeance).all()


@pytest.mark.parametrize("span", [0.6, 1.0, 1.7])
def test_answer_is_passive_and_symmetric(span: float) -> None:
    answer = mouth(slot(tip_span_ratio=span), 6)
    matrix = answer.compliance[0]
    assert np.array_equal(matrix, matrix.T)
    assert (np.linalg.eigvalsh(matrix) > 0.0).all()
    # The slot is symmetrical about its axis: no exchange between even and odd modes.
    assert np.abs(matrix[0::2, 1::2]).max() < 1e-12
    assert np.abs(answer.current_share[0, 0::2]).max() < 1e-12
