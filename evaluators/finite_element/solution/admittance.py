"""The stator's answer to what the rotor adds to h on the bore, for small fields on top of others.

To the factorised tangent an addition to h is a right-hand side: a few solutions at every position
give the matrix that connects the added h of some orders with their potential (Woodbury's identity;
Hager, SIAM Review 31(2), 1989). Whatever the rotor does, including mixing orders and positions, is
then settled in these coefficients alone.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.solution.batch import BatchField, Equations
from evaluators.finite_element.solution.lanes import LANES

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]

Load = tuple[FloatArray, FloatArray]
"""Real and imaginary part of a right-hand side, (size, LANES)."""

ROUNDS = 40
"""Most rounds between the coefficients of stator and rotor; they cost next to nothing."""

SETTLED = 1e-5
"""Change of the added h over h, both in the Euclidean norm, that ends the rounds."""


@dataclass(frozen=True)
class Admittance:
    """Potential on the bore, a = before - matrix h, of positive orders and then their negatives.

    Attributes
    ----------
    orders : array (m,), positive
    before : array (t, 2 m, LANES)
        Potential without added h.
    matrix : array (t, LANES, 2 m, 2 m)
    """

    orders: IntArray
    before: ComplexArray
    matrix: ComplexArray

    def potential(self, added: ComplexArray) -> ComplexArray:
        """Potential with the `added` h, both (t, 2 m, LANES)."""
        fall = self.matrix @ added.transpose(0, 2, 1)[..., None]
        return np.asarray(self.before - fall[..., 0].transpose(0, 2, 1))

    def settle(
        self,
        change: Callable[[ComplexArray], ComplexArray],
        relaxed: Callable[[ComplexArray], ComplexArray],
        static: FloatArray,
    ) -> tuple[ComplexArray, FloatArray]:
        """Find the added h that is the rotor's `change` of the potential it leads to.

        Parameters
        ----------
        change
            Added h (t, 2 m, LANES) for a potential.
        relaxed
            Step that makes up for missing h if stator and rotor answer alike.
        static : array (2 m, LANES)
            h over a without added h.

        Returns
        -------
        added : array (t, 2 m, LANES)
        unsettled : array (LANES,)
            Last change over h.
        """
        added = np.zeros_like(self.before)
        unsettled = np.zeros(LANES)
        for _ in range(ROUNDS):
            potential = self.potential(added)
            missing = change(potential) - added
            total = np.linalg.norm(static * potential + added, axis=(0, 1))
            unsettled = np.asarray(np.linalg.norm(missing, axis=(0, 1)) / total)
            if np.all(unsettled <= SETTLED):
                break
            added = added + relaxed(missing)
        return added, unsettled


def source(
    batch: BatchField, equations: Equations, orders: IntArray, plus: ComplexArray
) -> FloatArray:
    """Right-hand side (size, LANES) of a real field's added h, `plus` (m, LANES)."""
    lattice = equations.topology.lattice
    slot_angles = -batch.model.pitch * np.arange(lattice.slots, dtype=np.float64)
    result = np.zeros((equations.topology.size, LANES))
    result[lattice.bore] = batch.gap.source_load(plus, orders, slot_angles)
    return result


def source_on_both_sides(
    batch: BatchField,
    equations: Equations,
    orders: IntArray,
    plus: ComplexArray,
    minus: ComplexArray,
) -> Load:
    """Right-hand side of a complex field's added h of positive and negative `orders`."""
    return (
        source(batch, equations, orders, 0.5 * (plus + np.conj(minus))),
        source(batch, equations, orders, -0.5j * (plus - np.conj(minus))),
    )


def admittance(
    batch: BatchField,
    equations: Equations,
    nodes: FloatArray,
    loads: list[Load],
    orders: IntArray,
) -> Admittance:
    """Admittance on top of the torque fields `nodes` (t, ...) with right-hand sides `loads`."""
    sector, bore = equations.topology.lattice.sector, equations.topology.lattice.bore
    # The right-hand side of a source s_n is -2 pi (conj(w) s_n + conj of it), hence s = -1/(4 pi)
    # and s = -j/(4 pi) make real and minus the imaginary part of conj(w).
    columns = [
        source(batch, equations, orders[k : k + 1], np.full((1, LANES), -unit / (4.0 * np.pi)))
        for k in range(orders.size)
        for unit in (1.0 + 0.0j, 1.0j)
    ]
    before = np.empty((len(nodes), 2 * orders.size, LANES), dtype=np.complex128)
    matrix = np.empty((len(nodes), LANES, 2 * orders.size, 2 * orders.size), dtype=np.complex128)
    solve = equations.solver.solve
    for t, load in enumerate(loads):
        batch.factorise_at(equations, nodes[t])
        small = solve(load[0]) + 1j * solve(load[1])
        parts = batch.coefficients_both_sides(small[None], sector, bore, orders)
        before[t] = np.concatenate(parts, axis=1)[0]
        solved = np.array([solve(column)[bore] for column in columns])
        weights = batch.gap.coefficients(solved, sector, orders)  # (2 m, m, LANES)
        real, imag = weights[0::2], weights[1::2]
        # K^-1 conj(w) and K^-1 w: causes of positive and of negative order.
        ahead = np.concatenate([real - 1j * imag, np.conj(real) - 1j * np.conj(imag)], axis=1)
        behind = np.concatenate([real + 1j * imag, np.conj(real) + 1j * np.conj(imag)], axis=1)
        matrix[t] = 2.0 * np.pi * np.concatenate([ahead, behind]).transpose(2, 1, 0)
    return Admittance(orders, before, matrix)
