"""Magnetic pull of a displaced rotor, to first order in the displacement.

With A = 2 Re W, W = sum over n > 0 of alpha_n z^n + conj(beta_n) z^-n in the gap, a rotor displaced
by d sees W(z + d): the orders n + 1 and n - 1 mix into n. Its law h_n = y_n a_n + s_n in its own
frame then becomes, in the frame of the stator, h_n = y_n a_n + s_n + c_n with

    c_n = -(1/R) [ (nu0 n - y_n) (n + 1) d alpha_(n+1) R^(n+1)
                 + (nu0 n + y_n) (n - 1) conj(d) beta_(n-1) R^(1-n) ]

(own derivation). The stator answers by a small field; both together give the change of force.
A plane field has no homopolar part.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.outcome import stress
from evaluators.finite_element.solution.batch import BatchField, Equations, Solution
from evaluators.finite_element.solution.lanes import LANES

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]

NU_0 = 1.0 / (4e-7 * np.pi)


def stiffness(
    batch: BatchField,
    solution: Solution,
    positions: list[int],
    equations: Equations,
) -> FloatArray:
    """Pull per displacement at some of the positions of a torque field, (t, LANES), N/m per m.

    Mean of displacements along x and y.
    """
    radius = batch.sections.bore_radius
    sector = batch.model.symmetry.suspension
    highest = batch.highest_wave
    waves = solution.waves
    field = stress.rotating(
        stress.spread(waves.orders, waves.potential[positions], highest),
        stress.spread(waves.orders, waves.tangential[positions], highest),
        radius,
    )
    orders, shifts = shifted_sources(batch, solution, positions)
    y = batch.response[orders]
    small = displaced(batch, solution, positions, equations)
    bore = small[:, equations.topology.lattice.bore]
    result = np.zeros((len(positions), LANES))
    for shift, part, axis in ((shifts[0], bore.real, 1.0), (shifts[1], bore.imag, 1j)):
        answer = batch.gap.coefficients(part, sector, orders)
        change = stress.rotating(
            stress.spread(orders, answer, highest),
            stress.spread(orders, y * answer + shift, highest),
            radius,
        )
        pull = 2.0 * stress.pair(field, change, radius)
        result += 0.5 * np.real(pull * np.conj(axis))
    return result


def displaced(
    batch: BatchField, solution: Solution, positions: list[int], equations: Equations
) -> ComplexArray:
    """Change of the stator's potential per displacement, (t, size, LANES), Wb/m per m.

    The real part belongs to a displacement along x, the imaginary part to one along y.
    """
    orders, shifts = shifted_sources(batch, solution, positions)
    topology = equations.topology
    slots = topology.lattice.slots
    slot_angles = np.asarray(-batch.model.pitch * np.arange(slots), dtype=np.float64)
    loads = []
    for t in range(len(positions)):
        pair = []
        for shift in shifts:
            load = np.zeros((topology.size, LANES))
            load[topology.lattice.bore] = batch.gap.source_load(shift[t], orders, slot_angles)
            pair.append(load)
        loads.append((pair[0], pair[1]))
    return batch.perturb(equations, solution.nodes[positions], loads)


def shifted_sources(
    batch: BatchField, solution: Solution, positions: list[int]
) -> tuple[IntArray, tuple[ComplexArray, ComplexArray]]:
    """Orders (m,) of the suspension field and c_n (t, m, LANES) per metre along x and along y."""
    radius = batch.sections.bore_radius
    highest = batch.highest_wave
    waves = solution.waves
    potential = stress.spread(waves.orders, waves.potential[positions], highest + 1)
    tangential = stress.spread(waves.orders, waves.tangential[positions], highest + 1)
    orders = batch.gap.class_orders(batch.model.symmetry.suspension)
    orders = orders[orders <= highest]
    middle = highest + 1
    n = orders[:, None]
    y = batch.response[orders]
    above_a, above_h = potential[:, middle + orders + 1], tangential[:, middle + orders + 1]
    below_a, below_h = potential[:, middle + orders - 1], tangential[:, middle + orders - 1]
    rising = 0.5 * (above_a * (n + 1) + above_h / NU_0)
    falling = 0.5 * (below_a * (n - 1) - below_h / NU_0)
    along_x, along_y = (
        -((NU_0 * n - y) * d * rising + (NU_0 * n + y) * np.conj(d) * falling) / radius
        for d in (1.0, 1j)
    )
    return orders, (along_x, along_y)
