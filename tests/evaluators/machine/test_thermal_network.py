"""The lumped heat network: circuit laws, and the network of the machine."""

from __future__ import annotations

from dataclasses import replace

import machines
import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.machine.materials.gas import gas_state
from evaluators.machine.task.cooling import Cooling
from evaluators.machine.task.task import Task
from evaluators.machine.thermal.coolant import frame_conductance
from evaluators.machine.thermal.machine import NODES, conduction_of, machine_network
from evaluators.machine.thermal.network import Network, series

check = OutsideChecks("heat")
BY_HAND = {"relative": 1e-7, "why": "rounding", "source": "circuit laws, by hand"}


def test_two_nodes_by_hand() -> None:
    """10 W over 2 W/K to a node that 4 W/K hold to 20 degC: 22.5 and 27.5 degC."""
    net = Network(1, ("inside", "outside"))
    net.connect("inside", "outside", np.array([2.0]))
    net.connect_to("outside", 20.0, np.array([4.0]))
    found = net.solve(np.array([[10.0, 0.0]]))
    check("temperatures of two nodes in line", found, [[27.5, 22.5]], **BY_HAND)
    np.testing.assert_allclose(net.outflow(found), [10.0])


def test_growing_source_is_solved_in_one_step() -> None:
    """5 W at 0 degC and 0.5 W/K more against 1 W/K to 0 degC: (5 + T/2) = T."""
    net = Network(1, ("wire",))
    net.connect_to("wire", 0.0, np.array([1.0]))
    found = net.solve(np.array([[5.0]]), np.array([[0.5]]))
    check("temperature of a wire whose loss grows with it", found, [[10.0]], **BY_HAND)


def test_resistances_in_series() -> None:
    assert series(1.0, 2.0, 1.0) == pytest.approx(0.25)


def build(task: Task, rows: int = 12) -> tuple[Network, np.ndarray]:
    sections = machines.sections(task, machines.scattered(rows, seed=3))
    length = np.linspace(0.03, 0.2, rows)
    gas = gas_state(task.materials.gas, np.full(rows, 80.0))
    solids = conduction_of(task, sections, np.full(rows, 0.4))
    return machine_network(task, sections, solids, length, gas, np.full(rows, 80.0)), length


def test_machine_conserves_heat_and_is_reciprocal() -> None:
    net, _ = build(machines.task())
    rows, count = net.rows, len(NODES)
    sources = np.random.default_rng(1).uniform(0.0, 100.0, (rows, count))
    found = net.solve(sources)
    np.testing.assert_allclose(net.outflow(found), sources.sum(axis=1), rtol=1e-9)
    # A watt in one node warms another as much as the other way round.
    rise = np.stack(
        [net.solve(np.tile(np.eye(count)[k], (rows, 1))) - 40.0 for k in range(count)], axis=1
    )
    np.testing.assert_allclose(rise, np.swapaxes(rise, 1, 2), rtol=1e-9)
    assert np.all(rise > 0.0)
    # Without losses everything is as cold as the coolant.
    np.testing.assert_allclose(net.solve(np.zeros((rows, count))), 40.0, rtol=1e-12)


def test_heat_of_the_yoke_meets_resistances_in_line() -> None:
    """A watt in the yoke flows out by yoke, joint, frame and jacket alone, but for side paths."""
    task = machines.task()
    task = replace(task, cooling=Cooling(method="coefficient", heat_transfer_coefficient=500.0))
    net, length = build(task)
    sections = machines.sections(task, machines.scattered(net.rows, seed=3))
    outside = sections.outer_radius
    middle = 0.5 * (sections.slot_radius + outside)
    steel = task.materials.stator_steel
    iron = float(steel.thermal_conductivity.at(100.0)) * float(steel.stacking_factor.value)
    resistance = (
        np.log(outside / middle) / (2.0 * np.pi * iron * length)
        + 1.0 / (task.cooling.joint_conductance * 2.0 * np.pi * outside * length)
        + np.log1p(task.cooling.frame_thickness / outside) / (2.0 * np.pi * 160.0 * length)
        + 1.0 / (500.0 * 2.0 * np.pi * (outside + task.cooling.frame_thickness) * length)
    )
    watt = np.zeros((net.rows, len(NODES)))
    watt[:, NODES.index("yoke")] = 1.0
    rise = net.solve(watt)[:, NODES.index("yoke")] - 40.0
    assert np.all(rise <= resistance)
    check(
        "rise of a yoke that alone is heated",
        rise,
        resistance,
        relative=0.06,
        why="some per cent leave through the winding and the end shields",
        source="yoke, joint, frame and jacket in line, by hand",
    )


def test_still_walls_see_the_swirl_and_not_the_rotor() -> None:
    """Gas between a turning and a still face turns at less than half the speed (by symmetry)."""
    task = machines.task()
    net, _ = build(task)
    sections = machines.sections(task, machines.scattered(net.rows, seed=3))
    count = len(NODES)
    rise = np.stack(
        [net.solve(np.tile(row, (net.rows, 1))) - 40.0 for row in np.eye(count)], axis=1
    )
    # The matrix of conductances is the inverse of that of rises per watt.
    conductance = -np.linalg.inv(rise)[:, NODES.index("end_space"), NODES.index("frame")]
    shields = conductance / (2.0 * np.pi * sections.outer_radius**2)
    surface = sections.rotor_radius * task.duty.speed
    check.within(
        "swirl in the end space over the speed of the rotor's surface",
        ((shields / 15.0 - 1.0) / 0.4) ** (1.0 / 0.9) / surface,
        0.4,
        0.5,
        why="between a turning and a still face, 0.4 to 0.46 of the speed when turbulent, less "
        "than half by symmetry",
        source="enclosed rotating discs (from memory), by Schubert's coefficient backwards",
    )


def test_blown_gap_cools_the_rotor() -> None:
    task = machines.task()
    still, _ = build(task)
    blown, _ = build(replace(task, cooling=Cooling(gap_flow=2e-3, gap_flow_temperature=40.0)))
    watt = np.zeros((still.rows, len(NODES)))
    watt[:, NODES.index("magnets")] = 20.0
    magnets = NODES.index("magnets")
    assert np.all(blown.solve(watt)[:, magnets] < still.solve(watt)[:, magnets])
    np.testing.assert_allclose(blown.outflow(blown.solve(watt)), 20.0, rtol=1e-9)


def test_blown_gap_takes_up_what_its_mean_temperature_says() -> None:
    """Twice the heat capacity of the flow times the mean rise over the inlet: first law."""
    task = replace(machines.task(), cooling=Cooling(gap_flow=2e-3, gap_flow_temperature=90.0))
    net, _ = build(task)
    found = net.solve(np.zeros((net.rows, len(NODES))))
    gas = gas_state(task.materials.gas, 80.0)
    carried = 2.0 * float(gas.density * gas.specific_heat) * 2e-3
    brought = carried * (90.0 - found[:, NODES.index("gap")])
    assert np.all(brought > 1.0)  # warm gas heats the machine ...
    outside, frame = machines.sections(task, machines.scattered(net.rows, seed=3)), "frame"
    length = np.linspace(0.03, 0.2, net.rows)
    jacket = frame_conductance(
        task.cooling, outside.outer_radius + task.cooling.frame_thickness, length
    )
    # ... and all of it leaves through the jacket.
    taken = jacket * (found[:, NODES.index(frame)] - 40.0)
    check(
        "heat of warm gas blown through the gap, at the jacket",
        taken,
        brought,
        relative=1e-9,
        why="rounding of the solution",
        source="first law: twice the flow's heat capacity times its mean fall",
    )


def test_heat_runs_along_the_copper_as_in_rods() -> None:
    """Rods heated in the slot and cooled in the end turn, by finite volumes along a closed ring.

    Slot and end turn follow each other round a coil; what is set free in one part is taken out
    evenly in the other. Poor resin leaves the heat no other way than the copper.
    """
    task = machines.task()
    poor = Cooling(impregnation_conductivity=0.02, liner_conductivity=0.02)
    task = replace(task, cooling=poor)
    net, length = build(task)
    sections = machines.sections(task, machines.scattered(net.rows, seed=3))
    end = sections.end_turn_length(task.construction)
    moved = np.zeros((net.rows, len(NODES)))
    winding, end_turns = NODES.index("winding"), NODES.index("end_turns")
    moved[:, winding], moved[:, end_turns] = 10.0, -10.0
    found = net.solve(moved)
    slots = sections.family.slots
    copper = 394.0 * (1.0 - 0.00015 * 80.0) * 0.4 * sections.slot_area * slots
    for row in range(net.rows):
        cells = 400
        x = (np.arange(2 * cells) + 0.5) / cells
        step = np.where(x < 1.0, length[row], end[row]) / cells
        heat = np.where(x < 1.0, 10.0, -10.0) / cells
        # Heat flow between cells of one closed ring that holds all the copper.
        flow = np.cumsum(heat)
        flow -= flow[cells - 1] / 2.0  # half leaves the slot at either end
        between = 0.5 * (step + np.roll(step, -1))
        rise = np.concatenate([[0.0], np.cumsum(-flow * between / copper[row])[:-1]])
        difference = rise[:cells].mean() - rise[cells:].mean()
        check(
            "slot part of the winding over its end turns",
            found[row, winding] - found[row, end_turns],
            difference,
            relative=0.04,
            why="a little still leaves through the resin",
            source="heat along a closed copper ring by 800 finite volumes",
        )
