"""Loss of waves that run to and fro over separate magnets, against plain sums over the magnets.

At low speed the currents follow from the static field: -sigma dA/dt less its mean over a segment.
"""

from __future__ import annotations

from dataclasses import replace

import machines
import numpy as np
import pytest
from numpy.typing import NDArray

from evaluators.finite_element.model import Discretisation, FieldModel
from evaluators.finite_element.rotor.answer import RotorAnswer
from evaluators.finite_element.rotor.conducting_magnets import ConductingMagnets
from evaluators.finite_element.rotor.eddy import Conductors, EddyRotor
from evaluators.finite_element.rotor.harmonics import Harmonics
from evaluators.finite_element.rotor.separate_magnets import ring_of
from evaluators.finite_element.solution.batch import BatchField
from evaluators.finite_element.solution.lanes import LANES
from evaluators.machine.geometry.cross_sections import CrossSections

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

POLE_PAIRS, SEGMENTS = 4, 3
SPEED = 1.0  # rad/s: the field of the currents is a millionth of the other's
ONES = np.ones(LANES)


def rotor(arc_ratio: float) -> tuple[BatchField, EddyRotor, CrossSections]:
    task = machines.task(12, POLE_PAIRS, 5, construction={"magnet_segments": SEGMENTS})
    model = FieldModel(task, Discretisation(transient=True))
    sections = machines.sections(task, machines.designs(LANES, magnet_arc_ratio=arc_ratio))
    batch = BatchField(model, sections)
    conductors = replace(
        Conductors.of(task, sections.magnet_arc_ratio, np.inf * ONES),
        shaft=1e-6,
        sleeve=1e-6,
        segment_length=np.inf * ONES,
    )
    rings = model.discretisation.iron_rings
    return batch, EddyRotor(batch.rotor, batch.reluctivity, rings, conductors), sections


def summed_loss(
    eddy: EddyRotor, sections: CrossSections, orders: NDArray[np.int64], bore: ComplexArray
) -> float:
    """Mean loss, W/m, of A = 2 Re sum of bore_n exp(j (n phi + w t)) on the bore, signed n."""
    answer = ConductingMagnets(eddy, POLE_PAIRS, SEGMENTS, orders).answer(np.array([SPEED]))
    inside, outside = answer.core[0, 0] @ bore, answer.magnet[0, 0] @ bore
    low, high = float(sections.core_radius[0]), float(sections.magnet_radius[0])
    width = np.log(high / low)
    points, weights = np.polynomial.legendre.leggauss(24)
    x, along = 0.5 * (points + 1.0), 0.5 * weights
    n = np.abs(orders)[:, None] * width
    profile = inside[:, None] * np.sinh(n * (1.0 - x)) + outside[:, None] * np.sinh(n * x)
    profile = profile / np.sinh(n)
    pitch = np.pi / POLE_PAIRS
    angle = float(sections.magnet_arc_ratio[0]) * pitch / SEGMENTS
    area = (width * (low * np.exp(width * x)) ** 2 * along)[:, None] * (0.5 * angle * weights)
    loss = 0.0
    for pole in range(2 * POLE_PAIRS):
        for segment in range(SEGMENTS):
            phi = pole * pitch + (segment - 0.5 * (SEGMENTS - 1) + 0.5 * points) * angle
            field = 2.0 * profile.T @ np.exp(1j * np.outer(orders, phi))
            swing = field - np.sum(area * field) / np.sum(area)
            loss += 0.5 * eddy.conductors.magnet * SPEED**2 * np.sum(area * np.abs(swing) ** 2)
    return float(loss)


@pytest.mark.parametrize("arc_ratio", [0.6, 0.85])
def test_waves_to_and_fro_make_currents_together(arc_ratio: float) -> None:
    """In a real field order n at -w is order -n at w, which mixes with the others at w."""
    batch, eddy, sections = rotor(arc_ratio)
    orders = np.array([4, 12])
    speed = SPEED * np.array([[1.0, 1.0], [-1.0, -1.0]])
    generator = np.random.default_rng(5)
    wave = 1e-3 * (generator.normal(size=(2, 2)) + 1j * generator.normal(size=(2, 2)))

    def loss(real: bool) -> float:
        harmonics = Harmonics(orders, orders, speed, batch.model.angles, POLE_PAIRS, real)
        ring = ring_of(batch, batch.rotor.magnet_permeability)
        answer = RotorAnswer(harmonics, eddy, ring, SEGMENTS, 12, batch.response[orders])
        return float(answer.loss(wave[:, :, None] * ONES).magnet[0])

    ahead, behind = wave[0], np.conj(wave[1])
    both = np.concatenate([orders, -orders])
    together = summed_loss(eddy, sections, both, np.concatenate([ahead, behind]))
    apart = summed_loss(eddy, sections, orders, ahead) + summed_loss(
        eddy, sections, -orders, behind
    )
    # Square of the currents' own field over the other, and rounding: measured 1e-9.
    assert loss(real=True) == pytest.approx(together, rel=1e-7)
    assert loss(real=False) == pytest.approx(apart, rel=1e-7)
    # What the test is about: no small difference.
    assert abs(together / apart - 1.0) > 0.01
