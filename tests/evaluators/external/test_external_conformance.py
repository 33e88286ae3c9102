"""The external evaluator keeps the contract of all evaluators, with a solver written in awk."""

from __future__ import annotations

import shutil
from collections.abc import Mapping
from pathlib import Path
from typing import ClassVar

import machines
import numpy as np
import pytest
from conformance import EvaluatorConformance
from outside import OutsideChecks

from evaluators import interface
from evaluators.analytic.evaluator import AnalyticEvaluator
from evaluators.external.evaluator import ExternalEvaluator
from evaluators.interface import ConsentError, Evaluator
from evaluators.machine.task.task import Task

AWK = shutil.which("awk")
SLOTLESS = ["awk", "-f", str(Path(__file__).with_name("slotless.awk")), "request.json"]

check = OutsideChecks("external")

pytestmark = pytest.mark.skipif(AWK is None, reason="the example solver needs awk")


@pytest.mark.parametrize("numbers", [(12, 4, 5), (6, 2, 1)], ids=str, scope="class")
class TestExternalConformance(EvaluatorConformance):
    name = "external"
    settings: ClassVar[Mapping[str, object]] = {"program": SLOTLESS, "keep": "none"}
    bad_settings = (
        {"no_such_setting": 1},
        {"program": "awk"},
        {"program": []},
        {"program": ["awk", "a\nb"]},
        {"program": ["awk", "\0"]},
        {"program": ["awk", "\ud800"]},
        {"timeout_s": 0},
        {"timeout_s": float("nan")},
        {"timeout_s": True},
        {"retries": -1},
        {"concurrency": 0},
        {"keep": "some"},
        {"metrics": ["no_such_metric"]},
        {"metrics": ["cost", "cost"]},
        {"field": "yes"},
        {"version": "x" * 65},
    )

    def build(self, task: Task) -> Evaluator:
        evaluator = ExternalEvaluator(task, self.settings)
        evaluator.allow_program()
        return evaluator


@pytest.mark.parametrize("numbers", [(12, 4, 5), (12, 5, 4), (12, 1, 2)], ids=str)
def test_closed_form_outside_agrees_with_the_model_inside(numbers: machines.Numbers) -> None:
    """The exchange carries geometry, magnets, winding and currents rightly.

    Solver and model share only the two files. Both are brought to the same remanence, for their
    losses differ.
    """
    task = machines.task(*numbers, ideal_iron=True, construction={"magnetisation": "radial"})
    batch = machines.designs(tip_span_ratio=1.8, yoke_ratio=1.5)
    outside = ExternalEvaluator(task, {"program": SLOTLESS, "keep": "none"})
    outside.allow_program()
    found = outside.evaluate(batch)
    assert found.reason.tolist() == [""]
    expected = AnalyticEvaluator(task).evaluate(batch)
    remanence = task.materials.magnet.remanence
    density, force = [], []
    for run in (found, expected):
        value = {name: float(column[0]) for name, column in run.metrics.items()}
        warm = float(remanence.at(value["magnet_temperature_C"]))
        density.append(value["gap_flux_density_T"] / warm)
        turns_metres = value["turns_per_coil"] * value["stack_length_mm"]
        force.append(value["force_per_ampere_N_A"] / (turns_metres * warm))
    words = {
        "why": "the closed form leaves out slot openings (Carter's factor below 1.06 here, once "
        "in each field) and the magnets' permeability of 1.05",
        "source": "slotless closed form as a program of its own (awk), through the exchanged files",
    }
    check("density in the gap", density[1], density[0], relative=0.05, **words)
    if numbers[2] > numbers[1]:
        check("force per ampere, ps = p + 1", force[1], force[0], relative=0.05, **words)
    else:
        # Pull and shear act against each other, which magnifies what differs.
        check("force per ampere, ps = p - 1", force[1], force[0], relative=0.15, **words)


def test_nothing_is_started_or_written_without_consent(tmp_path: Path) -> None:
    mark = tmp_path / "mark"
    folder = tmp_path / "work"
    settings = {
        "program": ["sh", "-c", f": > {mark}"],
        "folder": str(folder),
        "field": False,
        "metrics": ["cost"],
    }
    evaluator = ExternalEvaluator(machines.task(), settings)
    with pytest.raises(ConsentError, match="'sh'"):
        evaluator.evaluate(machines.designs())
    assert not mark.exists()
    assert not folder.exists()
    evaluator.allow_program()
    evaluator.evaluate(machines.designs())
    assert mark.exists()  # so the absence above proves something


@pytest.mark.usefixtures("entry_points_found")
def test_building_carries_consent_only_where_it_is_given() -> None:
    settings = {"program": SLOTLESS, "keep": "none"}
    plain = interface.build("external", machines.task(), settings)
    with pytest.raises(ConsentError):
        plain.evaluate(machines.designs())
    allowed = interface.build("external", machines.task(), settings, allow_program=True)
    assert np.isfinite(allowed.evaluate(machines.designs()).metrics["torque_Nm"]).all()
    # No program, no consent needed.
    interface.build("analytic", machines.task(), {}, allow_program=True)
