"""Induced currents in the rotor, order by order and frequency by frequency.

In the frame of the rotor every field harmonic is exp(j (n phi + w t)). In a ring of conductivity
sigma its potential obeys, with u = ln r, A_uu = (n^2 + j w mu sigma r^2) A, so that the rotor
answers with a complex h_n = y_n(w) a_n instead of the static y_n: this is the periodic steady
state, without stepping through the transient that leads to it. Sleeve and shaft are closed rings.
The magnets are separate conductors without net current: the mean of exp(j n phi) over a segment
of angle alpha is sinc(n alpha/2), and what is left, 1 - sinc^2, is the share of the conductivity
that acts back on its own order (see `evaluators.machine.losses.eddy`). That the segments mix the
orders is left out here; `conducting_magnets.py` has it.

Rings are cut into layers of constant n^2 + j w mu sigma r^2, exact for a thin layer; the error
falls with the square of the layers' thickness.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import ive

from evaluators.finite_element.rotor.uniform import NU_0, Rotor
from evaluators.machine.losses.eddy import block_length_factor, ring_length_factor, segment_share
from evaluators.machine.task.task import Task

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]

LAYERS = 24
"""Layers of magnets and sleeve each; against closed forms the loss is 1e-3 off at most."""


@dataclass(frozen=True)
class Conductors:
    """Conductivities in the rotors of n designs, S/m.

    Attributes
    ----------
    shaft : float
    magnet, sleeve : float
        Of the solid materials.
    segment_angle, segment_length, coverage, length : arrays (n,)
        Angle (rad) and axial length (m) of one insulated magnet piece, share of the ring that is
        magnet, and axial length of the machine (m; infinite for a plane field).
    """

    shaft: float
    magnet: float
    sleeve: float
    segment_angle: FloatArray
    segment_length: FloatArray
    coverage: FloatArray
    length: FloatArray

    @classmethod
    def of(cls, task: Task, arc_ratio: FloatArray, length: FloatArray) -> Conductors:
        """Conductors of a task at its temperatures."""
        parts, conditions, construction = task.materials, task.conditions, task.construction
        pitch = np.pi / task.winding.family.pole_pairs
        return cls(
            shaft=1.0 / float(parts.shaft.resistivity.at(conditions.magnet_temperature)),
            magnet=1.0 / float(parts.magnet.resistivity.at(conditions.magnet_temperature)),
            sleeve=1.0 / float(parts.sleeve.resistivity.at(conditions.sleeve_temperature)),
            segment_angle=arc_ratio * pitch / construction.magnet_segments,
            segment_length=np.full_like(arc_ratio, construction.magnet_axial_segment),
            coverage=arc_ratio,
            length=length,
        )

    def end_factor(self, order: FloatArray, rotor: Rotor) -> FloatArray:
        """Share of the magnets' conductivity that their short pieces leave to an order, (..., n).

        That of a block whose width gives the same loss in a uniform field.
        """
        piece = np.minimum(self.segment_length, self.length)
        share = segment_share(order, self.segment_angle)
        return block_length_factor(piece / (np.sqrt(12.0 * share) * rotor.magnet_radius / order))


@dataclass(frozen=True)
class EddyLoss:
    """Loss of the rotor's parts, (n,) or per harmonic (m, n), W/m."""

    shaft: FloatArray
    magnet: FloatArray
    sleeve: FloatArray

    @property
    def total(self) -> FloatArray:
        """Sum of the parts."""
        return self.shaft + self.magnet + self.sleeve


_Ring = tuple[ComplexArray, ComplexArray]
"""Layer of constant root = sqrt(n^2 + j w mu sigma r^2): nu root, and exp(-root width)."""


def _cut(
    n: FloatArray,
    w: FloatArray,
    inner: FloatArray,
    outer: FloatArray,
    nu: FloatArray | float,
    sigma: FloatArray | float,
    count: int,
) -> Iterator[_Ring]:
    """Layers of equal width = ln(outer/inner)/count, from the inside."""
    width = np.log(outer / inner) / count
    for k in range(count):
        square = inner**2 * np.exp(2.0 * width * (k + 0.5))
        root = np.sqrt(n**2 + 1j * w * sigma * square / nu)
        yield np.asarray(nu * root), np.asarray(np.exp(-root * width))


@dataclass(frozen=True)
class _Layer:
    """h/a at the outside of a layer, and a at its inside over that at its outside."""

    outside: ComplexArray
    passing: ComplexArray


@dataclass(frozen=True)
class _March:
    """All layers from shaft to bore, and h/a at the shaft's surface."""

    layers: list[_Layer]
    shaft: ComplexArray


class EddyRotor:
    """Answer of conducting rotors to field harmonics.

    Parameters
    ----------
    rotor : Rotor
    reluctivity : array (k, n)
        Of the iron rings.
    shaft_rings : int
        How many of them are shaft; the others are laminated and do not conduct along the axis.
    conductors : Conductors
    layers : int
        Of magnets and sleeve each.
    """

    def __init__(
        self,
        rotor: Rotor,
        reluctivity: FloatArray,
        shaft_rings: int,
        conductors: Conductors,
        layers: int = LAYERS,
    ) -> None:
        self.rotor, self.reluctivity, self.shaft_rings = rotor, reluctivity, shaft_rings
        self.conductors, self._layers = conductors, layers

    def response(self, orders: IntArray, speed: FloatArray) -> ComplexArray:
        """h/a at the bore, (m, n), for `orders` (m,) of any sign at angular speeds (m,), rad/s."""
        return self._march(orders, speed).layers[-1].outside

    def loss(self, orders: IntArray, speed: FloatArray, potential: ComplexArray) -> EddyLoss:
        """Loss of harmonics whose two-sided coefficients on the bore are `potential` (m, n).

        One side of each pair n, -n only: the factor of two is in here.
        """
        march = self._march(orders, speed)
        scale = 4.0 * np.pi * np.asarray(speed, dtype=np.float64)[:, None]
        a = potential
        # Power inwards through the circles between the layers, from the bore to the shaft: that of
        # the pair n, -n through a circle is 4 pi w Im(h conj(a)).
        power = []
        for layer in reversed(march.layers):
            power.append(scale * np.imag(layer.outside) * np.abs(a) ** 2)
            a = a * layer.passing
        power.append(scale * np.imag(march.shaft) * np.abs(a) ** 2)
        # Air, sleeve, magnets, core: the power lost between two circles stays in between.
        sleeve, magnet, core = 1, 1 + self._layers, 1 + 2 * self._layers
        return EddyLoss(
            shaft=power[-1],
            magnet=power[magnet] - power[core],
            sleeve=power[sleeve] - power[magnet],
        )

    def _march(self, orders: IntArray, speed: FloatArray) -> _March:
        """March h/a from the shaft to the bore, layer by layer."""
        rotor, conductors = self.rotor, self.conductors
        n = np.abs(np.asarray(orders, dtype=np.float64))[:, None]
        w = np.asarray(speed, dtype=np.float64)[:, None]
        y = self._shaft(n, w)
        layers: list[_Layer] = []

        def through(y: ComplexArray, rings: Iterable[_Ring]) -> ComplexArray:
            for stiffness, x in rings:
                t = (1.0 - x * x) / (1.0 + x * x)
                # a inside over a outside: 1/(cosh + y/stiffness sinh).
                passing = 2.0 * x / ((1.0 + x * x) + y / stiffness * (1.0 - x * x))
                y = np.asarray(stiffness * (y + stiffness * t) / (stiffness + y * t))
                layers.append(_Layer(y, passing))
            return y

        shaft = y
        y = through(y, self._core_rings(n, w))
        share = segment_share(n, conductors.segment_angle)
        magnet = conductors.magnet * share * conductors.coverage * conductors.end_factor(n, rotor)
        nu = NU_0 / rotor.magnet_permeability
        inner, outer = rotor.iron_radius[-1], rotor.magnet_radius
        y = through(y, _cut(n, w, inner, outer, nu, magnet, self._layers))
        through(y, self._outer_rings(n, w))
        return _March(layers, shaft)

    def _core_rings(self, n: FloatArray, w: FloatArray) -> Iterator[_Ring]:
        radius = self.rotor.iron_radius
        for ring in range(self.shaft_rings, len(radius)):
            yield from _cut(n, w, radius[ring - 1], radius[ring], self.reluctivity[ring], 0.0, 1)

    def _outer_rings(self, n: FloatArray, w: FloatArray) -> Iterator[_Ring]:
        rotor, conductors = self.rotor, self.conductors
        sigma = conductors.sleeve * ring_length_factor(n, conductors.length, rotor.sleeve_radius)
        nu = NU_0 / rotor.sleeve_permeability
        inner, outer = rotor.magnet_radius, rotor.sleeve_radius
        yield from _cut(n, w, inner, outer, nu, sigma, self._layers)
        yield from _cut(n, w, rotor.sleeve_radius, rotor.bore_radius, NU_0, 0.0, 1)

    def core(self, order: FloatArray, speed: FloatArray) -> ComplexArray:
        """h/a at the outside of the core, (..., n), for positive `order` and `speed` (..., 1)."""
        y = self._shaft(order, speed)
        for stiffness, x in self._core_rings(order, speed):
            t = (1.0 - x * x) / (1.0 + x * x)
            y = np.asarray(stiffness * (y + stiffness * t) / (stiffness + y * t))
        return y

    def outside(
        self, order: FloatArray, speed: FloatArray
    ) -> tuple[ComplexArray, ComplexArray, ComplexArray]:
        """Sleeve and clearance as a two-port between magnets and bore, for `order`, `speed`.

        Returns
        -------
        inner, mutual, outer : arrays (..., n)
            -h on the magnets is inner a + mutual a_bore, h on the bore mutual a + outer a_bore.
        """
        inner = mutual = outer = np.zeros((), dtype=np.complex128)
        for number, (stiffness, x) in enumerate(self._outer_rings(order, speed)):
            own = stiffness * (1.0 + x * x) / (1.0 - x * x)
            across = -2.0 * stiffness * x / (1.0 - x * x)
            if number == 0:
                inner, mutual, outer = own, across, own
                continue
            joint = outer + own
            inner = inner - mutual * mutual / joint
            mutual, outer = -mutual * across / joint, own - across * across / joint
        return inner, mutual, outer

    def _shaft(self, n: FloatArray, w: FloatArray) -> ComplexArray:
        """h/a at the surface of the solid shaft: nu z I_n'(z)/I_n(z), z = r sqrt(j w sigma/nu).

        Inner iron rings have the outermost ring's reluctivity: the field hardly gets there.
        """
        last = self.shaft_rings - 1
        nu = self.reluctivity[last]
        z = self.rotor.iron_radius[last] * np.sqrt(1j * w * self.conductors.shaft / nu)
        small = np.abs(z) < 0.05 * (n + 1.0)
        safe = np.where(small, 1.0 + 1.0j, z)
        ratio = safe * ive(n - 1.0, safe) / ive(n, safe) - n
        # Series for small arguments: n + z^2/(2 (n + 1)).
        value = np.where(small, n + z * z / (2.0 * (n + 1.0)), ratio)
        return np.asarray(nu * value)
