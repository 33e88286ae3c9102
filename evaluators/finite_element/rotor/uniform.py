"""The rotor as seen from the bore: one number of response and one of source per spatial order.

All media of the rotor are taken as rotationally uniform rings: shaft, core, magnets (the spaces
between them as magnet without magnetisation), sleeve and clearance. Then the orders do not mix,
and with A = sum_n a_n exp(j n phi) and h = nu (r dA/dr + r Br_phi) = -r H_phi, continuous from ring
to ring, each order obeys h_n = y_n a_n + s_n exp(-j n theta) at the bore, theta being the angle of
the rotor. This is exact: neither gap nor rotor has a mesh. Boundary-value problem as in Zhu, Howe,
Chan, IEEE Trans. Magn. 38(1), 2002, 229-238, here for the vector potential and any number of
rings.

Core and shaft are divided into rings of their own reluctivity, so that saturation by the field that
turns with the rotor can be taken into account ring by ring.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]

MU_0 = 4e-7 * np.pi
NU_0 = 1.0 / MU_0


def magnetisation(
    arc_ratio: FloatArray, pole_pairs: int, orders: IntArray, direction: str
) -> tuple[FloatArray, FloatArray]:
    """Cosine amplitudes of the radial, sine amplitudes of the tangential remanence per tesla.

    Zhu, Howe, Chan 2002, with the magnet axis at phi = 0.

    Parameters
    ----------
    arc_ratio : array (n,)
        Magnet arc over pole pitch.
    orders : array (m,)
        Odd multiples of `pole_pairs`; others must not be asked for.
    direction : str
        ``radial`` or ``parallel``.

    Returns
    -------
    radial, tangential : arrays (m, n)
    """
    half = 0.5 * np.pi / pole_pairs * arc_ratio  # half the arc of a magnet
    k = orders[:, None]
    if direction == "radial":
        radial = 2.0 * arc_ratio * np.sinc(k * half / np.pi)
        return radial, np.zeros_like(radial)
    plus = arc_ratio * np.sinc((k + 1) * half / np.pi)
    minus = arc_ratio * np.sinc((k - 1) * half / np.pi)
    return plus + minus, plus - minus


def across_ring(
    y: FloatArray, order: FloatArray, nu: FloatArray | float, width: FloatArray
) -> FloatArray:
    """h/a at the outside of a ring from that at its inside; width = ln(outer/inner)."""
    stiff = nu * order
    t = np.tanh(order * width)
    return np.asarray(stiff * (y + stiff * t) / (stiff + y * t))


def _damping(
    y: FloatArray, order: FloatArray, nu: FloatArray | float, width: FloatArray
) -> FloatArray:
    """Factor of the part of h that does not depend on a, from the inside of a ring to outside.

    It is also the factor of a from the outside to the inside where that part is zero.
    """
    x = np.exp(-order * width)
    return np.asarray(2.0 * x / ((1.0 + x * x) + y / (nu * order) * (1.0 - x * x)))


@dataclass(frozen=True)
class Inside:
    """Field in the rotor for orders m of n designs, coefficients of exp(+j order phi).

    Attributes
    ----------
    core : array (m, n)
        Potential at the outside of the core.
    iron : array (k, m, n)
        Potential at the outside of every iron ring.
    iron_response : array (k, m, n)
        h/a there.
    surface_radial, surface_field : arrays (m, n)
        B_r (T) and h = -r H_phi (A) at the outer surface of the magnets.
    """

    core: ComplexArray
    iron: ComplexArray
    iron_response: FloatArray
    surface_radial: ComplexArray
    surface_field: ComplexArray


@dataclass(frozen=True)
class Rotor:
    """Rings of the rotors of n designs.

    Attributes
    ----------
    iron_radius : array (k, n)
        Outer radii of the rings of shaft and core, m; the last is the inner radius of the magnets.
    magnet_radius, sleeve_radius, bore_radius : array (n,)
        m.
    magnet_permeability, sleeve_permeability : float
        Relative.
    """

    iron_radius: FloatArray
    magnet_radius: FloatArray
    sleeve_radius: FloatArray
    bore_radius: FloatArray
    magnet_permeability: float
    sleeve_permeability: float

    def iron_response(self, order: FloatArray, reluctivity: FloatArray) -> FloatArray:
        """h/a at the outside of every iron ring, (k, m, n), for `order` (m, 1)."""
        responses = np.empty((len(self.iron_radius), order.shape[0], self.bore_radius.size))
        responses[0] = reluctivity[0] * order
        for ring in range(1, len(self.iron_radius)):
            width = np.log(self.iron_radius[ring] / self.iron_radius[ring - 1])
            responses[ring] = across_ring(responses[ring - 1], order, reluctivity[ring], width)
        return responses

    @property
    def _magnet_width(self) -> FloatArray:
        return np.asarray(np.log(self.magnet_radius / self.iron_radius[-1]))

    @property
    def outer_rings(self) -> tuple[tuple[float, FloatArray], ...]:
        """Reluctivity and logarithmic width of sleeve and clearance."""
        return (
            (NU_0 / self.sleeve_permeability, np.log(self.sleeve_radius / self.magnet_radius)),
            (NU_0, np.log(self.bore_radius / self.sleeve_radius)),
        )

    def particular(self, order: FloatArray, radius: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Value and r times slope of the solution of A'' + A'/r - n^2 A/r^2 = -1/r."""
        one = order == 1.0
        divisor = np.where(one, 1.0, order**2 - 1.0)
        logarithm = np.log(radius / self.magnet_radius)
        value = np.where(one, -0.5 * radius * logarithm, radius / divisor)
        slope = np.where(one, -0.5 * radius * (logarithm + 1.0), radius / divisor)
        return value, slope

    def _magnet_source(
        self, order: FloatArray, core: FloatArray, p: FloatArray, direct: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Affine part of h at the inside of the magnets (general solution) and at their outside.

        `p` is the strength of the particular solution, `direct` the tangential remanence.
        """
        nu = NU_0 / self.magnet_permeability
        inner, outer = self.iron_radius[-1], self.magnet_radius
        value, slope = self.particular(order, inner)
        offset = core * p * value - nu * (p * slope + direct * inner)
        value, slope = self.particular(order, outer)
        y = across_ring(core, order, nu, self._magnet_width)
        carried = offset * _damping(core, order, nu, self._magnet_width)
        return offset, carried + nu * (p * slope + direct * outer) - y * p * value

    def at_bore(
        self, orders: IntArray, reluctivity: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Response of the rotor and transfer of the magnets.

        Parameters
        ----------
        orders : array (m,), positive
        reluctivity : array (k, n)
            Of the iron rings, m/H.

        Returns
        -------
        y : array (m, n)
            h/a at the bore without magnets, A/m.
        radial, tangential : arrays (m, n)
            s_n = -j (radial * R_n + tangential * T_n) for exp(+j n phi), R_n and T_n being the
            cosine and sine amplitudes of radial and tangential remanence, in A per T.
        """
        order = np.asarray(orders, dtype=np.float64)[:, None]
        core = self.iron_response(order, reluctivity)[-1]
        zero, one = np.zeros_like(order), np.ones_like(order)
        sources = [
            0.5 * self._magnet_source(order, core, p, direct)[1]
            for p, direct in ((order, zero), (one, one))
        ]
        y = across_ring(core, order, NU_0 / self.magnet_permeability, self._magnet_width)
        for nu, width in self.outer_rings:
            damping = _damping(y, order, nu, width)
            sources = [source * damping for source in sources]
            y = across_ring(y, order, nu, width)
        return y, sources[0], sources[1]

    def inside(
        self,
        orders: IntArray,
        reluctivity: FloatArray,
        radial: FloatArray,
        tangential: FloatArray,
        potential: ComplexArray,
    ) -> Inside:
        """Field in the rotor from the potential on the bore.

        Parameters
        ----------
        orders : array (m,), positive
        reluctivity : array (k, n)
        radial, tangential : arrays (m, n), T
            Amplitudes of the remanence, see `magnetisation`.
        potential : array (m, n)
            Coefficients on the bore, in the frame of the rotor.
        """
        order = np.asarray(orders, dtype=np.float64)[:, None]
        responses = self.iron_response(order, reluctivity)
        core = responses[-1]
        nu = NU_0 / self.magnet_permeability
        # Strength of the particular solution and tangential remanence are -j times these.
        strength, direct = 0.5 * (tangential + order * radial), 0.5 * tangential
        p: ComplexArray = np.asarray(-1j * strength)
        offset, source = (
            np.asarray(-1j * part) for part in self._magnet_source(order, core, strength, direct)
        )
        # Outwards: response and source at the inside of sleeve and clearance; then back inwards.
        y = across_ring(core, order, nu, self._magnet_width)
        rings = []
        for nu_ring, width in self.outer_rings:
            rings.append((nu_ring, width, y, source))
            source = source * _damping(y, order, nu_ring, width)
            y = across_ring(y, order, nu_ring, width)
        a = potential
        for nu_ring, width, y_inner, s_inner in reversed(rings):
            a = _inwards(a, order, nu_ring, width, y_inner, s_inner)
        outer_value, _ = self.particular(order, self.magnet_radius)
        inner_value, _ = self.particular(order, self.iron_radius[-1])
        general_outer = a - p * outer_value
        general_inner = _inwards(general_outer, order, nu, self._magnet_width, core, offset)
        iron = np.empty(responses.shape, dtype=np.complex128)
        iron[-1] = general_inner + p * inner_value
        for ring in range(len(self.iron_radius) - 1, 0, -1):
            width = np.log(self.iron_radius[ring] / self.iron_radius[ring - 1])
            iron[ring - 1] = iron[ring] * _damping(
                responses[ring - 1], order, reluctivity[ring], width
            )
        return Inside(
            core=iron[-1],
            iron=iron,
            iron_response=responses,
            surface_radial=1j * order * a / self.magnet_radius,
            surface_field=rings[0][2] * a + rings[0][3],
        )


def _inwards(
    outer: ComplexArray,
    order: FloatArray,
    nu: FloatArray | float,
    width: FloatArray,
    y: FloatArray,
    source: ComplexArray,
) -> ComplexArray:
    """Potential at the inside of a ring from that at its outside, where h = y a + source inside."""
    x = np.exp(-order * width)
    sinh = 0.5 * (1.0 - x * x)  # times exp(+order width), which cancels
    damping = _damping(y, order, nu, width)
    return np.asarray(damping * outer - source * sinh / (nu * order) * damping / x)


def mean_square_density(
    inside: Inside, rotor: Rotor, orders: IntArray, reluctivity: FloatArray
) -> FloatArray:
    """Mean of B^2 over every iron ring, (k, n), T2, by the trapezoidal rule over its two faces."""
    order = np.asarray(orders, dtype=np.float64)[:, None]
    faces = []
    for ring in range(len(rotor.iron_radius)):
        r = rotor.iron_radius[ring]
        magnitude = np.abs(inside.iron[ring]) ** 2
        slope = inside.iron_response[ring] / reluctivity[ring]
        outer = 2.0 * np.sum(magnitude * (order**2 + slope**2), axis=0) / r**2
        if ring == 0:
            # B grows as r^(n-1) inside; its mean square over the disc is 1/n of that at the rim.
            inner = 2.0 * np.sum(magnitude * (2.0 * order**2) * (2.0 / order - 1.0), axis=0) / r**2
        else:
            r = rotor.iron_radius[ring - 1]
            magnitude = np.abs(inside.iron[ring - 1]) ** 2
            slope = inside.iron_response[ring - 1] / reluctivity[ring]
            inner = 2.0 * np.sum(magnitude * (order**2 + slope**2), axis=0) / r**2
        faces.append(0.5 * (inner + outer))
    return np.asarray(np.maximum(np.stack(faces), 0.0))
