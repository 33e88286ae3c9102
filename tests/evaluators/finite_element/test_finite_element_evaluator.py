"""The finite-element evaluator keeps the contract of all evaluators."""

from __future__ import annotations

import tomllib
from dataclasses import replace
from pathlib import Path
from typing import Any

import machines
import numpy as np
import pytest
from conformance import EvaluatorConformance

from evaluators.finite_element import analysis
from evaluators.finite_element.evaluator import FiniteElementEvaluator
from evaluators.finite_element.mesh.geometry import MeshError
from evaluators.interface import Evaluator, EvaluatorError
from evaluators.machine.field import Excitation
from evaluators.machine.geometry.cross_sections import CrossSections
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


def test_only_the_design_that_cannot_be_meshed_fails(monkeypatch: pytest.MonkeyPatch) -> None:
    evaluator = FiniteElementEvaluator(machines.task(), COARSE)
    batch = machines.scattered(11, seed=3)
    whole = evaluator.evaluate(batch)
    bad = 1e-3 * batch["rotor_radius_mm"][[2, 9]]
    solve = analysis.solve

    def solve_some(model: Any, sections: CrossSections, exciting: Excitation) -> Any:
        if np.any(np.isclose(sections.rotor_radius[:, None], bad)):
            msg = "a cell of the mesh is folded over"
            raise MeshError(msg)
        return solve(model, sections, exciting)

    monkeypatch.setattr(analysis, "solve", solve_some)
    found = evaluator.evaluate(batch)
    failed = np.isin(np.arange(11), [2, 9])
    assert np.all(whole.status == "ok")
    assert found.status.tolist() == np.where(failed, "failed", "ok").tolist()
    assert set(found.reason[failed].tolist()) == {"a cell of the mesh is folded over"}
    for name, column in found.metrics.items():
        assert np.array_equal(column, np.where(failed, np.nan, whole.metrics[name]), equal_nan=True)


def test_a_field_that_does_not_converge_fails_its_own_row(monkeypatch: pytest.MonkeyPatch) -> None:
    evaluator = FiniteElementEvaluator(machines.task(), COARSE)
    batch = machines.scattered(5, seed=3)
    evaluate = analysis.evaluate

    def third_fails(*arguments: Any) -> analysis.Result:
        result = evaluate(*arguments)
        return replace(result, converged=np.arange(result.converged.size) != 2)

    monkeypatch.setattr(analysis, "evaluate", third_fails)
    found = evaluator.evaluate(batch)
    assert found.status.tolist() == ["ok", "ok", "failed", "ok", "ok"]
    assert "did not converge" in found.reason[2]
    assert all(np.isnan(column[2]) for column in found.metrics.values())
