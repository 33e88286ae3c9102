"""Field harmonics of balanced currents in given slots: rotating waves, spectrum, leakage.

Everything here follows from the (Q,) complex slot currents of a winding per turn and unit current
phasor (`Winding.torque_slot_mmf`, `Winding.suspension_slot_mmf`), whatever the winding is.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from evaluators.machine.winding.star import ComplexArray, IntArray, unit_phasors

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class MmfSpectrum:
    """Air-gap magnetomotive force of balanced currents, per turn of a coil and ampere peak.

    f(theta, t) = Re(sum over n of forward[n] exp(j (omega t - orders[n] theta))
    + backward[n] exp(j (omega t + orders[n] theta))), positive where it drives flux outwards;
    forward waves turn counter-clockwise. Arrays have shape (n_orders,), orders 1 to n_orders.
    """

    orders: IntArray
    forward: ComplexArray
    backward: ComplexArray


def slot_sums(slot_mmf: ComplexArray, orders: ArrayLike) -> ComplexArray:
    """Sum over slots of slot_mmf exp(+j order theta_slot), (n_orders,).

    A positive order is the wave exp(j (omega t - order theta)), which turns counter-clockwise, a
    negative one turns clockwise.
    """
    order = np.atleast_1d(np.asarray(orders, dtype=np.int64))
    slots = slot_mmf.size
    half_slots = 2 * np.arange(slots, dtype=np.int64) + 1  # slot angles in units of pi / Q
    return np.asarray(unit_phasors(order[:, None] * half_slots, 2 * slots) @ slot_mmf)


def rotating_factors(slot_mmf: ComplexArray, orders: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Winding factors of the rotating waves of all phases together, (n_orders,) each.

    Counter-clockwise and clockwise wave of each order. At an order a winding makes as a balanced
    set, one of them equals the winding factor of a phase and the other is zero.
    """
    order = np.atleast_1d(np.asarray(orders, dtype=np.int64))
    scale = 2.0 * slot_mmf.size  # two sides for each of the Q coils
    forward = np.abs(slot_sums(slot_mmf, order)) / scale
    backward = np.abs(slot_sums(slot_mmf, -order)) / scale
    return forward, backward


def mmf_spectrum(slot_mmf: ComplexArray, max_order: int) -> MmfSpectrum:
    """Spectrum of the magnetomotive force up to `max_order`, slot currents taken as points.

    Current along +z at theta lowers f there: df/dtheta = -K, hence
    f_n = sum(slot_mmf exp(j n theta)) / (2 pi j n).

    Raises
    ------
    ValueError
        If `max_order` is below 1.
    """
    if max_order < 1:
        msg = f"max_order = {max_order} must be at least 1"
        raise ValueError(msg)
    orders = np.arange(1, max_order + 1, dtype=np.int64)
    scale = 2j * np.pi * orders
    return MmfSpectrum(
        orders=orders,
        forward=slot_sums(slot_mmf, orders) / scale,
        backward=slot_sums(slot_mmf, -orders) / -scale,
    )


def differential_leakage(slot_mmf: ComplexArray, order: int) -> float:
    """Harmonic leakage factor sigma_d: gap energy of all other waves over that of `order`.

    sigma_d = sum over n != order of (order k_w(n) / (n k_w(order)))^2, both directions, thin gap
    (Richter, *Elektrische Maschinen I*, 1924; from memory). The series is summed exactly: k_w
    repeats with period Q and the sum of 1/n^2 over n = r mod Q is (pi/Q)^2 / sin^2(pi r/Q).

    Raises
    ------
    ValueError
        If the currents make no wave of `order`, counter-clockwise.
    """
    slots = slot_mmf.size
    residues = np.arange(1, slots, dtype=np.int64)
    power = np.abs(slot_sums(slot_mmf, residues)) ** 2
    main = float(np.abs(slot_sums(slot_mmf, order)[0])) ** 2
    if main < 1e-18 * slots**2:  # rounding of Q unit phasors that cancel
        msg = f"order = {order} is not among the counter-clockwise waves of these slot currents"
        raise ValueError(msg)
    weight = (np.pi / slots / np.sin(np.pi * residues / slots)) ** 2
    return float(order**2 * np.sum(power * weight) / main - 1.0)
