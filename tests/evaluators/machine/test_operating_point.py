"""Temperatures, losses, remanence and length of a design fit each other."""

from __future__ import annotations

from dataclasses import replace

import machines
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from outside import OutsideChecks

from evaluators.analytic.evaluator import AnalyticEvaluator
from evaluators.machine.drive.wire import choose_strands
from evaluators.machine.field import Excitation, FieldSolution, excitation
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.materials.gas import gas_state
from evaluators.machine.performance import performance
from evaluators.machine.performance.operating import (
    CEILING,
    NODE,
    Operating,
    settle,
    study_temperatures,
)
from evaluators.machine.task.cooling import Cooling
from evaluators.machine.task.task import Conditions, Task
from evaluators.machine.thermal.conduction import (
    heated_bar_mean_rise,
    heated_bar_peak_rise,
    mixture_conductivity,
)
from evaluators.machine.thermal.machine import machine_network

FIXED = Cooling(temperatures="fixed")

check = OutsideChecks("heat")


class Solved:
    """Sections, excitation and field of some designs of one task."""

    def __init__(self, task: Task, batch: dict[str, np.ndarray]) -> None:
        self.task = task
        self.sections: CrossSections = machines.sections(task, batch)
        density = batch["current_density_A_mm2"] * 1e6
        self.exciting: Excitation = excitation(self.sections, density, task.duty, task.construction)
        self.field: FieldSolution = AnalyticEvaluator(task).model.solve(
            self.sections, self.exciting
        )

    def settle(
        self, task: Task, start: float | None = None, field: FieldSolution | None = None
    ) -> Operating:
        rows = len(self.sections)
        area = 0.5 * self.sections.slot_area
        strands = choose_strands(np.ones(rows), 0.85 * area, 0.42 * area, 0.4e-3, 2, 0.85)
        first = study_temperatures(task, rows)
        if start is not None:
            first = np.full_like(first, start)
        return settle(task, self.sections, self.exciting, field or self.field, strands, first)

    def metrics(self, task: Task) -> dict[str, np.ndarray]:
        done = performance(task, self.sections, self.exciting, self.field)
        assert np.all(done.reasons == ""), done.reasons
        return dict(done.metrics)


@pytest.fixture(scope="module")
def solved() -> Solved:
    return Solved(machines.task(), machines.scattered(40, seed=2))


@pytest.mark.parametrize("sleeve", ["Carbon fibre, wound", "NiCr19NbMo"])
def test_losses_leave_through_the_coolant(sleeve: str) -> None:
    """First law: what is lost in the machine flows to the coolant, friction included."""
    task = machines.task(sleeve=sleeve)
    solved = Solved(task, machines.scattered(20, seed=4))
    state = solved.settle(task)
    assert np.all(state.settled)
    assert state.solids is not None
    gas = gas_state(task.materials.gas, np.minimum(state.temperature("gap"), CEILING))
    net = machine_network(
        task,
        solved.sections,
        state.solids,
        state.length,
        gas,
        np.minimum(state.temperature("end_space"), CEILING),
    )
    field, length = state.field, state.length
    lost = state.copper_slots + state.copper_ends + state.friction
    lost = lost + length * (field.loss_teeth + field.loss_yoke + field.loss_magnet)
    lost = lost + length * field.loss_sleeve
    check(
        "heat into the coolant of a settled machine",
        net.outflow(state.temperatures),
        lost,
        relative=2e-3,
        why="the last step of the iteration was below 0.02 K of some tens",
        source="first law: all losses, friction included",
    )


def test_same_end_from_any_start(solved: Solved) -> None:
    usual = solved.settle(solved.task)
    for start in (-20.0, 250.0):
        other = solved.settle(solved.task, start)
        assert np.all(other.settled)
        # Both stop within 0.02 K a step of the same point, closing in by half or faster.
        np.testing.assert_allclose(other.temperatures, usual.temperatures, atol=0.1, rtol=1e-3)


def test_fixed_temperatures_are_those_of_the_study(solved: Solved) -> None:
    conditions = Conditions(
        winding_temperature=130.0, magnet_temperature=100.0, sleeve_temperature=90.0
    )
    task = replace(solved.task, cooling=FIXED, conditions=conditions)
    found = solved.metrics(task)
    np.testing.assert_allclose(found["winding_temperature_C"], 130.0)
    np.testing.assert_allclose(found["hot_spot_temperature_C"], 140.0)  # allowance of 10 K
    np.testing.assert_allclose(found["magnet_temperature_C"], 100.0)
    np.testing.assert_allclose(found["sleeve_temperature_C"], 90.0)
    np.testing.assert_allclose(found["insulation_margin_K"], 15.0)  # class F
    # The field was solved at 100 degC, so the flux is untouched.
    np.testing.assert_allclose(found["gap_flux_density_T"], solved.field.gap_flux_density)


def test_torque_follows_the_remanence(solved: Solved) -> None:
    """IEC 60404-8-1 style data: -0.11 to -0.12 percent per kelvin, so a warm rotor is longer."""
    magnet = solved.task.materials.magnet.remanence
    cool = solved.settle(replace(solved.task, cooling=Cooling(coolant_temperature=40.0)))
    warm = solved.settle(replace(solved.task, cooling=Cooling(coolant_temperature=90.0)))
    for state in (cool, warm):
        ratio = magnet.at(np.minimum(state.temperature("magnets"), CEILING)) / magnet.at(100.0)
        np.testing.assert_allclose(state.field.torque, solved.field.torque * ratio, rtol=1e-4)
        # First law at the shaft: what the field makes leaves as shaft power, in friction, and in
        # the iron and rotor that turn against it; nothing else takes mechanical power.
        made = state.field.torque * state.length * solved.task.duty.speed
        turned = state.field.loss_teeth + state.field.loss_yoke
        turned = turned + state.field.loss_magnet + state.field.loss_sleeve
        left = solved.task.duty.power + state.friction + turned * state.length
        np.testing.assert_allclose(made, left, rtol=1e-9)  # linear in the length, so rounding only
    assert np.all(warm.length > cool.length)
    assert np.all(warm.temperatures > cool.temperatures)


def test_a_field_solved_with_induced_currents_has_their_drag(solved: Solved) -> None:
    field = replace(solved.field, force_angle_bias=np.zeros_like(solved.field.torque))
    usual, braked = solved.settle(solved.task), solved.settle(solved.task, field=field)
    eddy = usual.field.loss_magnet + usual.field.loss_sleeve
    np.testing.assert_allclose(
        braked.net_torque - usual.net_torque,
        eddy / solved.task.duty.speed,
        rtol=0.02,  # temperatures, and with them the remanence and the friction, differ a little
        atol=1e-3 * usual.net_torque.max(),
    )
    assert np.all(braked.length < usual.length)


def test_copper_loss_has_the_resistance_of_its_temperature(solved: Solved) -> None:
    task = replace(solved.task, cooling=FIXED)
    cold = replace(task, conditions=Conditions(winding_temperature=20.0))
    hot = replace(task, conditions=Conditions(winding_temperature=120.0))
    # The end turns have no eddy currents.
    ratio = solved.settle(hot).copper_ends / solved.settle(cold).copper_ends
    check(
        "copper loss of end turns at 120 °C over that at 20 °C",
        ratio,
        355.0 / 255.0,
        relative=3e-3,
        why="rule and 0.00393 1/K agree within 0.3 % up to 200 °C",
        source="rule of (235 + t) of IEC 60034-1",
    )


def test_better_cooling_is_cooler(solved: Solved) -> None:
    poor = Cooling(method="coefficient", heat_transfer_coefficient=60.0)
    good = Cooling(method="coefficient", heat_transfer_coefficient=600.0)
    before = solved.settle(replace(solved.task, cooling=poor))
    after = solved.settle(replace(solved.task, cooling=good))
    assert np.all(before.settled)
    assert np.all(after.temperatures < before.temperatures)


def test_overloaded_winding_has_a_finite_temperature_beyond_its_class() -> None:
    """Copper that outruns its cooling settles above the ceiling instead of failing the search."""
    task = machines.task(construction={"end_turn_extension": 0.05})
    batch = machines.designs(2, current_density_A_mm2=np.array([5.0, 50.0]))
    solved = Solved(task, batch)
    weak = Cooling(method="coefficient", heat_transfer_coefficient=30.0)
    state = solved.settle(replace(task, cooling=weak))
    assert np.all(state.settled)
    assert np.all(np.isfinite(state.temperatures))
    assert state.temperatures[1, NODE["end_turns"]] > CEILING
    found = solved.metrics(replace(task, cooling=weak))
    assert found["insulation_margin_K"][1] < -100.0
    assert found["rotor_material_margin_K"][1] < 0.0


@settings(max_examples=25, deadline=None)
@given(
    flow=st.floats(1e-6, 1e-3),
    coolant=st.floats(40.0, 90.0),
    gap=st.sampled_from([0.0, 1e-4, 5e-3]),
    method=st.sampled_from(["jacket", "forced air", "coefficient"]),
)
def test_settles_under_any_cooling(
    solved: Solved, flow: float, coolant: float, gap: float, method: str
) -> None:
    cooling = Cooling(
        method=method,  # type: ignore[arg-type]
        coolant_flow=flow,
        coolant_temperature=coolant,
        gap_flow=gap,
        heat_transfer_coefficient=10.0 + 1e6 * flow,
    )
    state = solved.settle(replace(solved.task, cooling=cooling))
    assert np.all(state.settled), state.change
    assert np.all(state.temperatures >= 39.0)  # nothing is colder than coolant and inlet


def test_hot_spot_is_the_middle_of_the_slot(solved: Solved) -> None:
    """Peak less mean of a bar with cold walls, twice as deep as the slot (adiabatic mouth)."""
    task = solved.task
    found = solved.metrics(task)
    sections = solved.sections
    depth = sections.slot_radius - sections.wedge_radius
    width = sections.slot_area / depth
    mixture = mixture_conductivity(
        found["copper_fill"],
        float(task.materials.conductor.thermal_conductivity.at(100.0)),
        task.cooling.impregnation_conductivity,
    )
    length = 1e-3 * found["stack_length_mm"]
    slots = sections.family.slots
    # Loss per volume of slot part and end turns together: they differ by temperature alone.
    volume = slots * sections.slot_area * (length + sections.end_turn_length(task.construction))
    source = found["loss_copper_W"] / volume
    excess = heated_bar_peak_rise(source, width, 2.0 * depth, mixture)
    excess = excess - heated_bar_mean_rise(source, width, 2.0 * depth, mixture)
    rise = found["hot_spot_temperature_C"] - 10.0 - found["winding_temperature_C"]
    check(
        "hot spot over the mean of the winding",
        rise,
        excess,
        relative=0.5,
        absolute=6.0,
        unit="K",
        why="slot and end turns differ from their common mean by some kelvin either way",
        source="heated bar with cold walls, twice as deep as the slot; loss spread evenly",
    )
    assert np.all(rise > 0.0)
