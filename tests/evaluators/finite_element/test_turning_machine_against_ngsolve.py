"""Losses and force of a turning machine against `time_stepping.py`.

Linear iron lets the suspension field be a run of its own. The code under test has neither a rotor
mesh nor time.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import machines
import numpy as np
import pytest
from numpy.typing import NDArray
from outside import OutsideChecks

from evaluators.finite_element import analysis, transient
from evaluators.finite_element.model import Discretisation, FieldModel
from evaluators.finite_element.outcome.quantities import suspension_force
from evaluators.finite_element.rotor.answer import eddy_rotor
from evaluators.finite_element.rotor.eddy import EddyRotor
from evaluators.finite_element.solution.lanes import LANES
from evaluators.finite_element.solution.system import CurveTable
from evaluators.machine.field import excitation
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.materials.magnetization import MagnetizationCurve
from evaluators.machine.quantity import MU_0

time_stepping = pytest.importorskip("time_stepping", reason="NGSolve is missing")

FloatArray = NDArray[np.float64]
IRON = time_stepping.IRON
SOURCE = "NGSolve: curved second-order triangles, BDF2 in time, each magnet a conductor of its own"
losses = OutsideChecks("losses", SOURCE)
forces = OutsideChecks("force", SOURCE)
ONES = np.ones(LANES)


def linear_machine(
    numbers: machines.Numbers, separate: bool
) -> tuple[FieldModel, CrossSections, Any]:
    top = 30.0
    curve = MagnetizationCurve([0.0, top / (IRON * MU_0)], [0.0, top])
    task = machines.task(*numbers, sleeve="TiAl6V4")
    shaft = replace(task.materials.shaft, magnetization=curve)
    task = replace(task, materials=replace(task.materials, shaft=shaft))
    settings = Discretisation(transient=True, separate_magnets=separate)
    model = FieldModel(task, settings)
    model.stator_curve = CurveTable.linear(IRON)
    model.rotor_curve = model.shaft_curve
    sections = machines.sections(task, machines.designs(LANES))
    return model, sections, excitation(sections, np.full(LANES, 6e6), task.duty, task.construction)


@pytest.mark.slow
@pytest.mark.parametrize(
    ("numbers", "separate"),
    [((12, 4, 5), False), ((12, 5, 4), False), ((12, 1, 2), False), ((6, 2, 1), True)],
)
def test_turning_machine(numbers: machines.Numbers, separate: bool) -> None:
    model, sections, current = linear_machine(numbers, separate)
    fields = analysis.solve(model, sections, current)
    batch = fields.batch
    eddy = eddy_rotor(batch, ONES)
    # A plane field: endless pieces, and nothing slow in the shaft.
    endless = np.inf * ONES
    conductors = replace(eddy.conductors, shaft=1e-6, segment_length=endless, length=endless)
    eddy = EddyRotor(batch.rotor, batch.reluctivity, eddy.shaft_rings, conductors)
    main = transient.torque_field(batch, eddy, fields.loaded, current.torque, fields.separate)
    equations = batch.equations(model.suspension)
    control = transient.suspension_field(
        batch, equations, eddy, main.solution, fields.separate, fields.added
    )
    force, _ = suspension_force(batch, main.solution, control.small, control.added)
    lost = control.loss(current.suspension)

    highest, steps = 60, 720
    middle = 0.5 * float(sections.rotor_radius[0] + sections.bore_radius[0])
    stator = time_stepping.Stator(sections, middle, highest)
    space = 1.0 if separate else model.recoil
    sigma = (conductors.magnet, conductors.sleeve)
    rotor = time_stepping.TurningRotor(model, sections, middle, highest, space, sigma)
    time = 2.0 * np.pi / (steps * model.task.duty.speed)
    angles = 2.0 * np.pi * np.arange(steps + steps // 2) / steps
    slots = model.slots
    turning = np.exp(1j * model.pole_pairs * angles)
    torque = batch.torque_currents(angles, current.torque, slots)[:, :, 0]
    slot_mmf = model.task.winding.suspension_slot_mmf * float(current.suspension[0])
    control_x, control_y = (np.real(np.outer(turning * unit, slot_mmf)) for unit in (1.0, 1j))
    first, *others = time_stepping.run(
        stator,
        rotor,
        np.stack([torque, control_x, control_y], axis=-1),
        np.array([1.0, 0.0, 0.0]),
        time,
        steps,
    )
    # Steps of the finer time grid at which the code under test gives the force.
    place = force.angles * steps / (2.0 * np.pi)
    shared = np.abs(place - np.rint(place)) < 1e-6
    assert np.sum(shared) >= 72
    later = (np.rint(place[shared]).astype(int) - steps // 2) % steps
    for unit, other in zip((1.0, 1j), others, strict=True):
        found = time_stepping.cross_force(first, other, middle)[later]
        expected = (force.at(unit * current.suspension) - force.rest)[shared, 0]
        forces(
            "mean force of a turning machine with induced currents, amplitude and angle",
            expected.mean(),
            found.mean(),
            relative=3e-3,
            why="default mesh of the stator; measured 1e-4 to 1.5e-3",
        )
        forces(
            "force of a turning machine with induced currents, position by position",
            expected,
            found,
            absolute=0.007 * float(np.abs(found.mean())),
            unit="N/m",
            why="0.7 % of the mean force: default mesh of the stator; measured 3e-4 to 3.5e-3",
        )
    control_magnet, control_sleeve = (
        0.5 * sum(getattr(other, name) for other in others) for name in ("magnet", "sleeve")
    )
    for part, found, expected in (
        ("magnets", main.loss.magnet, first.magnet),
        ("sleeve", main.loss.sleeve, first.sleeve),
    ):
        losses(
            f"loss of the {part} of a turning machine by the torque field",
            found[0],
            expected,
            relative=0.02,
            why="mesh and time steps; measured 0.1 to 1.2 %, both refined 0.04 to 0.4 %",
        )
    for part, found, expected, tolerance, why in (
        (
            "magnets",
            lost.magnet,
            control_magnet,
            0.01,
            "mesh and steps: measured 0.01 to 0.4 %",
        ),
        (
            "sleeve",
            lost.sleeve,
            control_sleeve,
            0.05,
            "orders above 3/2 Q + p left out: 4 % with 12 slots and 2 poles, else below 1 %",
        ),
    ):
        losses(
            f"loss of the {part} of a turning machine by the suspension field",
            found[0],
            expected,
            relative=tolerance,
            why=why,
        )
