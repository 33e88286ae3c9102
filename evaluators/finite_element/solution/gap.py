"""Coupling of the stator mesh with gap and rotor on the bore circle.

The gap is not meshed. The vector potential on the bore, piecewise quadratic in the angle, is
projected on Fourier orders by exact integration,

    a_n = S * sum over slots s and nodes k of w_n[k] exp(-j n s tau) A[s, k],

and each order sees the rotor through h_n = y_n a_n + s_n (`rotor.py`). The weak form then gains the
stiffness 2 pi y_n conj(w_n) w_n, which couples all bore nodes. This is the air-gap element of
Abdel-Razek, Coulomb, Feliachi, Sabonnadiere, IEEE Trans. Magn. 18(2), 1982 (from memory), with the
circle laid on the bore itself and non-uniform nodes. Because the rotor angle enters in exp(-j n
theta) alone, torque and force from the same coefficients are exact derivatives of the discrete
energy.
"""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

from evaluators.finite_element.mesh.lattice import Lattice
from evaluators.finite_element.mesh.symmetry import Sector

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]


@njit(cache=True, error_model="numpy")
def project(angle, pitch, orders):  # type: ignore[no-untyped-def]
    """Projection of the bore nodes of slot 0 on the orders 1..orders.

    Parameters
    ----------
    angle : array (2 C + 1, LANES)
        Of the bore nodes of slot 0 from tooth axis to tooth axis, mid-side nodes half-way.
    pitch : float
        Slot pitch, rad.
    orders : int

    Returns
    -------
    real, imag : arrays (orders + 1, 2 C, LANES)
        w_n[k]: integral of the shape function of node k times exp(-j n phi), over 2 pi. Node 0
        includes its half in the slot before.
    """
    nodes = angle.shape[0] - 1
    lanes = angle.shape[1]
    real = np.zeros((orders + 1, nodes, lanes))
    imag = np.zeros((orders + 1, nodes, lanes))
    for n in range(1, orders + 1):
        turn = complex(np.cos(n * pitch), np.sin(n * pitch))
        for c in range(nodes // 2):
            for lane in range(lanes):
                half = 0.5 * (angle[2 * c + 2, lane] - angle[2 * c, lane])
                middle = 0.5 * (angle[2 * c + 2, lane] + angle[2 * c, lane])
                k = n * half
                # Moments of 1, x and x^2 with exp(-j k x) over -1..1 (that of x is -j times m1).
                if k < 0.3:
                    q = k * k
                    m0 = 2.0 * (1.0 - q / 6.0 * (1.0 - q / 20.0 * (1.0 - q / 42.0)))
                    m1 = k * (2.0 / 3.0 - q / 15.0 * (1.0 - q / 28.0 * (1.0 - q / 54.0)))
                    m2 = 2.0 / 3.0 - q / 5.0 + q * q / 84.0 - q * q * q / 3240.0
                else:
                    s, t = np.sin(k), np.cos(k)
                    m0 = 2.0 * s / k
                    m1 = 2.0 * (s - k * t) / (k * k)
                    m2 = 2.0 * ((k * k - 2.0) * s + 2.0 * k * t) / (k * k * k)
                scale = half / (2.0 * np.pi)
                phase = complex(np.cos(n * middle), -np.sin(n * middle)) * scale
                left = phase * complex(0.5 * m2, 0.5 * m1)
                right = phase * complex(0.5 * m2, -0.5 * m1)
                centre = phase * (m0 - m2)
                real[n, 2 * c, lane] += left.real
                imag[n, 2 * c, lane] += left.imag
                real[n, 2 * c + 1, lane] += centre.real
                imag[n, 2 * c + 1, lane] += centre.imag
                if 2 * c + 2 == nodes:
                    right = right * turn
                    real[n, 0, lane] += right.real
                    imag[n, 0, lane] += right.imag
                else:
                    real[n, 2 * c + 2, lane] += right.real
                    imag[n, 2 * c + 2, lane] += right.imag
    return real, imag


@njit(cache=True, fastmath={"contract"}, error_model="numpy")
def _residues(real, imag, y, slots):  # type: ignore[no-untyped-def]
    """Sums of y_n conj(w_n[a]) w_n[b] over the orders of each residue n mod slots, a >= b."""
    orders, nodes, lanes = real.shape
    even = np.zeros((slots, nodes, nodes, lanes))
    odd = np.zeros((slots, nodes, nodes, lanes))
    scaled_real = np.empty((nodes, lanes))
    scaled_imag = np.empty((nodes, lanes))
    for n in range(1, orders):
        m = n % slots
        for a in range(nodes):
            for lane in range(lanes):
                scaled_real[a, lane] = y[n, lane] * real[n, a, lane]
                scaled_imag[a, lane] = y[n, lane] * imag[n, a, lane]
        for a in range(nodes):
            for b in range(nodes):
                for lane in range(lanes):
                    even[m, a, b, lane] += (
                        scaled_real[a, lane] * real[n, b, lane]
                        + scaled_imag[a, lane] * imag[n, b, lane]
                    )
                    odd[m, a, b, lane] += (
                        scaled_real[a, lane] * imag[n, b, lane]
                        - scaled_imag[a, lane] * real[n, b, lane]
                    )
    return even, odd


class GapCoupling:
    """Projection of a batch of LANES designs and the stiffness it makes.

    Parameters
    ----------
    angle : array (2 C + 1, LANES)
        Of the bore nodes of slot 0, rad.
    slots : int
        Slots of the whole machine.
    orders : int
        Highest Fourier order.
    """

    def __init__(self, angle: FloatArray, slots: int, orders: int) -> None:
        self.slots = slots
        self.orders = orders
        self.real, self.imag = project(angle, 2.0 * np.pi / slots, orders)
        self._sums: tuple[FloatArray, FloatArray] | None = None

    def set_response(self, y: FloatArray) -> None:
        """Take over the response y (orders + 1, LANES) of the rotor, entry 0 unused."""
        self._sums = _residues(self.real, self.imag, y, self.slots)

    def stiffness(self, sector: Sector) -> FloatArray:
        """Stiffness between slot 0 and slot d of a sector, (slots, 2 C, 2 C, LANES).

        Entry [d, a, b] couples node a of slot s with node b of slot s + d.
        """
        if self._sums is None:
            msg = "set_response must be called first"
            raise RuntimeError(msg)
        residue = np.arange(sector.lowest_order, self.slots, sector.count)
        even, odd = (np.ascontiguousarray(item[residue]) for item in self._sums)
        angle = 2.0 * np.pi / self.slots * np.outer(np.arange(sector.slots), residue)
        shape = (sector.slots, *even.shape[1:])
        flat_even = even.reshape(residue.size, -1)
        flat_odd = odd.reshape(residue.size, -1)
        block = np.cos(angle) @ flat_even + np.sin(angle) @ flat_odd
        return np.asarray((4.0 * np.pi * sector.count * block).reshape(shape))

    def class_orders(self, sector: Sector) -> IntArray:
        """Positive orders of the fields of a sector."""
        first = sector.lowest_order if sector.lowest_order else sector.count
        return np.arange(first, self.orders + 1, sector.count)

    def weights(self, orders: IntArray) -> ComplexArray:
        """w_n of the nodes of slot 0 for the given positive orders, (m, 2 C, LANES)."""
        return np.asarray(self.real[orders] + 1j * self.imag[orders])

    def coefficients(self, bore: FloatArray, sector: Sector, orders: IntArray) -> ComplexArray:
        """Fourier coefficients of the potential on the bore.

        Parameters
        ----------
        bore : array (..., slots, 2 C, LANES)
            Potential of the bore nodes of a sector.
        orders : array (m,)
            Positive orders, all of the sector's class.

        Returns
        -------
        array (..., m, LANES)
        """
        turn = np.exp(-2j * np.pi / self.slots * np.outer(orders, np.arange(sector.slots)))
        flat = bore.reshape(*bore.shape[:-2], -1)
        slotwise = (turn @ flat).reshape(*bore.shape[:-3], orders.size, *bore.shape[-2:])
        return np.asarray(sector.count * np.sum(self.weights(orders) * slotwise, axis=-2))

    def source_load(self, source: ComplexArray, orders: IntArray, angles: FloatArray) -> FloatArray:
        """Right-hand side of the nodes of a slot for the rotor turned by `angles` against it.

        Parameters
        ----------
        source : array (m, LANES)
            s_n of the rotor at angle 0, positive orders.
        angles : array (t,)
            Rotor angle minus slot angle, rad.

        Returns
        -------
        array (t, 2 C, LANES)
        """
        turned = np.exp(-1j * np.outer(angles, orders))  # (t, m)
        weighted = np.conj(self.weights(orders)) * source[:, None, :]
        flat = weighted.reshape(orders.size, -1)
        load = -4.0 * np.pi * (turned @ flat).real
        return np.asarray(load.reshape(angles.size, *weighted.shape[1:]))


def bore_entries(lattice: Lattice) -> tuple[IntArray, IntArray, IntArray]:
    """Where the stiffness of the gap goes: its lower triangle, row by row.

    Returns
    -------
    distance, first, second : arrays
        Index [d, a, b] into `GapCoupling.stiffness` of every entry.
    """
    nodes = lattice.bore.shape[1]
    number = np.arange(lattice.bore.size)
    row, column = np.meshgrid(number, number, indexing="ij")
    kept = row >= column
    row, column = row[kept], column[kept]
    # Row (s, a), column (s', b) with s >= s': the entry [s - s', b, a].
    return row // nodes - column // nodes, column % nodes, row % nodes
