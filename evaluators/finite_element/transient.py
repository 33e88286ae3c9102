"""Fields with currents induced in the rotor, in the periodic steady state.

The stator is solved position by position, the rotor answers frequency by frequency (`eddy.py`), and
both must agree on the bore. Frequencies follow from the symmetry of `symmetry.py`.

Torque field: what the currents add to h on the bore is found by iteration; the update takes the
static answer of the rotor for that of the machine, which is on the safe side, since the stator
only adds to it. Suspension field: to the factorised tangent the induced currents are a change of
rank 2 M, M being the number of orders that induce noticeable currents, so the field follows from
one dense system of that size at every position (Woodbury's identity; Hager, SIAM Review 31(2),
1989). Every order is given the frequency of its mean over the positions.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.outcome.quantities import suspension_loads
from evaluators.finite_element.rotor.eddy import Conductors, EddyLoss, EddyRotor
from evaluators.finite_element.solution.batch import BatchField, Equations, Induced, Solution
from evaluators.finite_element.solution.lanes import LANES

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]

ROUNDS = 5
"""Most rounds between stator and rotor; metal sleeves take three or four."""

SETTLED = 1e-3
"""Change of the induced part of h over h, both in the Euclidean norm, that ends the rounds."""


@dataclass(frozen=True)
class Harmonics:
    """Harmonics of the torque field on the bore as the rotor sees them.

    Attributes
    ----------
    orders : array (m,)
    first : array (m,)
        Each order's time dependence is exp(-j tau p angle) with tau = first - 6 i.
    speed : array (t, m)
        Angular speed n - tau p times that of the shaft against the rotor, rad/s; row i as in
        `numpy.fft.fftfreq`.
    """

    orders: IntArray
    first: IntArray
    speed: FloatArray
    angles: FloatArray
    pole_pairs: int

    @classmethod
    def of(cls, batch: BatchField, solution: Solution) -> Harmonics:
        """Harmonics of a torque field over 60 electrical degrees, up to order 4 Q."""
        model = batch.model
        waves = solution.waves
        orders = waves.orders[waves.orders <= 4 * model.slots]
        shift = int(model.symmetry.torque_shift[1])
        factor = int(model.symmetry.torque_sign[1]) * np.exp(-1j * orders * model.pitch * shift)
        first = np.rint(-np.angle(factor) / (np.pi / 3.0)).astype(np.int64)
        count = waves.angles.size
        step = np.fft.fftfreq(count, 1.0 / count).astype(np.int64)
        turns = orders - model.pole_pairs * (first - 6 * step[:, None])
        speed = turns * model.task.duty.speed
        return cls(orders, first, speed, waves.angles, model.pole_pairs)

    def analyse(self, values: ComplexArray) -> ComplexArray:
        """Amplitudes (t, m, LANES) of coefficients over the positions (t, m, LANES)."""
        return np.asarray(np.fft.fft(values * self._still, axis=0) / self.angles.size)

    def synthesise(self, amplitudes: ComplexArray) -> ComplexArray:
        """Inverse of `analyse`."""
        return np.asarray(np.fft.ifft(amplitudes * self.angles.size, axis=0) * np.conj(self._still))

    @property
    def _still(self) -> ComplexArray:
        turned = np.outer(self.angles, self.first * self.pole_pairs)
        return np.asarray(np.exp(1j * turned)[:, :, None])


@dataclass(frozen=True)
class InducedTorque:
    """Torque field with induced currents, its rotor loss (LANES,) in W/m, and what is unsettled.

    `unsettled` (LANES,) is the last change of the induced part of h over h.
    """

    solution: Solution
    shaft: FloatArray
    magnet: FloatArray
    sleeve: FloatArray
    unsettled: FloatArray


def eddy_rotor(batch: BatchField, torque: FloatArray) -> EddyRotor:
    """Conducting rotor of a batch whose stack is as long as `torque` (LANES,) per metre asks."""
    model = batch.model
    length = model.task.duty.shaft_torque / np.abs(torque)
    conductors = Conductors.of(model.task, batch.sections.magnet_arc_ratio, length)
    return EddyRotor(batch.rotor, batch.reluctivity, model.discretisation.iron_rings, conductors)


def torque_field(
    batch: BatchField, rotor: EddyRotor, solution: Solution, ampere_turns: FloatArray
) -> InducedTorque:
    """Add induced currents to a torque field over 60 electrical degrees."""
    harmonics = Harmonics.of(batch, solution)
    orders = harmonics.orders
    count = harmonics.speed.shape[0]
    static = batch.response[orders]
    change = np.array([rotor.response(orders, speed) for speed in harmonics.speed]) - static
    change[harmonics.speed == 0.0] = 0.0
    place = slice(0, orders.size)
    slots = batch.torque.topology.lattice.slots
    currents = batch.torque_currents(solution.waves.angles, ampere_turns, slots)
    induced = np.zeros((count, orders.size, LANES), dtype=np.complex128)
    unsettled = np.full(LANES, np.inf)
    for _ in range(ROUNDS):
        amplitude = harmonics.analyse(solution.waves.potential[:, place])
        missing = change * amplitude - induced
        total = np.linalg.norm(solution.waves.tangential, axis=(0, 1)) / np.sqrt(count)
        unsettled = np.linalg.norm(missing, axis=(0, 1)) / total
        if np.all(unsettled <= SETTLED):
            break
        induced = induced + missing / (1.0 + change / static)
        added = Induced(orders, harmonics.synthesise(induced), solution.nodes)
        solution = batch.solve(batch.torque, solution.waves.angles, currents, induced=added)
    amplitude = harmonics.analyse(solution.waves.potential[:, place])
    parts = [
        rotor.loss(orders, speed, row)
        for speed, row in zip(harmonics.speed, amplitude, strict=True)
    ]
    return InducedTorque(
        solution,
        np.sum([part.shaft.sum(axis=0) for part in parts], axis=0),
        np.sum([part.magnet.sum(axis=0) for part in parts], axis=0),
        np.sum([part.sleeve.sum(axis=0) for part in parts], axis=0),
        unsettled,
    )


@dataclass(frozen=True)
class InducedSuspension:
    """Suspension field of one ampere-turn with induced currents.

    Attributes
    ----------
    small : array (t, size, LANES), complex
    response : pair of arrays (orders + 1, LANES), complex
        h/a of the rotor for positive and negative orders.
    """

    small: ComplexArray
    response: tuple[ComplexArray, ComplexArray]


def suspension_field(
    batch: BatchField, equations: Equations, rotor: EddyRotor, nodes: FloatArray
) -> InducedSuspension:
    """Suspension field on top of the torque field `nodes` (t, ...), currents induced.

    A complex field varies as exp(j p angle) besides its coefficients, so that order n of either
    sign turns against the rotor with n + p times the shaft's speed.
    """
    model = batch.model
    orders = reacting_orders(batch, equations)
    pairs, speed = model.pole_pairs, model.task.duty.speed
    ahead = batch.response.astype(np.complex128)
    behind = ahead.copy()
    forwards = np.asarray((orders + pairs) * speed, dtype=np.float64)
    ahead[orders] = rotor.response(orders, forwards)
    moving = orders != pairs
    backwards = np.asarray((pairs - orders[moving]) * speed, dtype=np.float64)
    behind[orders[moving]] = rotor.response(orders[moving], backwards)
    small = with_response(
        batch,
        equations,
        nodes,
        suspension_loads(batch),
        orders,
        (ahead[orders] - batch.response[orders], behind[orders] - batch.response[orders]),
    )
    return InducedSuspension(small, (ahead, behind))


def reacting_orders(batch: BatchField, equations: Equations) -> IntArray:
    """Orders of a sector whose induced currents are followed: up to Q + p."""
    orders = batch.gap.class_orders(equations.topology.lattice.sector)
    return orders[orders <= batch.model.slots + batch.model.pole_pairs]


def with_response(
    batch: BatchField,
    equations: Equations,
    nodes: FloatArray,
    load: tuple[FloatArray, FloatArray],
    orders: IntArray,
    change: tuple[ComplexArray, ComplexArray],
) -> ComplexArray:
    """Small complex fields on a rotor whose response differs from the static one by `change`.

    `change` holds arrays (m, LANES) for positive and negative `orders`; `load` is real and
    imaginary part of the right-hand side, the same at all positions.
    """
    lattice = equations.topology.lattice
    sector = lattice.sector
    slot_angles = -batch.model.pitch * np.arange(lattice.slots, dtype=np.float64)
    # The right-hand side of a source s_n is -2 pi (conj(w) s_n + conj of it), hence s = -1/(4 pi)
    # and s = -j/(4 pi) make real and minus the imaginary part of conj(w).
    loads = []
    for k in range(orders.size):
        for unit in (1.0, 1j):
            source = np.zeros((1, LANES), dtype=np.complex128)
            source[:] = -unit / (4.0 * np.pi)
            column = np.zeros((equations.topology.size, LANES))
            column[lattice.bore] = batch.gap.source_load(source, orders[k : k + 1], slot_angles)
            loads.append(column)
    solved = np.empty((len(nodes), equations.topology.size, LANES), dtype=np.complex128)
    solve = equations.solver.solve
    strength = np.concatenate(change)  # positive orders, then negative ones
    identity = np.eye(2 * orders.size)
    for t in range(len(nodes)):
        batch.factorise_at(equations, nodes[t])
        small = solve(load[0]) + 1j * solve(load[1])
        columns = np.array([solve(column) for column in loads])
        real, imag = columns[0::2], columns[1::2]  # (m, size, LANES)
        # K^-1 conj(w) and K^-1 w.
        answers = np.concatenate([real - 1j * imag, real + 1j * imag])
        before = np.concatenate(
            batch.coefficients_both_sides(small[None], sector, lattice.bore, orders), axis=1
        )[0]
        matrix = np.concatenate(
            batch.coefficients_both_sides(answers, sector, lattice.bore, orders), axis=1
        )  # (2 m causes, 2 m orders, LANES)
        matrix = 2.0 * np.pi * matrix.transpose(2, 1, 0) * strength.T[:, None, :]
        after = np.linalg.solve(identity + matrix, before.T[:, :, None])[:, :, 0]
        solved[t] = small - 2.0 * np.pi * np.einsum("mnl,ml->nl", answers, strength * after.T)
    return solved


def suspension_loss(
    batch: BatchField,
    equations: Equations,
    rotor: EddyRotor,
    small: ComplexArray,
    ampere_turns: FloatArray,
) -> EddyLoss:
    """Rotor loss of the mean suspension field over the positions, (m, LANES), W/m."""
    model = batch.model
    lattice = equations.topology.lattice
    orders = reacting_orders(batch, equations)
    plus, minus = batch.coefficients_both_sides(
        small.mean(axis=0, keepdims=True), lattice.sector, lattice.bore, orders
    )
    signed = np.concatenate([orders, orders])
    speed = np.concatenate([orders + model.pole_pairs, orders - model.pole_pairs])
    moving = speed != 0
    amplitude = 0.5 * ampere_turns * np.concatenate([plus[0], minus[0]])
    return rotor.loss(signed[moving], speed[moving] * model.task.duty.speed, amplitude[moving])
