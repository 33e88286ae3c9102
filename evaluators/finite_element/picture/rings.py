"""Field of gap and rotor at any point, from the Fourier coefficients on the bore.

Every ring between its two faces: order n is a combination of r^n and r^-n, in the magnets with the
particular solution of `rotor.py` besides.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.picture.patches import Patch, grid_triangles, patch_of
from evaluators.finite_element.rotor.uniform import NU_0
from evaluators.finite_element.solution.batch import BatchField
from evaluators.finite_element.solution.lanes import LANES

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]

POINTS_AROUND = 1440  # at least, on every circle
HIGHEST_IN_ROTOR = 12  # times the slots; higher orders do not reach the magnets (below 1e-3)
RING_STEPS = {"clearance": 4, "sleeve": 3, "magnets": 8, "core": 4, "shaft": 4}


@dataclass(frozen=True)
class _Faces:
    """Potential (m,) on both faces of a ring in the frame of the rotor, and the ring's radii."""

    name: str
    inner_radius: float
    outer_radius: float
    inner: ComplexArray
    outer: ComplexArray


def rings(batch: BatchField, nodes: FloatArray, angle: float) -> list[Patch]:
    """Patches from the clearance inwards of a field of the whole circle, `nodes` (size, LANES).

    `angle` is that of the rotor, rad.
    """
    model = batch.model
    orders = np.arange(1, model.orders + 1)
    lattice = model.whole.lattice
    bore = batch.gap.coefficients(nodes[lattice.bore], lattice.sector, orders)
    turned = np.exp(1j * angle * orders)[:, None] * bore
    mean = _mean_on_bore(batch, nodes[lattice.bore][..., 0])
    strength = _magnet_strength(batch, orders)
    around = model.slots * -(-POINTS_AROUND // model.slots)
    direction = np.exp(2j * np.pi * np.arange(around) / around)
    # Field at the angle phi of the stator's frame is that at phi - angle of the rotor's.
    wave = np.exp(1j * np.outer(2.0 * np.pi * np.arange(around) / around - angle, orders))
    found: list[Patch] = []
    for ring in _ring_faces(batch, orders, turned):
        steps = RING_STEPS[ring.name]
        radii = np.linspace(ring.inner_radius, ring.outer_radius, steps + 1)
        p = strength if ring.name == "magnets" else np.zeros_like(strength)
        values = [_inside_ring(batch, ring, orders, p, radius) for radius in radii]
        a, slope = (2.0 * np.real(wave @ np.array(item).T).T for item in zip(*values, strict=True))
        rise = 2.0 * np.real(wave @ (1j * orders * np.array([v for v, _ in values])).T).T
        safe = np.maximum(radii, 1e-3 * ring.outer_radius)[:, None]  # the axis itself
        density = (rise - 1j * slope) / safe * direction
        z = radii[:, None] * direction
        triangles = grid_triangles(radii.size, around, closed=True)
        potential = mean + a.ravel()
        found.append(patch_of(ring.name, z.ravel(), triangles, potential, density.ravel()))
    return found


def _mean_on_bore(batch: BatchField, bore: FloatArray) -> float:
    """Mean of the potential `bore` (slots, 2 C); order zero makes no field and is constant inside.

    Simpson's rule is exact for the quadratic shape functions.
    """
    width = np.diff(batch.mesh.angle[0, ::2, 0])
    closed = np.column_stack([bore, np.roll(bore[:, 0], -1)])
    left, middle, right = closed[:, :-2:2], closed[:, 1::2], closed[:, 2::2]
    whole = np.sum((left + 4.0 * middle + right) / 6.0 * width)
    return float(whole / (2.0 * np.pi))


def _magnet_strength(batch: BatchField, orders: IntArray) -> ComplexArray:
    """Strength of the particular solution of the magnets for all orders, (m,)."""
    strength = np.zeros(orders.size, dtype=np.complex128)
    magnet = batch.model.magnet_orders
    magnet = magnet[magnet <= HIGHEST_IN_ROTOR * batch.model.slots]
    radial, tangential = (item[: magnet.size, 0] for item in batch.remanence)
    strength[magnet - 1] = -0.5j * (tangential + magnet * radial)
    return strength


def _ring_faces(batch: BatchField, orders: IntArray, bore: ComplexArray) -> list[_Faces]:
    """Faces of all rings from the clearance inwards; `bore` (m, LANES) in the rotor's frame."""
    model, rotor = batch.model, batch.rotor
    low = orders <= HIGHEST_IN_ROTOR * model.slots
    remanence = np.zeros((2, int(low.sum()), LANES))
    magnet = model.magnet_orders[model.magnet_orders <= orders[low][-1]]
    for part, values in zip(remanence, batch.remanence, strict=True):
        part[magnet - 1] = values[: magnet.size]
    inside = rotor.inside(orders[low], batch.reluctivity, remanence[0], remanence[1], bore[low])
    radius = {
        name: float(getattr(batch.sections, f"{name}_radius")[0])
        for name in ("magnet", "rotor", "bore")
    }
    iron_radius = rotor.iron_radius[:, 0]
    surface = np.zeros(orders.size, dtype=np.complex128)
    surface[low] = inside.surface_radial[:, 0] * radius["magnet"] / (1j * orders[low])
    iron = np.zeros((iron_radius.size, orders.size), dtype=np.complex128)
    iron[:, low] = inside.iron[:, :, 0]
    outside = bore[:, 0]
    sleeve = _between(
        orders,
        (NU_0 / rotor.sleeve_permeability, radius["rotor"] / radius["magnet"], surface),
        (NU_0, radius["bore"] / radius["rotor"], outside),
    )
    faces = [
        _Faces("clearance", radius["rotor"], radius["bore"], sleeve, outside),
        _Faces("sleeve", radius["magnet"], radius["rotor"], surface, sleeve),
        _Faces("magnets", float(iron_radius[-1]), radius["magnet"], iron[-1], surface),
    ]
    half = model.discretisation.iron_rings
    for k in range(iron_radius.size - 1, -1, -1):
        inner = float(iron_radius[k - 1]) if k else 0.0
        below = iron[k - 1] if k else np.zeros_like(surface)
        name = "core" if k >= half else "shaft"
        faces.append(_Faces(name, inner, float(iron_radius[k]), below, iron[k]))
    return faces


def _between(
    orders: IntArray,
    inner: tuple[float, float, ComplexArray],
    outer: tuple[float, float, ComplexArray],
) -> ComplexArray:
    """Potential (m,) where two rings meet, H_phi being continuous.

    Each ring is its reluctivity, its ratio of radii and the potential on its far face.
    """
    (nu_in, ratio_in, a_in), (nu_out, ratio_out, a_out) = inner, outer
    w_in, w_out = orders * np.log(ratio_in), orders * np.log(ratio_out)
    zero = np.zeros_like(w_in)
    pull = nu_in * _cosh_ratio(zero, w_in) * a_in + nu_out * _cosh_ratio(zero, w_out) * a_out
    hold = nu_in * _cosh_ratio(w_in, w_in) + nu_out * _cosh_ratio(w_out, w_out)
    return np.asarray(pull / hold)


def _sinh_ratio(u: FloatArray, v: FloatArray) -> FloatArray:
    """sinh(u)/sinh(v), 0 <= u <= v, without overflow."""
    return np.asarray(np.exp(u - v) * np.expm1(-2.0 * u) / np.expm1(-2.0 * v))


def _cosh_ratio(u: FloatArray, v: FloatArray) -> FloatArray:
    """cosh(u)/sinh(v), 0 <= u <= v, without overflow."""
    return np.asarray(-np.exp(u - v) * (1.0 + np.exp(-2.0 * u)) / np.expm1(-2.0 * v))


def _inside_ring(
    batch: BatchField, ring: _Faces, orders: IntArray, p: ComplexArray, radius: float
) -> tuple[ComplexArray, ComplexArray]:
    """Potential and r times its slope (m,) at a radius of a ring."""
    order = orders.astype(np.float64)
    if ring.inner_radius == 0.0:
        a = ring.outer * (radius / ring.outer_radius) ** order
        return a, order * a

    def particular(at: float) -> tuple[ComplexArray, ComplexArray]:
        lanes = np.full(LANES, at)
        value, slope = batch.rotor.particular(order[:, None], lanes)
        return p * value[:, 0], p * slope[:, 0]

    inner = ring.inner - particular(ring.inner_radius)[0]
    outer = ring.outer - particular(ring.outer_radius)[0]
    whole = order * np.log(ring.outer_radius / ring.inner_radius)
    up = order * np.log(radius / ring.inner_radius)
    down = np.maximum(whole - up, 0.0)
    value, slope = particular(radius)
    a = inner * _sinh_ratio(down, whole) + outer * _sinh_ratio(up, whole) + value
    r_slope = order * (outer * _cosh_ratio(up, whole) - inner * _cosh_ratio(down, whole)) + slope
    return a, r_slope
