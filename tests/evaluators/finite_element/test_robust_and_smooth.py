"""Random designs end as rows, and neighbouring designs have neighbouring metrics."""

from __future__ import annotations

from pathlib import Path

import machines
import numpy as np
import pytest

from evaluators.finite_element.evaluator import FiniteElementEvaluator
from evaluators.interface import Status
from evaluators.machine.geometry.variables import VARIABLE_NAMES
from studies.study_file.definition import load_study

STUDIES = Path(__file__).parents[3] / "studies/shipped"
FAMILIES = ("Q6p1s2", "Q12p1s2", "Q6p2s1", "Q12p2s1", "Q18p2s1", "Q12p4s5")

SMOOTH = (
    "stack_length_mm",
    "torque_ripple",
    "force_error_magnitude",
    "force_error_angle_deg",
    "loss_teeth_W",
    "loss_yoke_W",
    "loss_magnet_W",
    "displacement_stiffness_N_mm",
)


@pytest.mark.slow
@pytest.mark.parametrize("variable", machines.BOUNDS)
def test_no_mesh_noise_along_a_variable(variable: str) -> None:
    """A tenth of the variable's range in 48 steps: a quartic leaves next to nothing."""
    evaluator = FiniteElementEvaluator(machines.task(12, 4, 5), {})
    low, high = machines.BOUNDS[variable]
    middle, reach = machines.DESIGN[variable], 0.05 * (high - low)
    batch = machines.designs(48, **{variable: np.linspace(middle - reach, middle + reach, 48)})
    result = evaluator.evaluate(batch)
    assert np.all(result.status == Status.OK)
    share = np.linspace(-1.0, 1.0, 48)
    for name in SMOOTH:
        values = result.metrics[name]
        fit = np.polynomial.chebyshev.chebfit(share, values, 4)
        rest = np.abs(values - np.polynomial.chebyshev.chebval(share, fit))
        # Measured 3e-3 at most, where a largest value passes from one position to the next, and
        # 1e-4 else.
        assert rest.max() < 6e-3 * np.abs(values).mean(), name


@pytest.mark.slow
@pytest.mark.parametrize("family", FAMILIES)
def test_random_designs_end_as_rows(family: str) -> None:
    """Of 1000 designs from the box of the compressor study at least 99.9 % must be decided."""
    study = load_study(STUDIES / "compressor.toml")
    generator = np.random.default_rng(99)
    batch = {name: generator.uniform(*study.bounds[family][name], 1000) for name in VARIABLE_NAMES}
    result = FiniteElementEvaluator(study.task(family), {}).evaluate(batch)
    undecided = (result.status != Status.OK) & (result.status != Status.INVALID_GEOMETRY)
    assert undecided.sum() <= 1, result.reason[undecided]
