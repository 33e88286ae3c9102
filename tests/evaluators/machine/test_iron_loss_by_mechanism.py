"""Hysteresis, classical eddy and excess loss of whole machines, told apart by frequency."""

from __future__ import annotations

from dataclasses import replace

import machines
import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.analytic.evaluator import AnalyticEvaluator
from evaluators.finite_element.evaluator import FiniteElementEvaluator
from evaluators.machine.field import FieldSolution, excitation
from evaluators.machine.losses.iron import iron_loss_sine
from evaluators.machine.performance import performance
from evaluators.machine.task.task import Task

MECHANISMS = ("hysteresis", "eddy", "excess")
POWERS = dict(zip(MECHANISMS, (1.0, 2.0, 1.5), strict=True))
SPEED = machines.task().duty.speed

check = OutsideChecks("losses")


def at_speed(factor: float) -> Task:
    # The excitation depends on the slot alone, so a still field is the same at any speed.
    return machines.task(12, 4, 5, duty={"speed": factor * SPEED})


def field(task: Task, evaluator: str) -> FieldSolution:
    batch = machines.designs(2, tooth_width_ratio=np.array([0.35, 0.5]))
    sections = machines.sections(task, batch)
    exciting = excitation(
        sections, 1e6 * batch["current_density_A_mm2"], task.duty, task.construction
    )
    if evaluator == "analytic":
        return AnalyticEvaluator(task).model.solve(sections, exciting)
    return FiniteElementEvaluator(task).field_solution(sections, exciting)


@pytest.mark.parametrize("evaluator", ["analytic", "finite_element"])
def test_powers_of_the_frequency(evaluator: str) -> None:
    """The same flux at other frequencies."""
    slow, fast = (field(at_speed(factor), evaluator) for factor in (1.0, 3.0))
    for name, power in POWERS.items():
        before, after = (getattr(item, f"loss_iron_{name}") for item in (slow, fast))
        assert np.all(before > 0.0)
        check(
            f"growth of the {name} loss of machines with frequency",
            after / before,
            3.0**power,
            relative=1e-9,
            why="the flux is the same numbers: rounding",
            source="f, f² and f^1.5 of Bertotti, IEEE Trans. Magn. 24(1), 1988",
        )


@pytest.mark.parametrize("evaluator", ["analytic", "finite_element"])
def test_mechanisms_add_up_to_teeth_and_yoke(evaluator: str) -> None:
    found = field(machines.task(12, 4, 5), evaluator)
    parts = [getattr(found, f"loss_iron_{name}") for name in MECHANISMS]
    np.testing.assert_allclose(np.sum(parts, axis=0), found.loss_teeth + found.loss_yoke, rtol=1e-9)


def test_sum_of_three_frequencies_gives_back_the_parts() -> None:
    """The measurement that separates losses: the total at three frequencies, solved for three."""
    factor = np.array([1.0, 2.0, 4.0])
    found = [field(at_speed(item), "analytic") for item in factor]
    total = np.array([item.loss_teeth + item.loss_yoke for item in found])
    matrix = np.stack([factor**power for power in POWERS.values()], axis=1)
    for name, part in zip(MECHANISMS, np.linalg.solve(matrix, total), strict=True):
        check(
            f"{name} loss of machines by separation",
            getattr(found[0], f"loss_iron_{name}"),
            part,
            relative=1e-8,
            why="nine digits are left by the condition of the matrix, about 100",
            source="total at three frequencies, as measured: Fiorillo, Measurement and "
            "Characterization of Magnetic Materials, 2004, ch. 7 (from memory)",
        )


def test_a_field_without_mechanisms_is_split_by_the_law_of_the_steel() -> None:
    task = machines.task(12, 4, 5)
    batch = machines.designs(1)
    sections = machines.sections(task, batch)
    exciting = excitation(
        sections, 1e6 * batch["current_density_A_mm2"], task.duty, task.construction
    )
    solved = AnalyticEvaluator(task).model.solve(sections, exciting)
    # All iron in the teeth, at the density where the law's shares are those of the table below.
    steel = task.materials.stator_steel
    density = np.array([1.2 * float(steel.stacking_factor.value)])
    bare = replace(
        solved,
        loss_yoke=0.0 * density,
        tooth_flux_density=density,
        loss_iron_hysteresis=None,
        loss_iron_eddy=None,
        loss_iron_excess=None,
    )
    # The field at the temperature it was solved with, so that the density stays as given.
    fixed = replace(task, cooling=replace(task.cooling, temperatures="fixed"))
    metrics = performance(fixed, sections, exciting, bare).metrics
    law = iron_loss_sine(steel.losses, 1.2, task.electrical_frequency)
    for name, part in zip(MECHANISMS, law, strict=True):
        share = metrics[f"loss_iron_{name}_W"] / metrics["loss_iron_W"]
        assert share[0] == pytest.approx(float(part / law.total), rel=1e-9)
    total = sum(metrics[f"loss_iron_{name}_W"][0] for name in MECHANISMS)
    assert total == pytest.approx(metrics["loss_iron_W"][0], rel=1e-12)


def test_some_mechanisms_without_the_others_are_refused() -> None:
    with pytest.raises(ValueError, match="mechanism"):
        replace(field(machines.task(12, 4, 5), "analytic"), loss_iron_eddy=None)
