"""Saturated designs as a search keeps them, by both field models.

The finite-element model shares nothing with the analytic one but the cross-section; it is held
against other programs in its own tests.
"""

from __future__ import annotations

from dataclasses import replace

import machines
import numpy as np
import pytest
from numpy.typing import NDArray
from outside import OutsideChecks

from evaluators.analytic import network
from evaluators.analytic.model import AnalyticModel, Resolution
from evaluators.finite_element.evaluator import FiniteElementEvaluator
from evaluators.machine.field import FieldSolution, excitation
from evaluators.machine.task.task import Task

FloatArray = NDArray[np.float64]

check = OutsideChecks("force", "this project's finite elements, see their own checks")

# A magnet over the whole pole makes a sinusoidal field: all that shakes the force is iron.
HALF_CLOSED = {
    "rotor_radius_mm": [25.8, 18.4, 18.0, 19.1, 18.0, 19.5],
    "sleeve_thickness_mm": [3.9, 2.4, 2.0, 2.9, 2.2, 2.5],
    "magnet_thickness_mm": [7.9, 8.1, 6.5, 6.7, 8.7, 5.0],
    "magnet_arc_ratio": [1.0, 1.0, 1.0, 1.0, 1.0, 1.0],
    "core_ratio": [0.4, 0.74, 0.74, 0.74, 0.69, 0.77],
    "tooth_width_ratio": [0.68, 0.66, 0.61, 0.65, 0.61, 0.59],
    "tip_span_ratio": [1.55, 1.56, 1.4, 1.42, 1.51, 1.47],
    "tip_height_mm": [0.63, 1.08, 0.62, 0.88, 0.61, 0.76],
    "wedge_height_mm": [1.93, 1.34, 1.11, 1.04, 1.72, 0.8],
    "slot_depth_ratio": [0.77, 1.06, 0.92, 0.87, 0.98, 0.87],
    "yoke_ratio": [1.14, 1.91, 1.35, 1.29, 1.34, 1.44],
    "current_density_A_mm2": [8.0, 5.2, 7.0, 6.4, 7.0, 9.0],
}


def both(of: Task, changes: dict[str, list[float]]) -> tuple[FieldSolution, FieldSolution]:
    rows = len(next(iter(changes.values())))
    batch = {name: np.full(rows, value) for name, value in machines.DESIGN.items()}
    batch |= {name: np.array(values) for name, values in changes.items()}
    sections = machines.sections(of, batch)
    exciting = excitation(sections, batch["current_density_A_mm2"] * 1e6, of.duty, of.construction)
    return (
        AnalyticModel(of, Resolution()).solve(sections, exciting),
        FiniteElementEvaluator(of, {}).field_solution(sections, exciting),
    )


def test_saturated_tooth_tips_shake_the_force() -> None:
    of = machines.task(6, 1, 2, construction={"magnetisation": "parallel", "copper_fill": 0.42})
    ours, theirs = both(of, HALF_CLOSED)
    # Teeth and yoke far below saturation: without the tips the error would be a tenth.
    assert theirs.yoke_flux_density.max() < 1.1
    check(
        "force error by saturated tooth tips over that by finite elements, median",
        float(np.median(ours.force_error_magnitude / theirs.force_error_magnitude)),
        1.0,
        absolute=0.35,
        why="a flange is one flux and one voltage here; without flanges the ratio is about 0.1",
    )
    check(
        "force with saturated tooth tips over that by finite elements",
        ours.force / theirs.force,
        np.ones(6),
        absolute=0.015,
        why="1 % at most seen, 2 to 4 % without flanges",
    )


@pytest.mark.parametrize("numbers", [(18, 2, 1), (12, 5, 4)], ids=str)
def test_yoke_between_knee_and_saturation(numbers: machines.Numbers) -> None:
    of = machines.task(*numbers)
    changes = {
        "rotor_radius_mm": [24.0] * 3,
        "yoke_ratio": [0.85, 0.9, 1.0],
        "tip_span_ratio": [1.0] * 3,
    }
    ours, theirs = both(of, changes)
    assert theirs.yoke_flux_density.min() > 1.35
    assert theirs.yoke_flux_density.max() > 1.5
    check(
        "force with a saturated yoke over that by finite elements",
        ours.force / theirs.force,
        np.ones(3),
        absolute=0.06,
        why="a circuit with one flux a slot pitch; without the bulge into the teeth 0.12 to 0.16",
    )


def test_rotor_in_a_slotted_stator() -> None:
    """Stiffness and densities of the rotor where iron takes nothing, and slots are wide."""
    of = machines.task(12, 4, 5, ideal_iron=True)
    of = replace(of, construction=replace(of.construction, magnetisation="radial"))
    changes = {"tip_span_ratio": [0.7, 1.0, 1.3, 1.6], "magnet_arc_ratio": [0.7, 0.8, 0.9, 1.0]}
    ours, theirs = both(of, changes)
    check(
        "stiffness of a displaced rotor in a slotted stator over that by finite elements",
        ours.displacement_stiffness / theirs.displacement_stiffness,
        np.ones(4),
        absolute=0.025,
        why="of slotting only the standing wave of each order counts; up to 0.43 for a smooth bore",
    )
    check(
        "largest density of the rotor core over that by finite elements",
        ours.core_flux_density / theirs.core_flux_density,
        np.ones(4),
        absolute=0.01,
        why="the same harmonics; their sum counts, 0.1 to 0.16 more than the fundamental",
    )
    check(
        "lowest density at the surface of the magnets by finite elements, T",
        ours.magnet_flux_density,
        theirs.magnet_flux_density,
        absolute=0.01,
        why="as many harmonics; slotting beyond them is left out",
    )


def test_bulge_of_a_stream_over_a_deep_slit() -> None:
    """Area that a slit in its wall adds to a stream, over the square of its width."""
    deep, wide = 4, 12  # stream and length in slit widths
    added = []
    for fine in (4, 8, 16):  # cells a slit width
        inside = np.zeros(((deep + 1) * fine, wide * fine), dtype=np.bool_)
        inside[fine:] = True
        middle = wide * fine // 2
        inside[:fine, middle - fine // 2 : middle + fine // 2] = True
        added.append((_conductance(inside) / _conductance(inside[fine:]) - 1.0) * wide * deep)
    # The corners slow the convergence to no whole order: Aitken's extrapolation.
    first, second = added[1] - added[0], added[2] - added[1]
    check(
        "area that a deep slit in its wall adds to a stream, in squares of its width",
        added[2] + second**2 / (first - second),
        network.BULGE,
        relative=0.02,
        why="extrapolated from a quarter to a sixteenth of the slit; a slit as deep as wide",
        source="w^2/(2 pi), conformal map (own derivation), against finite differences",
    )


def _conductance(inside: NDArray[np.bool_]) -> float:
    """Conductance from left to right of cells of unit conductivity, ends held at 1 and 0."""
    from scipy.sparse import coo_matrix
    from scipy.sparse.linalg import spsolve

    number = np.full(inside.shape, -1)
    number[inside] = np.arange(inside.sum())
    pairs = [
        (number[:, :-1], number[:, 1:]),
        (number[:-1], number[1:]),
    ]
    first = np.concatenate([a[(a >= 0) & (b >= 0)] for a, b in pairs])
    second = np.concatenate([b[(a >= 0) & (b >= 0)] for a, b in pairs])
    size = int(inside.sum())
    ends = (number[:, 0][number[:, 0] >= 0], number[:, -1][number[:, -1] >= 0])
    diagonal = np.bincount(first, minlength=size) + np.bincount(second, minlength=size)
    diagonal = diagonal.astype(np.float64)
    for end in ends:
        diagonal[end] += 2.0  # half a cell to the electrode
    matrix = coo_matrix((-np.ones(first.size), (first, second)), shape=(size, size))
    matrix = (matrix + matrix.T).tocsc()
    matrix.setdiag(diagonal)
    load = np.zeros(size)
    load[ends[0]] = 2.0
    potential = spsolve(matrix.tocsc(), load)
    return float(np.sum(2.0 * potential[ends[1]]))
