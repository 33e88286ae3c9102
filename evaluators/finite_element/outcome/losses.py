"""Losses at the duty: iron by the local flux waveform, rotor by the field harmonics."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from evaluators.finite_element.rotor.uniform import NU_0, across_ring
from evaluators.finite_element.solution.batch import BatchField, Solution
from evaluators.finite_element.solution.lanes import LANES
from evaluators.machine.losses.eddy import RotorEddyLoss, rotor_eddy_loss
from evaluators.machine.losses.iron import excess_constant

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]


class IronLoss(NamedTuple):
    """Loss of teeth and yoke, (LANES,) each, W/m, by hysteresis, classical and excess part."""

    teeth: tuple[FloatArray, FloatArray, FloatArray]
    yoke: tuple[FloatArray, FloatArray, FloatArray]


@njit(cache=True, error_model="numpy")
def _waveform_loss(  # type: ignore[no-untyped-def]
    nodes, cells, signs, polar, weight, source, turn_sign, hysteresis, result
):
    """Add weight times (hysteresis, sum of dB^2, sum of |dB|^1.5) of every point to `result`.

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
                p0 = radial[last]
                p1 = tangential[last]
                for i in range(positions * sixths):
                    b0 = radial[i]
                    b1 = tangential[i]
                    low0, high0 = min(low0, b0), max(high0, b0)
                    low1, high1 = min(low1, b1), max(high1, b1)
                    path0 += abs(b0 - p0)
                    path1 += abs(b1 - p1)
                    d = (b0 - p0) ** 2 + (b1 - p1) ** 2
                    square += d
                    root = np.sqrt(d)
                    power += root * np.sqrt(root)
                    p0 = b0
                    p1 = b1
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
    `evaluators.machine.losses.iron.iron_loss_from_waveform`. The flux density of the sheet is that
    of the stack over the stacking factor.
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
    solution: Solution,
    suspension: tuple[NDArray[np.int64], ComplexArray, ComplexArray],
    ampere_turns: FloatArray,
    length: FloatArray,
) -> RotorEddyLoss:
    """Eddy-current loss of magnets and sleeve per field harmonic, (LANES, h), W/m.

    Order n of the field on the bore, a_n = sum over tau of c exp(-j tau p theta), turns against the
    rotor with (n - tau p) times the shaft's frequency. The loss of each harmonic is that of
    `evaluators.machine.losses.eddy.rotor_eddy_loss`.

    `suspension` holds orders and mean coefficients of positive and negative orders (m, LANES) per
    ampere-turn.
    """
    model = batch.model
    waves = solution.waves
    kept = waves.orders <= 4 * model.slots
    orders = waves.orders[kept]
    positions = waves.angles.size
    # One sixth later the coefficient is g = exp(-j tau pi/3) times the old one.
    shift, sign = int(model.symmetry.torque_shift[1]), int(model.symmetry.torque_sign[1])
    factor = sign * np.exp(-1j * orders * model.pitch * shift)
    first = np.rint(-np.angle(factor) / (np.pi / 3.0)).astype(np.int64)
    still = (
        waves.potential[:, kept]
        * np.exp(1j * np.outer(waves.angles, first * model.pole_pairs))[:, :, None]
    )
    harmonic = np.fft.fftfreq(positions, 1.0 / positions).astype(np.int64)
    amplitude = np.abs(np.fft.fft(still, axis=0)) / positions
    # exp(+j i 6 p theta) in `still` is tau = first - 6 i.
    turns = orders - model.pole_pairs * (first - 6 * harmonic[:, None])
    square = amplitude.reshape(-1, LANES) ** 2
    order = np.broadcast_to(orders, turns.shape).ravel()
    turns = turns.ravel()
    moving = turns != 0
    columns_order = [order[moving]]
    columns_turns = [np.abs(turns[moving])]
    columns_square = [square[moving]]
    s_orders, plus, minus = suspension
    near = s_orders <= 4 * model.slots
    for part, speed in ((plus, s_orders + model.pole_pairs), (minus, s_orders - model.pole_pairs)):
        active = near & (speed != 0)
        columns_order.append(s_orders[active])
        columns_turns.append(np.abs(speed[active]))
        columns_square.append((0.5 * np.abs(part[active]) * ampere_turns) ** 2)
    order = np.concatenate(columns_order)
    turns = np.concatenate(columns_turns)
    amplitude = np.sqrt(np.concatenate(columns_square))
    density = 2.0 * order[:, None] * amplitude * _to_surface(batch, order)
    density = density / batch.sections.rotor_radius
    task = model.task
    magnet, sleeve = task.materials.magnet, task.materials.sleeve
    pitch = np.pi / model.pole_pairs
    sections = batch.sections
    full = np.ones(LANES)
    return rotor_eddy_loss(
        order.astype(np.float64),
        turns * task.duty.speed / (2.0 * np.pi),
        density.T,
        iron_radius=sections.core_radius,
        magnet_radius=sections.magnet_radius,
        rotor_radius=sections.rotor_radius,
        bore_radius=sections.bore_radius,
        length=length,
        magnet_resistivity=full * float(magnet.resistivity.at(task.conditions.magnet_temperature)),
        magnet_segment_angle=sections.magnet_arc_ratio * pitch / task.construction.magnet_segments,
        magnet_segment_length=full * task.construction.magnet_axial_segment,
        magnet_coverage=sections.magnet_arc_ratio,
        recoil_permeability=full * model.recoil,
        sleeve_resistivity=full * float(sleeve.resistivity.at(task.conditions.sleeve_temperature)),
    )


def _to_surface(batch: BatchField, order: NDArray[np.int64]) -> FloatArray:
    """Potential on the rotor's surface over that on the bore, (m, LANES), without sources."""
    n = order[:, None].astype(np.float64)
    width = np.log(batch.sections.bore_radius / batch.sections.rotor_radius)
    # Inwards the response turns round: y at the surface from y at the bore.
    y = batch.response[order]
    surface = across_ring(-y, n, NU_0, width)
    x = np.exp(-n * width)
    ratio = 2.0 * x / ((1.0 + x * x) - surface / (NU_0 * n) * (1.0 - x * x))
    return np.asarray(ratio)
