"""Fields with currents induced in the rotor, in the periodic steady state.

The stator is solved position by position, the rotor answers frequency by frequency
(`rotor/answer.py`), and both must agree on the bore. Torque field: what the currents add to h on
the bore is found by iteration with the nonlinear stator; the update takes the static answer of the
rotor for that of the machine, which is on the safe side, since the stator only adds to it.
Suspension field: the stator is linear, and its answer to the orders whose currents are followed is
a small matrix at every position (`solution/admittance.py`).

With separate magnets their static effect, which mixes orders position by position, comes on top.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.outcome.quantities import suspension_loads
from evaluators.finite_element.rotor.answer import RotorAnswer, rotor_answer
from evaluators.finite_element.rotor.eddy import EddyLoss, EddyRotor
from evaluators.finite_element.rotor.harmonics import Harmonics
from evaluators.finite_element.rotor.separate_magnets import SeparateMagnets
from evaluators.finite_element.solution.admittance import (
    Load,
    admittance,
    source_on_both_sides,
)
from evaluators.finite_element.solution.batch import BatchField, Equations, Induced, Solution
from evaluators.finite_element.solution.lanes import LANES

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]

ROUNDS = 5
"""Most rounds between stator and rotor; metal sleeves take three or four."""

SETTLED = 1e-3
"""Change of the induced part of h over h, both in the Euclidean norm, that ends the rounds."""

SEPARATE_ROUNDS = 2
"""Rounds of the suspension field with what separate magnets add, a hundredth of h, to its load."""


@dataclass(frozen=True)
class InducedTorque:
    """Torque field with induced currents, its rotor loss, and what is unsettled.

    `unsettled` (LANES,) is the last change of the induced part of h over h.
    """

    solution: Solution
    loss: EddyLoss
    unsettled: FloatArray


def torque_field(
    batch: BatchField,
    rotor: EddyRotor,
    solution: Solution,
    ampere_turns: FloatArray,
    separate: SeparateMagnets | None = None,
) -> InducedTorque:
    """Add induced currents to a torque field over 60 electrical degrees, orders up to 4 Q.

    With separate magnets `solution` has them already.
    """
    angles, orders = solution.waves.angles, solution.waves.orders
    orders = orders[orders <= 4 * batch.model.slots]
    harmonics = Harmonics.torque(batch.model, orders, angles)
    answer = rotor_answer(batch, rotor, harmonics, separate)
    currents = batch.torque_currents(angles, ampere_turns, batch.torque.topology.lattice.slots)

    def static(potential: ComplexArray) -> ComplexArray:
        if separate is None:
            return np.zeros_like(potential)
        return np.array(
            [
                separate.added(float(angle), orders, a, magnets=True)
                for angle, a in zip(angles, potential, strict=True)
            ]
        )

    potential = solution.waves.potential[:, : orders.size]
    added = static(potential)
    unsettled = np.full(LANES, np.inf)
    for _ in range(ROUNDS):
        still = static(potential)
        turning = harmonics.analyse(added - still)
        missing = answer.change(harmonics.analyse(potential)) - turning
        total = np.linalg.norm(solution.waves.tangential, axis=(0, 1)) / np.sqrt(angles.size)
        unsettled = np.linalg.norm(missing, axis=(0, 1)) / total
        if np.all(unsettled <= SETTLED):
            break
        added = still + harmonics.synthesise(turning + answer.relaxed(missing))
        induced = Induced(orders, added, solution.nodes)
        solution = batch.solve(batch.torque, angles, currents, induced=induced)
        potential = solution.waves.potential[:, : orders.size]
    return InducedTorque(solution, answer.loss(harmonics.analyse(potential)), unsettled)


@dataclass(frozen=True)
class InducedSuspension:
    """Suspension field of one ampere-turn with induced currents.

    Attributes
    ----------
    small : array (t, size, LANES), complex
    added : pair of arrays (t, m, LANES), complex
        What currents and separate magnets add to h of the lowest m orders of either sign.
    amplitudes : array (t, k, LANES), complex
        Of the harmonics on the bore whose currents are followed.
    answer : RotorAnswer
        To these.
    unsettled : array (LANES,)
        See `Admittance.settle`.
    """

    small: ComplexArray
    added: tuple[ComplexArray, ComplexArray]
    amplitudes: ComplexArray
    answer: RotorAnswer
    unsettled: FloatArray

    def loss(self, ampere_turns: FloatArray) -> EddyLoss:
        """Rotor loss (LANES,) at these ampere-turns, mean over directions of the force, W/m."""
        return self.answer.loss(0.5 * ampere_turns * self.amplitudes)


def suspension_field(
    batch: BatchField,
    equations: Equations,
    rotor: EddyRotor,
    solution: Solution,
    separate: SeparateMagnets | None = None,
    separate_added: tuple[ComplexArray, ComplexArray] | None = None,
) -> InducedSuspension:
    """Suspension field on top of a torque field, currents induced.

    `separate_added` is what separate magnets add to h in the static field.
    """
    angles = solution.waves.angles
    orders = reacting_orders(batch, equations)
    harmonics = Harmonics.suspension(batch.model, orders, angles)
    answer = rotor_answer(batch, rotor, harmonics, separate)
    static = batch.response[np.abs(harmonics.orders)]

    def change(potential: ComplexArray) -> ComplexArray:
        return harmonics.synthesise(answer.change(harmonics.analyse(potential)))

    def relaxed(missing: ComplexArray) -> ComplexArray:
        return harmonics.synthesise(answer.relaxed(harmonics.analyse(missing)))

    sector, bore = equations.topology.lattice.sector, equations.topology.lattice.bore
    every = batch.gap.class_orders(sector)
    every = every[every <= 4 * batch.model.slots]
    nothing = np.zeros((angles.size, every.size, LANES), dtype=np.complex128)
    plus, minus = separate_added or (nothing, nothing)
    stator_load = suspension_loads(batch)
    for _ in range(1 if separate is None else SEPARATE_ROUNDS):
        loads = _with_added(batch, equations, [stator_load] * angles.size, every, plus, minus)
        stator = admittance(batch, equations, solution.nodes, loads, orders)
        induced, unsettled = stator.settle(change, relaxed, static)
        ahead, behind = np.split(induced, 2, axis=1)
        loads = _with_added(batch, equations, loads, orders, ahead, behind)
        small = batch.perturb(equations, solution.nodes, loads)
        total = plus.copy(), minus.copy()
        total[0][:, : orders.size] += ahead
        total[1][:, : orders.size] += behind
        if separate is not None:
            potential = batch.coefficients_both_sides(small, sector, bore, every)
            plus, minus = (
                np.array(part)
                for part in zip(
                    *(
                        separate.added_on_both_sides(float(angle), every, ahead, behind)
                        for angle, ahead, behind in zip(angles, *potential, strict=True)
                    ),
                    strict=True,
                )
            )
    return InducedSuspension(
        small,
        total,
        harmonics.analyse(stator.potential(induced)),
        answer,
        unsettled,
    )


def reacting_orders(batch: BatchField, equations: Equations) -> IntArray:
    """Orders of a sector whose induced currents are followed: up to 3/2 Q + p.

    Those above would add at most 4 % to the loss of a metal sleeve by the suspension field, 0.3 %
    to that of the magnets and 0.1 % to the force (12 slots and 2 poles the worst of three machines,
    orders up to 4 Q).
    """
    orders = batch.gap.class_orders(equations.topology.lattice.sector)
    return orders[orders <= 3 * batch.model.slots // 2 + batch.model.pole_pairs]


def _with_added(
    batch: BatchField,
    equations: Equations,
    loads: list[Load],
    orders: IntArray,
    plus: ComplexArray,
    minus: ComplexArray,
) -> list[Load]:
    """Right-hand sides with added h (t, m, LANES) of positive and negative `orders`."""
    result = []
    for load, ahead, behind in zip(loads, plus, minus, strict=True):
        real, imag = source_on_both_sides(batch, equations, orders, ahead, behind)
        result.append((load[0] + real, load[1] + imag))
    return result
