"""The controller's data by both field models, which share no code but the winding."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.finite_element.evaluator import FiniteElementEvaluator
from evaluators.machine.geometry.variables import VARIABLE_NAMES
from studies.export.suspension import suspension_data
from studies.inspection.chosen import Chosen
from studies.inspection.design import Inspection
from studies.problem import machine_problem
from studies.stored.layout import Request, Results
from studies.study_file.definition import study_from

check = OutsideChecks(
    "force", "finite-element field, this project's other model; they share the winding alone"
)

# Wide teeth and yoke and little current: the iron is far from saturation, where models differ.
DESIGN = {
    "rotor_radius_mm": 18.0,
    "clearance_mm": 0.6,
    "sleeve_thickness_mm": 1.5,
    "magnet_thickness_mm": 4.0,
    "magnet_arc_ratio": 0.85,
    "core_ratio": 0.5,
    "tooth_width_ratio": 0.72,
    "tip_span_ratio": 1.2,
    "tip_height_mm": 1.2,
    "wedge_height_mm": 1.2,
    "slot_depth_ratio": 0.5,
    "yoke_ratio": 2.0,
    "current_density_A_mm2": 0.5,
}


@pytest.mark.slow
@pytest.mark.parametrize("family", ["Q6p2s1", "Q12p4s5"])
def test_analytic_and_finite_element_agree_where_iron_is_not_saturated(
    study_text: str, family: str, tmp_path_factory: pytest.TempPathFactory
) -> None:
    text = study_text.replace('name = "toy"', 'name = "analytic"')
    study = study_from(text.encode(), "small.toml")
    results = Results(tmp_path_factory.mktemp("none"), study, Request("", study.families, 1, 1))
    problem = machine_problem(study, family)
    point = np.array([[DESIGN[item.name] for item in problem.variables]])
    outcome = problem.evaluate(point)
    assert outcome.ok.all(), outcome.reason
    row = {name: float(values[0]) for name, values in outcome.columns.items()}
    row |= {name: DESIGN[name] for name in VARIABLE_NAMES}
    found = Inspection("hand-000000", "small", row, study.winding(family), {}, (), False, "EUR")
    analytic = Chosen(results, found, problem)
    evaluator = FiniteElementEvaluator(problem.task, {})
    numeric = Chosen(results, found, replace(problem, _built={"evaluator": evaluator}))
    one, two = suspension_data(analytic), suspension_data(numeric)
    check(
        "phases of the suspension currents, unsaturated",
        np.degrees(np.angle(np.exp(1j * (one.current_angle - two.current_angle)))),
        0.0,
        absolute=0.2,
        unit="° electrical",
        why="covers what saturation is left",
    )
    check(
        "force per ampere over that of the stored design, unsaturated",
        one.scale,
        two.scale,
        relative=0.03,
        why="the analytic slot takes its mouth as straight, worth 2 % here",
    )
    # How the force wanders over the turn, as complex harmonics of the x command.
    spectra = []
    for data in (one, two):
        force = data.per_ampere[:, 0, 0] + 1j * data.per_ampere[:, 1, 0]
        spectra.append(np.fft.fft(force) / len(force))
    orders = [k for k in range(-30, 31) if k]
    first, second = (np.array([item[k] for k in orders]) for item in spectra)
    strongest = np.abs(second).max()
    # Of the mean: the strongest harmonic itself is several per cent of it.
    assert strongest > 0.005 * abs(spectra[1][0])
    check(
        "harmonics of the force over the turn over the strongest, unsaturated",
        first / strongest,
        second / strongest,
        absolute=0.25,
        why="models of the mouth differ: by 16 % for 6 slots, 1 % for 12 (seen)",
    )
