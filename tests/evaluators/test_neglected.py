"""The own estimates in `evaluators/NEGLECTED.md`: what is left out of the invented machine."""

from __future__ import annotations

import machines
import numpy as np
import pytest

from evaluators.analytic.evaluator import AnalyticEvaluator
from evaluators.machine.demagnetisation import ArmatureReaction
from evaluators.machine.losses.eddy import rotor_eddy_loss
from evaluators.machine.materials import library as materials
from evaluators.machine.materials.library import ElectricalSteel
from evaluators.machine.performance.circuit import END_TURN_PERMEANCE
from evaluators.machine.quantity import MU_0

WINDINGS = ((12, 4, 5), (12, 1, 2), (6, 2, 1), (12, 2, 1))


def machine(numbers: machines.Numbers) -> dict[str, float]:
    found = AnalyticEvaluator(machines.task(*numbers)).evaluate(machines.designs())
    return {name: float(values[0]) for name, values in found.metrics.items()}


def end_turn_share(numbers: machines.Numbers) -> float:
    """Of the torque inductance."""
    task, value = machines.task(*numbers), machine(numbers)
    end = machines.sections(task, machines.designs()).end_turn_length(task.construction)[0]
    turns = value["turns_per_coil"] * numbers[0] / 3.0 / value["parallel_groups"]
    inductance = 2.0 / numbers[1] * turns**2 * MU_0 * end * END_TURN_PERMEANCE
    return float(inductance / (1e-3 * value["torque_inductance_mH"]))


def ripple(numbers: machines.Numbers) -> tuple[float, float]:
    """Loss of switching ripple in the magnets over all losses, in the strands over the copper's.

    Two-level inverter of 12 pulses a period, at least 20 kHz; all ripple voltage, 0.7 of the
    fundamental (common practice), at 1.5 times the switching frequency and on the torque
    inductance. The magnets are whole poles.
    """
    task, value = machines.task(*numbers), machine(numbers)
    sections = machines.sections(task, machines.designs())
    fundamental = task.electrical_frequency
    frequency = 1.5 * max(12.0 * fundamental, 20e3)
    reactance = 2.0 * np.pi * frequency * 1e-3 * value["torque_inductance_mH"]
    current = 0.7 * value["phase_voltage_V"] / reactance
    winding = ArmatureReaction.of(task.winding)
    main = winding.orders == numbers[1]
    density = ArmatureReaction(winding.orders[main], winding.pattern[main]).per_ampere_turn(
        sections.core_radius,
        sections.magnet_radius,
        sections.bore_radius,
        sections.slot_opening_angle,
    )
    density = density * value["turns_per_coil"] * current / value["parallel_groups"]
    arc = machines.DESIGN["magnet_arc_ratio"]
    length = 1e-3 * value["stack_length_mm"]
    loss = rotor_eddy_loss(
        [float(numbers[1])],
        [frequency],
        density[:, None],
        iron_radius=sections.core_radius,
        magnet_radius=sections.magnet_radius,
        rotor_radius=sections.rotor_radius,
        bore_radius=sections.bore_radius,
        length=[length],
        magnet_resistivity=[task.materials.magnet.resistivity.at(80.0)],
        magnet_segment_angle=[arc * np.pi / numbers[1]],
        magnet_coverage=[arc],
        sleeve_resistivity=[task.materials.sleeve.resistivity.at(80.0)],
    )
    share = current / (np.sqrt(2.0) * value["torque_current_A"])
    strands = value["loss_strand_eddy_W"] * (share * frequency / fundamental) ** 2
    return (
        float(loss.magnet[0, 0]) * length / value["loss_total_W"],
        strands / value["loss_copper_W"],
    )


@pytest.mark.parametrize("numbers", WINDINGS, ids=str)
def test_end_turns_and_ripple_are_as_large_as_the_page_says(numbers: machines.Numbers) -> None:
    assert 0.015 < end_turn_share(numbers) < 0.135  # 2 to 13 %
    magnets, strands = ripple(numbers)
    assert 0.15 < magnets < 0.85  # a fifth to four fifths
    assert 0.001 < strands < 0.27  # a tenth of a per cent to a quarter


def test_ripple_is_the_largest_thing_left_out() -> None:
    found = [ripple(numbers)[0] for numbers in WINDINGS]
    assert min(found) < 0.25
    assert max(found) > 0.75


def test_pull_of_a_displaced_rotor_is_nearly_linear() -> None:
    """(1 - e²)^-1.5 of a two-pole pull in a thin gap (Covo 1954, from memory) is 1 + 1.5 e²."""
    clearance, touchdown, zone = 0.6, 0.5, 0.3
    gap = 0.6 + 1.6 + 3.0
    assert [machines.DESIGN[f"{name}_mm"] for name in (
        "clearance", "sleeve_thickness", "magnet_thickness"
    )] == [0.6, 1.6, 3.0]  # fmt: skip
    at_touchdown = 1.5 * (touchdown * clearance / gap) ** 2
    assert at_touchdown == pytest.approx(0.005, rel=0.02)
    assert 1.5 * (zone * touchdown * clearance / gap) ** 2 < 0.001


def sheet_skin_factor(steel: str, flux_density: float, frequency: float) -> float:
    """Classical eddy loss with skin effect over that without, at the permeability of B.

    (3/x)(sinh x - sin x)/(cosh x - cos x), x = thickness over skin depth: Bozorth, Ferromagnetism,
    1951 (from memory).
    """
    sheet = materials.load(ElectricalSteel, steel)
    permeability = flux_density / float(sheet.magnetization.field(np.array([flux_density]))[0])
    depth = np.sqrt(float(sheet.resistivity.value) / (np.pi * frequency * permeability))
    x = float(sheet.thickness.value) / depth
    return float(3.0 / x * (np.sinh(x) - np.sin(x)) / (np.cosh(x) - np.cos(x)))


@pytest.mark.parametrize(
    ("steel", "left"),
    [("NO20-1200", 19 / 20), ("M270-35A", 2 / 3), ("M330-50A", 1 / 2)],
)
def test_skin_effect_of_sheets_is_as_large_as_the_page_says(steel: str, left: float) -> None:
    # The page rounds to a simple fraction.
    assert sheet_skin_factor(steel, 1.0, 3200.0) == pytest.approx(left, abs=0.04)
    assert sheet_skin_factor(steel, 1.0, 9600.0) < left - 0.1
    assert sheet_skin_factor(steel, 1.5, 3200.0) > 0.97
