"""Rotor losses of the static analysis: those of the transient one but for the stator's part."""

from __future__ import annotations

import machines
import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.finite_element import analysis
from evaluators.finite_element.mesh.lattice import Resolution
from evaluators.finite_element.model import Discretisation, FieldModel
from evaluators.finite_element.outcome import losses
from evaluators.finite_element.rotor.answer import RotorAnswer
from evaluators.finite_element.rotor.eddy import Conductors, EddyRotor
from evaluators.finite_element.rotor.harmonics import Harmonics
from evaluators.finite_element.rotor.separate_magnets import Ring
from evaluators.finite_element.rotor.uniform import NU_0, Rotor
from evaluators.finite_element.solution.lanes import LANES
from evaluators.machine.field import excitation

ONES = np.ones(LANES)

check = OutsideChecks("losses")


@pytest.mark.parametrize(
    ("numbers", "sleeve", "segments", "separate", "tolerance"),
    [
        # A stator of slots and real iron answers the currents a little otherwise than perfect iron:
        # measured 0.3 % at most; with a metal sleeve, which keeps out much of the field, 4 %.
        ((6, 2, 1), "Carbon fibre, wound", 1, False, 0.006),
        ((12, 4, 5), "Carbon fibre, wound", 3, True, 0.006),
        ((12, 5, 4), "TiAl6V4", 1, False, 0.06),
    ],
)
def test_static_loss_is_nearly_the_transient_one(
    numbers: machines.Numbers, sleeve: str, segments: int, separate: bool, tolerance: float
) -> None:
    task = machines.task(*numbers, sleeve=sleeve, construction={"magnet_segments": segments})
    sections = machines.sections(task, machines.scattered(LANES, seed=4))
    current = excitation(sections, np.full(LANES, 6e6), task.duty, task.construction)
    settings = Discretisation(
        resolution=Resolution(tooth=2, slot=2, tip=1, wedge=1, body=2, yoke=2),
        positions=8,
        cogging_positions=4,
        separate_magnets=separate,
    )
    fields = analysis.solve(FieldModel(task, settings), sections, current)
    transient = analysis.induce(fields, current)
    torque = analysis.evaluate(fields, current).field.torque
    static = losses.rotor_loss(
        fields.batch, torque, fields.loaded, fields.small, current.suspension, fields.separate
    )
    assert static.magnet == pytest.approx(transient.magnet, rel=tolerance)
    assert static.sleeve + static.shaft == pytest.approx(transient.sleeve, rel=tolerance)


# Solid cylinder, a = 10 mm, 58 MS/m, rotating field of 0.1 T, W/m.
CYLINDER = {50.0: 391.2065, 1000.0: 5861.523}


@pytest.mark.parametrize("frequency", CYLINDER)
def test_currents_weaken_the_field_of_a_current_sheet(frequency: float) -> None:
    """The sheet's field without currents goes in; the loss with them comes out."""
    bore = 15e-3
    rotor = Rotor(10e-3 * ONES[None], 11e-3 * ONES, 12e-3 * ONES, bore * ONES, 1.0, 1.0)
    none = np.inf * ONES
    copper = Conductors(58e6, 0.0, 0.0, np.pi * ONES, none, ONES, none)
    eddy = EddyRotor(rotor, np.full((1, LANES), NU_0), 1, copper)
    orders, speed = np.array([1]), np.array([2.0 * np.pi * frequency])
    y = eddy.response(orders, speed)
    # A = alpha r + beta/r with alpha = B/2, two-sided; h = nu0 (alpha r - beta/r) on the bore.
    h = 0.5 * 0.1 * bore * 2.0 * NU_0 * y / (NU_0 + y)
    nothing = np.zeros((1, LANES))
    answer = RotorAnswer(
        Harmonics(orders, orders, speed[None], np.zeros(1), 1, real=True),
        eddy,
        Ring(ONES, 1, 1.0, np.array([1]), nothing, nothing),
        segments=1,
        slots=12,
        static=NU_0 * ONES[None],
    )
    loss = answer.loss(answer.weakened((h / NU_0)[None]))
    check(
        "loss of a solid shaft from the field without its currents",
        loss.shaft,
        CYLINDER[frequency] * ONES,
        relative=1e-6,
        why="Bessel functions throughout; the table's last digit",
        source="own evaluation of Landau, Lifshitz, Electrodynamics of Continuous Media, section "
        "59, problem 2",
    )
