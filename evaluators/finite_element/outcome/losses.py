"""Losses at the duty: iron by the local flux waveform, rotor by the field harmonics."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from evaluators.finite_element.rotor.answer import eddy_rotor, rotor_answer
from evaluators.finite_element.rotor.eddy import EddyLoss
from evaluators.finite_element.rotor.harmonics import Harmonics
from evaluators.finite_element.rotor.separate_magnets import SeparateMagnets
from evaluators.finite_element.solution.batch import BatchField, Solution
from evaluators.finite_element.solution.lanes import LANES
from evaluators.machine.losses.iron import excess_constant

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

LAYERS = 8
"""Layers of magnets and sleeve in the static analysis: against closed forms the loss is 4e-4
off at most, that of `eddy.LAYERS` 4e-5."""

SUSPENSION_ORDERS = 1
"""Highest order of the suspension field less p, over the number of slots, in the static analysis:
half as many again would add up to 4 % to the time and 0.3 % to the loss."""


class IronLoss(NamedTuple):
    """Loss of teeth and yoke, (LANES,) each, W/m, by hysteresis, classical and excess part."""

    teeth: tuple[FloatArray, FloatArray, FloatArray]
    yoke: tuple[FloatArray, FloatArray, FloatArray]


@njit(cache=True, error_model="numpy")
def _waveform_loss(  # type: ignore[no-untyped-def]
    nodes, cells, signs, polar, weight, source, turn_sign, hysteresis, result
):
    """Add weight times (hysteresis, sum of dB^2, sum of |dB|^1.5) of every point to `result`.

    dB is the derivative halfway between two positions, from four of them, times the step.

    nodes : (t, size + 1, LANES); cells, signs : (slots, k, 8)
    polar : (k, points, 8, 2, LANES) radial and tangential flux density per nodal potential, T
    source, turn_sign : (sixths,) slot whose field is taken for each sixth, and its sign
    hysteresis : (4,) k_h, exponent, its slope, unused
    """
    positions = nodes.shape[0]
    sixths = source.shape[0]
    k_h, exponent, slope = hysteresis
    radial = np.empty(positions * sixths)
    tangential = np.empty(positions * sixths)
    for k in range(cells.shape[1]):
        for q in range(polar.shape[1]):
            for lane in range(LANES):
                for m in range(sixths):
                    s = source[m]
                    for t in range(positions):
                        b0 = 0.0
                        b1 = 0.0
                        for a in range(8):
                            value = signs[s, k, a] * nodes[t, cells[s, k, a], lane]
                            b0 += polar[k, q, a, 0, lane] * value
                            b1 += polar[k, q, a, 1, lane] * value
                        radial[m * positions + t] = turn_sign[m] * b0
                        tangential[m * positions + t] = turn_sign[m] * b1
                low0 = high0 = radial[0]
                low1 = high1 = tangential[0]
                square = 0.0
                power = 0.0
                path0 = 0.0
                path1 = 0.0
                last = positions * sixths - 1
                before0 = radial[last] - radial[last - 1]
                before1 = tangential[last] - tangential[last - 1]
                change0 = radial[0] - radial[last]
                change1 = tangential[0] - tangential[last]
                for i in range(positions * sixths):
                    b0 = radial[i]
                    b1 = tangential[i]
                    low0, high0 = min(low0, b0), max(high0, b0)
                    low1, high1 = min(low1, b1), max(high1, b1)
                    path0 += abs(change0)
                    path1 += abs(change1)
                    n = i + 1 if i < last else 0
                    next0 = radial[n] - b0
                    next1 = tangential[n] - b1
                    slope0 = (26.0 * change0 - before0 - next0) / 24.0
                    slope1 = (26.0 * change1 - before1 - next1) / 24.0
                    d = slope0 * slope0 + slope1 * slope1
                    square += d
                    root = np.sqrt(d)
                    power += root * np.sqrt(root)
                    before0 = change0
                    before1 = change1
                    change0 = next0
                    change1 = next1
                peak0 = 0.5 * (high0 - low0)
                peak1 = 0.5 * (high1 - low1)
                energy = 0.0
                if peak0 > 0.0:
                    energy += 0.25 * path0 * peak0 ** (exponent - 1.0 + slope * peak0)
                if peak1 > 0.0:
                    energy += 0.25 * path1 * peak1 ** (exponent - 1.0 + slope * peak1)
                energy *= k_h
                w = weight[k, q, lane]
                result[0, lane] += w * energy
                result[1, lane] += w * square
                result[2, lane] += w * power


def iron_loss(batch: BatchField, solution: Solution) -> IronLoss:
    """Iron loss of the torque field over the whole period.

    The three parts of Bertotti, IEEE Trans. Magn. 24(1), 1988, from the waveform at every point of
    the mesh: radial and tangential component each with its own hysteresis, which covers rotation as
    for an elliptic locus (common practice), and raised by its minor loops; classical and excess
    loss from the length of dB/dt. The same law as
    `evaluators.machine.losses.iron.iron_loss_from_waveform`, smooth. The flux density of the sheet
    is that of the stack over the stacking factor.

    Twelve positions put the loss of the teeth 0.1 to 0.4 % too low (medians of five families of the
    shipped studies, eight random machines each, against 96 positions; at most 1.1 %), that of the
    yoke 0.1 %; with dB between two positions it was 0.2 to 0.9 % (2.2 %) and 0.2 to 0.4 %.
    """
    model = batch.model
    lattice = model.torque.lattice
    symmetry = model.symmetry
    steel = model.task.materials.stator_steel
    coefficients = steel.losses
    mesh = batch.mesh
    angle = mesh.angle[1::2, 1::2]  # of cell centres, (R, C, LANES)
    cosine, sine = np.cos(angle)[:, :, None, None], np.sin(angle)[:, :, None, None]
    # B = (dA/dy, -dA/dx), turned into radial and tangential components.
    bx, by = mesh.gradient[..., 1, :], -mesh.gradient[..., 0, :]
    polar = np.stack([cosine * bx + sine * by, cosine * by - sine * bx], axis=4) / model.stacking
    count = symmetry.torque.slots
    positions = solution.nodes.shape[0]
    padded = np.zeros((positions, lattice.size + 1, LANES))
    padded[:, :-1] = solution.nodes
    cells = np.where(lattice.cells >= 0, lattice.cells, lattice.size)
    density = float(steel.density.value) * model.stacking
    frequency = model.task.electrical_frequency
    samples = 6 * positions
    parts = []
    for mask in (lattice.iron & ~lattice.yoke, lattice.iron & lattice.yoke):
        total = np.zeros((3, LANES))
        for slot, times in symmetry.orbits():
            source = (slot - symmetry.torque_shift[:6]) % model.slots
            sector, inside = np.divmod(source, count)
            sign = symmetry.torque_sign[:6] * float(symmetry.torque.sign) ** sector
            result = np.zeros((3, LANES))
            _waveform_loss(
                padded,
                np.ascontiguousarray(cells[:, mask]),
                np.ascontiguousarray(lattice.cell_signs[:, mask]),
                np.ascontiguousarray(polar[mask]),
                np.ascontiguousarray(mesh.weight[mask]),
                inside,
                sign,
                (coefficients.hysteresis, coefficients.exponent, coefficients.exponent_slope),
                result,
            )
            total += times * symmetry.torque.count * result
        classical = total[1] * samples * frequency**2 / (2.0 * np.pi**2)
        excess = total[2] * np.sqrt(samples) * frequency**1.5 / excess_constant()
        parts.append(
            (
                density * frequency * total[0],
                density * coefficients.classical * classical,
                density * coefficients.excess * excess,
            )
        )
    return IronLoss(parts[0], parts[1])


def suspension_share(
    batch: BatchField, solution: Solution, small: ComplexArray, ampere_turns: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Mean square flux density of the suspension field over that of the torque field.

    In teeth and yoke, (LANES,) each, at the first rotor position. `small` is the field of one
    ampere-turn. Both fields have the same frequency in the stator and any phase to each other, so
    the squares add up.
    """
    model = batch.model
    shares = []
    large, torque = model.suspension.lattice, model.torque.lattice
    for mask in (torque.iron & ~torque.yoke, torque.iron & torque.yoke):
        weight = batch.mesh.weight[mask]
        gradient = batch.mesh.gradient[mask]

        def mean_square(
            lattice: object,
            nodes: ComplexArray | FloatArray,
            weight: FloatArray = weight,
            gradient: FloatArray = gradient,
            mask: NDArray[np.bool_] = mask,
        ) -> FloatArray:
            cells = lattice.cells[:, mask]  # type: ignore[attr-defined]
            signs = lattice.cell_signs[:, mask]  # type: ignore[attr-defined]
            padded = np.concatenate([nodes, np.zeros((1, LANES))])
            local = padded[cells] * signs[..., None]
            flux = np.einsum("cqadl,scal->scqdl", gradient, local)
            return np.asarray(
                np.einsum("cql,scqdl->l", weight, np.abs(flux) ** 2)
                / (weight.sum(axis=(0, 1)) * cells.shape[0])
            )

        # A complex amplitude's mean square over time is half the square of its modulus.
        suspension = 0.5 * ampere_turns**2 * mean_square(large, small[0])
        # The torque field's mean over time equals that over all slots to the accuracy wanted here.
        shares.append(suspension / mean_square(torque, solution.nodes[0]))
    return shares[0], shares[1]


def rotor_loss(
    batch: BatchField,
    torque: FloatArray,
    solution: Solution,
    small: ComplexArray,
    ampere_turns: FloatArray,
    separate: SeparateMagnets | None = None,
) -> EddyLoss:
    """Eddy-current loss (LANES,) of the rotor by static fields, W/m.

    The currents are those of the transient analysis (`rotor/answer.py`). They weaken the static
    harmonics on the bore as if the stator were a current sheet on smooth perfect iron. See
    `evaluators.finite_element.settings` for what that leaves.

    The stack is as long as `torque` (LANES,) per metre asks. `small` (t, size, LANES) is the
    suspension field of one ampere-turn at the positions of `solution`; the mean over the
    directions of its force is taken.
    """
    model = batch.model
    waves = solution.waves
    orders = waves.orders[waves.orders <= 4 * model.slots]
    turning = Harmonics.torque(model, orders, waves.angles)
    sector = model.symmetry.suspension
    reacting = batch.gap.class_orders(sector)
    reacting = reacting[reacting <= SUSPENSION_ORDERS * model.slots + model.pole_pairs]
    suspension = Harmonics.suspension(model, reacting, waves.angles)
    both = batch.coefficients_both_sides(small, sector, model.suspension.lattice.bore, reacting)
    rotor = eddy_rotor(batch, torque, LAYERS)

    def loss(harmonics: Harmonics, potential: ComplexArray) -> EddyLoss:
        answer = rotor_answer(batch, rotor, harmonics, separate)
        return answer.loss(answer.weakened(harmonics.analyse(potential)))

    main = loss(turning, waves.potential[:, : orders.size])
    amplitude = 0.5 * ampere_turns * np.concatenate(both, axis=1)
    control = loss(suspension, np.asarray(amplitude, np.complex128))
    return EddyLoss(
        main.shaft + control.shaft, main.magnet + control.magnet, main.sleeve + control.sleeve
    )
