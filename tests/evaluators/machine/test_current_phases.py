"""Phases of the currents against the field solutions that find them on their own."""

from __future__ import annotations

import machines
import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.analytic.evaluator import AnalyticEvaluator
from evaluators.machine.winding.phases import current_phases

X = "suspension current of phase one, commanded along x"
Y = "suspension current of phase one, commanded along y"
EMF = "EMF of phase one per turn of a coil"

check = OutsideChecks("force", "slotted field of the analytic evaluator, this project's own route")


@pytest.mark.parametrize("numbers", [*machines.FAMILIES, (12, 2, 1), (18, 4, 5)], ids=str)
def test_phases_are_those_of_a_slotted_field_at_small_current(numbers: machines.Numbers) -> None:
    task = machines.task(*numbers)
    design = {**machines.DESIGN, "current_density_A_mm2": 1e-3}
    waves = {wave.name: wave for wave in AnalyticEvaluator(task).waveforms(design)}

    def phase(name: str) -> complex:
        wave = waves[name]
        phasor = np.mean(wave.values * np.exp(-1j * numbers[1] * wave.positions))
        return complex(phasor / abs(phasor))

    found = current_phases(task.winding)
    check(
        "phase of the EMF",
        phase(EMF),
        np.exp(1j * found.torque),
        absolute=1e-9,
        unit="rad",
        why="follows from symmetry alone: rounding",
    )
    check(
        "phases of the suspension currents along x and y",
        [phase(X), phase(Y)],
        np.exp([1j * found.suspension_x, 1j * found.suspension_y]),
        absolute=np.radians(0.02),
        unit="rad",
        why="torque current tilts the force in proportion to itself, about 10° at 6 A/mm², so "
        "0.002° here; ten times as much for a stronger armature",
    )
