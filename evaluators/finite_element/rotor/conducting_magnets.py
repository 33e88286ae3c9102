"""Magnets as conductors of their own: the rotor's answer to coupled orders at one frequency.

In the frame of the rotor the conductivity has the period of a pole, and so has the reluctivity if
the spaces between the magnets are not as permeable as these. Orders a multiple of 2 p apart thus
mix, at one frequency. Every insulated segment s has a potential gradient u_s of its own that makes
its net current zero, J = -sigma (j w A + u_s). With u = ln r the potential
sum_n a_n(u) exp(j n phi) makes stationary, for all test functions b,

    integral of b'^T N a' + b^T n M^-1 n a + j w sigma r^2 b^T T a  du
        - j w sigma (p/pi) sum_s conj(g_s(b)) g_s(a) / area_s  =  [b^T h] outside - inside,

T being the Toeplitz matrix of the magnets' share of the circle, g_s the integral over a segment of
the first pole, N and M as in `separate_magnets.py` (own derivation). Along the radius each order
has its two static waves and a few polynomials that vanish on both faces of the magnets, so that
nothing is meshed. Core and shaft within, sleeve and clearance without, are rings (`eddy.py`).

Taking each order alone instead (`eddy.py`) put the magnets' loss by the torque field 5 to 10 % too
low, that by the suspension field 3 to 5 % too high and the force up to 3 degrees off in linear
machines of six and twelve slots with 2, 4 and 8 poles, and the loss in the field of a single order
up to 55 % off. Stepping through time on independent meshes agrees to 0.04 to 0.4 % in the loss once
mesh and steps are refined, to 1.2 % at the default mesh.

Short pieces: the currents of order n are weakened by the square root of `Conductors.end_factor` on
both sides, which is exact for one order alone in the limit of that factor.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.rotor.eddy import Conductors, EddyLoss, EddyRotor
from evaluators.finite_element.rotor.uniform import NU_0, Rotor

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]

INNER = 2
"""Polynomials along the radius; the loss is within 1e-4 of an independent mesh's, with one 4e-4."""

POINTS = 16
"""Points of the Gauss rule along the radius."""

ZERO = 1e-4
"""Stands for order 0, whose waves would need formulas of their own."""


@dataclass(frozen=True)
class Spaces:
    """Reluctivity of the ring if the spaces between the magnets are not like these.

    `along` (n, m, m) is N and `across` (n, m, m) the inverse of M, both less the magnets'
    reluctivity on the diagonal, m/H.
    """

    along: FloatArray
    across: FloatArray


@dataclass(frozen=True)
class Answer:
    """Answer to the potential of m coupled orders on the bore at f frequencies.

    Attributes
    ----------
    speed : array (f,)
        rad/s.
    response : array (f, n, m, m)
        h over a on the bore.
    magnet, core : arrays (f, n, m, m)
        a on the outside of magnets and of the core over a on the bore.
    """

    speed: FloatArray
    response: ComplexArray
    magnet: ComplexArray
    core: ComplexArray
    _outside: tuple[ComplexArray, ComplexArray]
    _core_response: ComplexArray

    def loss(self, potential: ComplexArray) -> EddyLoss:
        """Loss (f, n) of the potential (f, n, m) on the bore together with its conjugate, W/m."""
        inner, mutual = self._outside
        core, magnet = _times(self.core, potential), _times(self.magnet, potential)
        scale = 4.0 * np.pi * self.speed[:, None]

        def through(h: ComplexArray, a: ComplexArray) -> FloatArray:
            return np.asarray(scale * np.sum(np.imag(h * np.conj(a)), axis=-1))

        bore = through(_times(self.response, potential), potential)
        face = through(-(inner * magnet + mutual * potential), magnet)
        shaft = through(self._core_response * core, core)
        return EddyLoss(shaft=shaft, magnet=face - shaft, sleeve=bore - face)


class ConductingMagnets:
    """Coupled orders of n rotors.

    Parameters
    ----------
    eddy : EddyRotor
        Rings and conductivities.
    pole_pairs, segments : int
        Segments are those of one pole.
    orders : array (m,)
        Signed, a multiple of 2 p apart.
    spaces : Spaces, optional
        Of the same orders.
    """

    def __init__(
        self,
        eddy: EddyRotor,
        pole_pairs: int,
        segments: int,
        orders: IntArray,
        spaces: Spaces | None = None,
    ) -> None:
        self.eddy, self.orders = eddy, orders
        rotor, conductors = eddy.rotor, eddy.conductors
        self._order = np.where(orders == 0, ZERO, np.abs(orders).astype(np.float64))
        width = np.log(rotor.magnet_radius / rotor.iron_radius[-1])
        points, weights = _rule()
        value, slope = _functions(self._order, width)
        nu = NU_0 / rotor.magnet_permeability
        stiffness = nu * _uniform_ring(self._order, width)
        if spaces is not None:
            weight = weights * width[:, None]
            by_slope = spaces.along / width[:, None, None] ** 2
            by_value = orders[:, None] * spaces.across * orders
            stiffness += _products(slope, weight, by_slope) + _products(value, weight, by_value)
        # Area element r^2 du.
        area = (rotor.iron_radius[-1] ** 2 * width)[:, None] * weights
        area = area * np.exp(2.0 * width[:, None] * points)
        apart = orders[:, None] - orders
        half = (0.5 * np.pi / pole_pairs * conductors.coverage)[:, None, None]
        share = conductors.coverage[:, None, None] * np.sinc(apart * half / np.pi)
        mass = _products(value, area, share)
        net = _segments(conductors, rotor, pole_pairs, segments, orders)
        whole = np.einsum("nlmq,nq->nlm", value, area)
        mass -= whole[:, :, :, None, None] * whole[:, None, None] * net[:, None, :, None, :]
        end = np.sqrt(conductors.end_factor(self._order[:, None], rotor).T)
        mass *= end[:, None, :, None, None] * end[:, None, None, None, :]
        size = value.shape[1] * orders.size
        self._stiffness = stiffness.reshape(-1, size, size)
        self._mass = conductors.magnet * mass.reshape(-1, size, size)

    def answer(self, speed: FloatArray) -> Answer:
        """Answer at angular speeds (f,), rad/s."""
        count = self.orders.size
        order = self._order[:, None]
        w = np.asarray(speed, dtype=np.float64)[:, None, None]
        # Order 0 makes no current in closed rings: they have no way back.
        seen = np.where(self.orders[:, None] == 0, 0.0, w)
        inner, mutual, outer = (
            np.asarray(np.broadcast_to(item, (w.size, *item.shape[-2:])).transpose(0, 2, 1))
            for item in self.eddy.outside(order, seen)
        )
        core = self.eddy.core(order, seen).transpose(0, 2, 1)
        matrix = self._stiffness + 1j * w[..., None] * self._mass
        place = np.arange(count)
        matrix[:, :, place, place] += core
        matrix[:, :, count + place, count + place] += inner
        right = np.zeros((*matrix.shape[:-1], count), dtype=np.complex128)
        right[:, :, count + place, place] = -mutual
        solved: ComplexArray = np.asarray(np.linalg.solve(matrix, right), np.complex128)
        magnet = solved[:, :, count : 2 * count]
        response = mutual[..., None] * magnet
        response[:, :, place, place] += outer
        return Answer(
            speed=np.asarray(speed, dtype=np.float64),
            response=response,
            magnet=magnet,
            core=solved[:, :, :count],
            _outside=(inner, mutual),
            _core_response=core,
        )


def _times(matrix: ComplexArray, vector: ComplexArray) -> ComplexArray:
    return np.asarray((matrix @ vector[..., None])[..., 0])


@cache
def _rule() -> tuple[FloatArray, FloatArray]:
    """Points and weights of the Gauss rule over 0 to 1."""
    points, weights = np.polynomial.legendre.leggauss(POINTS)
    return 0.5 * (points + 1.0), 0.5 * weights


@cache
def _polynomials() -> tuple[FloatArray, FloatArray]:
    """x (1 - x) P_k(2 x - 1) and its derivative at the rule's points, (INNER, q) each."""
    points = _rule()[0]
    bump, change = points * (1.0 - points), 1.0 - 2.0 * points
    values, slopes = [], []
    for k in range(INNER):
        legendre = np.polynomial.legendre.Legendre.basis(k, domain=[0.0, 1.0])
        values.append(bump * legendre(points))
        slopes.append(change * legendre(points) + bump * legendre.deriv()(points))
    return np.array(values), np.array(slopes)


def _functions(order: FloatArray, width: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Functions of x = (u - u_inner)/width and their derivatives by x, (n, 2 + INNER, m, q).

    The first two are the waves sinh(n width (1 - x)) and sinh(n width x), one on their own face.
    """
    points = _rule()[0]
    z = (width[:, None] * order)[:, :, None]
    shape = (*z.shape[:2], points.size)
    value = np.empty((shape[0], 2 + INNER, *shape[1:]))
    slope = np.empty_like(value)
    for k, (x, sign) in enumerate(((1.0 - points, -1.0), (points, 1.0))):
        rising, falling = np.exp(-z * (1.0 - x)), np.exp(-z * (1.0 + x))
        value[:, k] = (rising - falling) / (1.0 - np.exp(-2.0 * z))
        slope[:, k] = sign * z * (rising + falling) / (1.0 - np.exp(-2.0 * z))
    values, slopes = _polynomials()
    value[:, 2:], slope[:, 2:] = values[None, :, None], slopes[None, :, None]
    return value, slope


def _products(value: FloatArray, weight: FloatArray, matrix: FloatArray) -> FloatArray:
    """Integrals of all products of functions times `matrix` (n, m, m), (n, l, m, l, m)."""
    lanes, kinds, count, points = value.shape
    flat = value.reshape(lanes, kinds * count, points)
    product = (flat * weight[:, None]) @ flat.transpose(0, 2, 1)
    shaped = product.reshape(lanes, kinds, count, kinds, count)
    return np.asarray(shaped * matrix[:, None, :, None, :])


def _uniform_ring(order: FloatArray, width: FloatArray) -> FloatArray:
    """Stiffness per reluctivity of a ring without spaces, (n, l, m, l, m); waves in closed form."""
    kinds, count = 2 + INNER, order.size
    result = np.zeros((width.size, kinds, count, kinds, count))
    m = np.arange(count)
    x = np.exp(-order * width[:, None])
    result[:, 0, m, 0, m] = result[:, 1, m, 1, m] = order * (1.0 + x * x) / (1.0 - x * x)
    result[:, 0, m, 1, m] = result[:, 1, m, 0, m] = -2.0 * order * x / (1.0 - x * x)
    values, slopes = _polynomials()
    weights = _rule()[1]
    mass, stiff = (values * weights) @ values.T, (slopes * weights) @ slopes.T
    for k in range(INNER):
        for j in range(INNER):
            result[:, 2 + k, m, 2 + j, m] = (
                stiff[k, j] / width[:, None] + order**2 * width[:, None] * mass[k, j]
            )
    return result


def _segments(
    conductors: Conductors, rotor: Rotor, pole_pairs: int, segments: int, orders: IntArray
) -> FloatArray:
    """Share of the circle times the mean of order n times that of n' conjugate, over area.

    Summed over the segments, (n, m, m), 1/m2; it takes the net current away.
    """
    angle = conductors.segment_angle
    area = 0.5 * angle * (rotor.magnet_radius**2 - rotor.iron_radius[-1] ** 2)
    middle = angle[:, None] * (np.arange(segments) - 0.5 * (segments - 1))
    apart = orders[:, None] - orders
    turned = np.cos(middle[:, :, None, None] * apart).sum(axis=1)
    mean = angle[:, None] * np.sinc(0.5 * orders * angle[:, None] / np.pi)
    scale = (pole_pairs / np.pi / area)[:, None, None]
    return np.asarray(scale * turned * mean[:, :, None] * mean[:, None, :])
