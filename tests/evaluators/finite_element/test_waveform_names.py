"""What tells the suspension controller its job carries the same names from both evaluators."""

from __future__ import annotations

import machines

from evaluators.analytic.evaluator import AnalyticEvaluator
from evaluators.finite_element.evaluator import FiniteElementEvaluator


def test_torque_force_command_and_emf_are_named_alike() -> None:
    task = machines.task(12, 4, 5)
    design = {name: float(values[0]) for name, values in machines.designs().items()}
    analytic = {wave.name: wave.unit for wave in AnalyticEvaluator(task).waveforms(design)}
    finite = {wave.name: wave.unit for wave in FiniteElementEvaluator(task).waveforms(design)}
    shared = {
        name: unit
        for name, unit in analytic.items()
        if name.startswith(("torque", "cogging", "force", "suspension", "EMF"))
    }
    assert len(shared) >= 11
    assert shared.items() <= finite.items()
