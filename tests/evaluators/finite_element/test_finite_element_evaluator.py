"""The finite-element evaluator keeps the contract of all evaluators."""

from __future__ import annotations

import tomllib
from pathlib import Path

import machines
import numpy as np
import pytest
from conformance import EvaluatorConformance

from evaluators.finite_element.evaluator import FiniteElementEvaluator
from evaluators.interface import Evaluator, EvaluatorError
from evaluators.machine.task.task import Task

COARSE = {
    "cells": {"tooth": 2, "slot": 2, "tip": 1, "wedge": 1, "body": 2, "yoke": 2},
    "positions": 6,
    "cogging_positions": 4,
}
PROJECT = tomllib.loads((Path(__file__).parents[3] / "pyproject.toml").read_text())["project"]
REGISTERED = "finite_element" in PROJECT["entry-points"]["hovergap.evaluators"]


@pytest.mark.parametrize("numbers", [(6, 2, 1), (12, 5, 4)], scope="class")
class TestFiniteElement(EvaluatorConformance):
    name = "finite_element"
    settings = COARSE
    bad_settings = ({"no_such_setting": 1}, {"positions": 0}, {"refinement": 1.5})
    independence = 0.0  # lanes never mix

    def build(self, task: Task) -> Evaluator:
        return FiniteElementEvaluator(task, COARSE)

    @pytest.fixture(autouse=True)
    @classmethod
    def _declared(cls, request: pytest.FixtureRequest) -> None:
        if "entry_points_found" in request.fixturenames and not REGISTERED:
            pytest.skip("the entry point is not declared yet")


@pytest.mark.parametrize(
    ("settings", "words"),
    [
        ({"mesh": 3}, "no setting 'mesh'"),
        ({"positions": 2}, "positions = 2 must lie between 4 and 240"),
        ({"positions": "many"}, "positions = 'many' must be a whole number"),
        ({"cells": {"tooth": 0}}, "tooth = 0 must be a whole number"),
        ({"cells": {"teeth": 2}}, "must be a table with some of tooth, slot"),
        ({"cells": {"yoke": 65}}, "yoke = 65 cells must lie between 1 and 64"),
    ],
)
def test_bad_settings_are_refused_by_name(settings: dict[str, object], words: str) -> None:
    with pytest.raises(EvaluatorError, match=words):
        FiniteElementEvaluator(machines.task(), settings)


def test_refinement_refines_everything() -> None:
    coarse = FiniteElementEvaluator(machines.task(), COARSE).model
    fine = FiniteElementEvaluator(machines.task(), {**COARSE, "refinement": 2}).model
    assert fine.angles.size == 2 * coarse.angles.size
    assert fine.orders == 2 * coarse.orders
    # All nodes but the outermost row: 3 R C a slot.
    assert fine.torque.size == 4 * coarse.torque.size


def test_waveforms_agree_with_the_metrics() -> None:
    evaluator = FiniteElementEvaluator(machines.task(), COARSE)
    batch = machines.designs(1)
    metrics = evaluator.evaluate(batch).metrics
    waves = {wave.name: wave for wave in evaluator.waveforms({k: v[0] for k, v in batch.items()})}
    torque = waves["torque"].values
    assert np.ptp(torque) / torque.mean() == pytest.approx(metrics["torque_ripple"][0], rel=1e-9)
    force = waves["force along x, commanded along x"].values
    error = np.max(np.abs(np.abs(force) - force.mean())) / force.mean()
    # The metric takes the worse of the commands along x and y, and |F| instead of F_x.
    assert 0.5 * metrics["force_error_magnitude"][0] < error
    assert error < metrics["force_error_magnitude"][0] + metrics["force_error_angle_deg"][0] ** 2
    across = waves["force along y, commanded along x"].values
    # By definition of the command the mean force has no component across it.
    assert abs(across.mean()) < 1e-9 * force.mean()


def test_force_curve_starts_at_the_linear_force_and_bends() -> None:
    evaluator = FiniteElementEvaluator(machines.task(), COARSE)
    batch = machines.designs(1, yoke_ratio=0.8, current_density_A_mm2=12.0)
    waves = {wave.name: wave for wave in evaluator.waveforms({k: v[0] for k, v in batch.items()})}
    curve = waves["force against suspension current"]
    per_ampere = curve.values / curve.positions
    linear = waves["force along x, commanded along x"].values.mean()
    share = evaluator.task.duty.suspension_share
    slope = linear / (share * curve.positions[-1])
    # An eighth of the slot current hardly bends the curve; the mean is taken over few positions.
    assert per_ampere[0] == pytest.approx(slope, rel=0.02)
    # Suspension current first relieves the side that the torque current saturates, then saturates
    # the other: the force per ampere passes a maximum (here 3 % above its start).
    top = int(np.argmax(per_ampere))
    assert np.all(np.diff(per_ampere[top:]) < 0.0)
    assert np.ptp(per_ampere) > 0.01 * slope
