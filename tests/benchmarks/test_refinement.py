"""How far the default mesh and steps of the finite-element evaluator are from finer ones.

Random designs of every family of the shipped studies, at the default resolution and with twice the
cells in either direction, twice the rotor positions and twice the Fourier orders::

    HOVERGAP_REFINEMENT_DESIGNS=48 pytest tests/benchmarks/test_refinement.py -m benchmark -s
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from shipped_designs import CASES, LABELS, Case, number_from_environment

from evaluators.finite_element.evaluator import FiniteElementEvaluator
from evaluators.machine.field import FieldSolution, excitation
from evaluators.machine.geometry.cross_sections import cross_sections

pytestmark = pytest.mark.benchmark

FloatArray = NDArray[np.float64]
REFINEMENT = 2
DESIGNS = 16
NINTH_DECILE = 90.0

# Quantity: whether its change is relative, and the limit of the ninth decile. A tenth of what
# designs of a front differ by, and of what models of this kind are held to against measurements
# (common practice).
LIMITS: dict[str, tuple[bool, float]] = {
    "torque": (True, 3e-3),
    "torque_ripple": (False, 5e-3),
    "force": (True, 3e-3),
    "force_error_magnitude": (False, 3e-3),
    "force_error_angle": (False, np.radians(0.2)),
    "loss_teeth": (True, 2e-2),
    "loss_yoke": (True, 2e-2),
    "loss_iron_hysteresis": (True, 2e-2),
    "loss_iron_eddy": (True, 2e-2),
    "loss_iron_excess": (True, 2e-2),
    "loss_magnet": (True, 2e-2),
    "loss_sleeve": (True, 2e-2),
}


def solve(case: Case, designs: dict[str, FloatArray], refinement: int) -> FieldSolution:
    task = case.task()
    sections, _, _ = cross_sections(task.winding.family, designs, task.construction)
    density = 1e6 * designs["current_density_A_mm2"]
    exciting = excitation(sections, density, task.duty, task.construction)
    evaluator = FiniteElementEvaluator(task, {"refinement": refinement})
    return evaluator.field_solution(sections, exciting)


def changes(coarse: FieldSolution, fine: FieldSolution) -> dict[str, FloatArray]:
    """Change of every quantity of `LIMITS`, (n,)."""
    found = {}
    for name, (relative, _) in LIMITS.items():
        value, better = getattr(coarse, name), getattr(fine, name)
        found[name] = np.abs(value - better) / (np.abs(better) if relative else 1.0)
    return found


@pytest.mark.parametrize("case", CASES, ids=LABELS)
def test_finer_mesh_and_steps(case: Case) -> None:
    designs = case.valid(number_from_environment("HOVERGAP_REFINEMENT_DESIGNS", DESIGNS), seed=4)
    found = changes(solve(case, designs, 1), solve(case, designs, REFINEMENT))
    print(f"\n{case.study} {case.family}: change by refinement {REFINEMENT}")
    print(f"{'quantity':24}{'median':>10}{'90 %':>10}{'largest':>10}{'limit':>10}")
    missed = []
    for name, change in found.items():
        limit = LIMITS[name][1]
        decile = float(np.percentile(change, NINTH_DECILE))
        mark = "" if decile <= limit else "  missed"
        print(
            f"{name:24}{np.median(change):10.2g}{decile:10.2g}{change.max():10.2g}{limit:10.2g}{mark}"
        )
        if mark:
            missed.append(name)
    assert not missed
