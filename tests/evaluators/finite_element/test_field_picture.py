"""The field that pictures show: the evaluator's own, and one field across all borders."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import machines
import numpy as np
import pytest
from numpy.typing import NDArray

from evaluators.finite_element.evaluator import FiniteElementEvaluator
from evaluators.finite_element.picture.picture import Currents, FieldPicture, field_picture
from evaluators.finite_element.picture.rings import HIGHEST_IN_ROTOR, RING_STEPS
from evaluators.machine.field import FieldSolution, excitation

MU_0 = 4e-7 * np.pi
COARSE = {
    "cells": {"tooth": 2, "slot": 2, "tip": 1, "wedge": 1, "body": 2, "yoke": 2},
    "positions": 6,
    "cogging_positions": 4,
}
FAMILIES = [(6, 2, 1), (12, 4, 5)]


def evaluator(numbers: machines.Numbers, **options: object) -> FiniteElementEvaluator:
    return FiniteElementEvaluator(machines.task(*numbers, **options), COARSE)  # type: ignore[arg-type]


def polar(picture: FieldPicture, name: str) -> tuple[NDArray[np.float64], NDArray[np.complex128]]:
    """Radii (k,) of a ring and B_r + j B_phi there, (k, around), outermost ring of that name."""
    patch = picture.patch(name)
    z = (patch.x + 1j * patch.y).reshape(RING_STEPS[name] + 1, -1)
    density = (patch.flux_density @ np.array([1.0, 1j])).reshape(z.shape)
    return np.abs(z[:, 0]), density * np.conj(z) / np.abs(z)


def quantities(found: FiniteElementEvaluator) -> FieldSolution:
    """What the evaluator's metrics are made of, at the same magnet temperature as the picture."""
    task, batch = found.task, machines.designs(1)
    sections = machines.sections(task, batch)
    density = batch["current_density_A_mm2"] * 1e6
    exciting = excitation(sections, density, task.duty, task.construction)
    return found.field_solution(sections, exciting)


@pytest.mark.parametrize("numbers", FAMILIES)
def test_stress_in_the_gap_makes_the_torque_of_the_waveform(numbers: machines.Numbers) -> None:
    found = evaluator(numbers)
    angle = 0.11
    radius, field = polar(field_picture(found.model, machines.DESIGN, angle), "clearance")
    torque = 2.0 * np.pi * radius**2 / MU_0 * np.mean(field.real * field.imag, axis=1)
    # Maxwell: the same on every circle. Rounding of sums over a thousand points.
    assert torque == pytest.approx(torque[0], rel=1e-9)
    wave = next(item for item in found.waveforms(machines.DESIGN) if item.name == "torque")
    # Six positions and their interpolation leave 0.1 % of the mean.
    expected = np.interp(angle, wave.positions, wave.values)
    assert torque[0] == pytest.approx(expected, abs=2e-3 * abs(wave.values.mean()))


@pytest.mark.parametrize("numbers", FAMILIES)
def test_gap_density_is_the_evaluators(numbers: machines.Numbers) -> None:
    found = evaluator(numbers)
    pairs = numbers[1]
    waves = []
    for angle in found.model.cogging_angles:
        picture = field_picture(found.model, machines.DESIGN, float(angle), Currents(torque=False))
        _, field = polar(picture, "clearance")
        around = 2.0 * np.pi * np.arange(field.shape[1]) / field.shape[1]
        waves.append(2.0 * np.mean(field[-1].real * np.exp(-1j * pairs * (around - angle))))
    # Both stop their Newton iterations at 1e-4.
    expected = quantities(found).gap_flux_density[0]
    assert abs(np.mean(waves)) == pytest.approx(expected, rel=1e-3)


@pytest.mark.parametrize("numbers", FAMILIES)
def test_density_in_the_teeth_is_the_evaluators(numbers: machines.Numbers) -> None:
    # The smallest suspension current allowed: its field adds a thousandth to the metric.
    found = evaluator(numbers, duty={"suspension_share": 0.001})
    model, cells = found.model, COARSE["cells"]
    assert isinstance(cells, dict)
    tooth, body = cells["tooth"], slice(cells["tip"] + cells["wedge"], -cells["yoke"])
    axis = np.exp(1j * model.pitch * np.arange(model.slots))[:, None, None, None]
    largest = 0.0
    for angle in model.angles:
        picture = field_picture(model, machines.DESIGN, float(angle))
        density = picture.element_flux_density @ np.array([1.0, 1j])
        left = np.real(density[:, body, :tooth] * np.conj(axis))
        right = np.real(np.roll(density, 1, axis=0)[:, body, -tooth:] * np.conj(axis))
        area = picture.element_area[body, :tooth]
        total = np.sum(left * area, axis=(2, 3)) + np.sum(right * area[:, ::-1], axis=(2, 3))
        largest = max(largest, float(np.abs(total / (2.0 * area.sum(axis=(1, 2)))).max()))
    # The evaluator takes the more loaded face of a row of cells, this its mean: leakage between.
    assert largest == pytest.approx(quantities(found).tooth_flux_density[0], rel=0.01)


@pytest.mark.parametrize("numbers", FAMILIES)
@pytest.mark.parametrize("angle", [0.0, 0.2])
def test_field_is_one_across_borders(numbers: machines.Numbers, angle: float) -> None:
    found = evaluator(numbers)
    picture = field_picture(found.model, machines.DESIGN, angle)
    rings = [polar_potential(picture, k) for k in range(1, len(picture.patches))]
    scale = float(np.ptp(picture.patch("stator").potential))
    for (_, inside), (outside, _) in pairwise(rings):
        # Each ring is solved from the potential on its faces, so only rounding is left.
        assert inside == pytest.approx(outside, abs=1e-9 * scale)
    stator = picture.patch("stator")
    bore = float(picture.sections.bore_radius[0])
    edge = np.abs(np.hypot(stator.x, stator.y) - bore) < 1e-9
    around = rings[0][0].size
    there = np.arctan2(stator.y[edge], stator.x[edge]) % (2.0 * np.pi)
    on_gap = np.interp(
        there, 2.0 * np.pi * np.arange(around) / around, rings[0][0], period=2.0 * np.pi
    )
    # 40 orders a slot leave out the sharpest part of the kinks at tooth edges; measured 0.2 %.
    assert on_gap == pytest.approx(stator.potential[edge], abs=5e-3 * scale)


def polar_potential(
    picture: FieldPicture, number: int
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Potential on the outer and on the inner face of a ring."""
    patch = picture.patches[number]
    values = patch.potential.reshape(RING_STEPS[patch.name] + 1, -1)
    return values[-1], values[0]


def test_tangential_field_is_one_across_sleeve_and_magnets() -> None:
    """With radial magnets H_phi is B_phi/mu on both sides."""
    found = evaluator((12, 4, 5), construction={"magnetisation": "radial"})
    picture = field_picture(found.model, machines.DESIGN, 0.1)
    _, gap = polar(picture, "clearance")
    _, sleeve = polar(picture, "sleeve")
    _, magnet = polar(picture, "magnets")
    scale = np.abs(gap.imag).max()
    assert sleeve[-1].imag == pytest.approx(gap[0].imag, abs=1e-9 * scale)
    kept = slice(1, HIGHEST_IN_ROTOR * 12 + 1)  # the orders that go on into the magnets
    outside = np.fft.rfft(sleeve[0].imag)[kept] / gap.shape[1]
    inside = np.fft.rfft(magnet[-1].imag / found.model.recoil)[kept] / gap.shape[1]
    assert inside == pytest.approx(outside, abs=1e-9 * scale)


def test_triangles_cover_the_whole_circle_once() -> None:
    picture = field_picture(evaluator((12, 4, 5)).model, machines.DESIGN, 0.3)
    total = 0.0
    for patch in picture.patches:
        x, y = patch.x[patch.triangles], patch.y[patch.triangles]
        total += 0.5 * float(
            np.abs(
                (x[:, 1] - x[:, 0]) * (y[:, 2] - y[:, 0])
                - (x[:, 2] - x[:, 0]) * (y[:, 1] - y[:, 0])
            ).sum()
        )
    circle = np.pi * float(picture.sections.outer_radius[0]) ** 2
    # A chord for each arc of 30/32 degrees and more cuts off less than 1e-3 of the area.
    assert circle * (1.0 - 1e-3) < total < circle


def test_command_of_force_adds_its_current() -> None:
    """The commanded force, by Maxwell stress from the drawn field, points where it should."""
    found = evaluator((12, 4, 5))
    mean = 0.0 + 0.0j
    for angle in found.model.angles:
        radius, field = polar(
            field_picture(found.model, machines.DESIGN, float(angle), Currents(True, 1.0)),
            "clearance",
        )
        around = np.exp(2j * np.pi * np.arange(field.shape[1]) / field.shape[1])
        mean += np.pi * radius[2] / MU_0 * np.mean(field[2] ** 2 * around) / found.model.angles.size
    # The evaluator's is linear in the suspension current and a mean over the turn, this over 60
    # electrical degrees: the force's harmonics make up to a tenth.
    assert abs(mean) == pytest.approx(quantities(found).force[0], rel=0.1)
    assert np.angle(mean) == pytest.approx(1.0, abs=0.1)


def test_impossible_design_is_refused() -> None:
    impossible = {**machines.DESIGN, "magnet_thickness_mm": 25.0}
    with pytest.raises(ValueError, match="magnet_thickness_mm"):
        field_picture(evaluator((12, 4, 5)).model, impossible)


def test_field_that_does_not_converge_is_refused() -> None:
    model = evaluator((12, 4, 5)).model
    newton = replace(model.discretisation.newton, iterations=1)
    model.discretisation = replace(model.discretisation, newton=newton)
    with pytest.raises(ValueError, match="did not converge"):
        field_picture(model, machines.DESIGN)
