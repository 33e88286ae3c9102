"""The EMF over the turn against the law of induction and against the analytic field."""

from __future__ import annotations

import machines
import numpy as np
import pytest
from numpy.typing import NDArray
from outside import OutsideChecks

from evaluators.analytic.evaluator import AnalyticEvaluator
from evaluators.finite_element.evaluator import FiniteElementEvaluator
from evaluators.finite_element.model import Discretisation, FieldModel
from evaluators.finite_element.outcome.emf import emf, phase_linkage
from evaluators.finite_element.solution.batch import BatchField
from evaluators.finite_element.solution.lanes import LANES
from evaluators.finite_element.solution.newton import Settings
from evaluators.machine.field import excitation

FloatArray = NDArray[np.float64]
EMF = "EMF of phase one per turn of a coil"
# Sectors of either sign and the whole circle, odd and even pole pairs, both signs of ps - p.
NUMBERS = [(12, 4, 5), (12, 5, 4), (6, 1, 2), (18, 4, 5)]
SOME = [
    pytest.param(numbers, marks=pytest.mark.slow) if numbers in NUMBERS[1::2] else numbers
    for numbers in NUMBERS
]

check = OutsideChecks("field")


def linked(batch: BatchField, potential: FloatArray) -> FloatArray:
    """Flux of phase one coil by coil: potential (t, slots of the sector, LANES) of go less return.

    Every sector's potential is that of the one before times its sign.
    """
    winding, sector = batch.model.task.winding, batch.model.symmetry.torque
    around = np.concatenate([potential * sector.sign**k for k in range(sector.count)], axis=1)
    back, go = winding.coil_slots[winding.phase == 0].T
    sense = winding.sense[winding.phase == 0][:, None]
    return np.asarray(((around[:, go] - around[:, back]) * sense).sum(axis=1))


@pytest.mark.parametrize("numbers", NUMBERS, ids=str)
def test_emf_is_the_change_of_the_flux_linkage(numbers: machines.Numbers) -> None:
    """At any rotor angle of the turn."""
    task = machines.task(*numbers)
    model = FieldModel(task, Discretisation(newton=Settings(tolerance=1e-9)))
    sections = machines.sections(task, machines.scattered(LANES, seed=6))
    batch = BatchField(model, sections)
    none = np.zeros(LANES)
    batch.settle_rotor_iron(0.0, none)
    linkage = phase_linkage(batch, batch.solve_torque(model.cogging_angles, none))
    found = emf(linkage, task.duty.speed)
    count = len(linkage)
    assert count == model.task.winding.family.cogging_periods * model.cogging_angles.size
    # Places all over the turn, in other sectors and beyond one electrical period.
    places = (count * np.array([0.0, 0.13, 0.31, 0.58, 0.83])).astype(np.int64)
    step = 1e-4 / numbers[1]
    for place in places.tolist():
        angle = 2.0 * np.pi * place / count
        before, here, after = linked(
            batch,
            batch.solve_torque(np.array([angle - step, angle, angle + step]), none).linkage,
        )
        # The same field, continued by symmetry: what the iteration leaves.
        largest = np.abs(linkage).max(axis=0)
        np.testing.assert_allclose(linkage[place] / largest, here / largest, atol=1e-7)
        rate = (after - before) / (2.0 * step) * task.duty.speed
        peak = np.abs(found).max(axis=0)
        check(
            "EMF over the turn over its peak",
            found[place] / peak,
            rate / peak,
            absolute=1e-2,
            why="orders beyond half the samples of a cogging period are cut off: measured 7e-3 of "
            "the peak with six slots and two poles, else 2e-3",
            source="Faraday's law: differences between fields solved at neighbouring angles",
        )


@pytest.mark.parametrize("numbers", SOME, ids=str)
def test_fundamental_is_that_of_the_analytic_field(numbers: machines.Numbers) -> None:
    task = machines.task(*numbers)
    # Broad teeth and yoke: hardly saturated.
    design = {
        **machines.DESIGN,
        "tooth_width_ratio": 0.7,
        "yoke_ratio": 1.5,
        "magnet_thickness_mm": 2.5,
    }
    phasors = []
    for evaluator in (FiniteElementEvaluator(task), AnalyticEvaluator(task)):
        wave = {wave.name: wave for wave in evaluator.waveforms(design)}[EMF]
        phasors.append(2.0 * np.mean(wave.values * np.exp(-1j * numbers[1] * wave.positions)))
    check(
        "fundamental EMF of a hardly saturated machine",
        phasors[0],
        phasors[1],
        relative=0.01,
        why="two field models; 0.1 % to 0.3 % measured",
        source="slotted field of the analytic evaluator, this project's own route",
    )


def test_fundamental_is_the_back_emf_and_in_phase_with_the_torque_current() -> None:
    task = machines.task(12, 4, 5)
    evaluator = FiniteElementEvaluator(task)
    wave = {wave.name: wave for wave in evaluator.waveforms(machines.DESIGN)}[EMF]
    phasor = 2.0 * np.mean(wave.values * np.exp(-1j * 4 * wave.positions))
    sections = machines.sections(task, machines.designs())
    exciting = excitation(sections, np.array([6e6]), task.duty, task.construction)
    field = evaluator.field_solution(sections, exciting)
    speed = 2.0 * np.pi * task.electrical_frequency
    # Two ways through the same samples: rounding.
    assert abs(phasor) == pytest.approx(speed * field.flux_linkage[0], rel=1e-9)
    turned = np.angle(phasor * np.exp(-1j * evaluator.model.symmetry.torque_phase))
    assert turned == pytest.approx(0.0, abs=1e-6)
