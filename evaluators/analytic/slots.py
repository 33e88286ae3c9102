"""The slot seen from the gap: how its mouth answers the field, whatever shape the tooth tip has.

Across the slot the vector potential is written in the modes of a channel between two walls of
infinite permeability, psi_k(xi) with xi = angle over half the slot angle: cos(k pi xi / 2) for even
k, sin(k pi xi / 2) for odd k. Along the radius the amplitudes a_k and their conjugate currents
f_k = integral of r dA/dr psi_k follow from the field energy of the slice (Hamilton's equations of
coupled modes in a tapered guide; Schelkunoff, Bell Syst. Tech. J. 34, 1955, for the method). They
are integrated from the winding to the bore in small steps: a straight piece of channel, solved
exactly, then a change of width, a fixed linear map. So a half-closed, a straight and a pointed
tooth differ only in the width they prescribe.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.integrate import quad_vec
from scipy.linalg import expm

from evaluators.analytic.tips import PLACES
from evaluators.machine.geometry.cross_sections import CrossSections

FloatArray = NDArray[np.float64]

TIP_STEPS = 3
WEDGE_STEPS = 6
WALL_STEPS = tuple(np.rint(WEDGE_STEPS * (1.0 - PLACES)).astype(int))
BODY_NODES = 16
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(BODY_NODES)


@dataclass(frozen=True)
class SlotMouth:
    """Answer of one slot at the bore, for n designs and modes k = 1..K.

    a = -compliance f + current_share mu0 I, where a (K,) are the mode amplitudes of A at the mouth,
    f (K,) their conjugate currents and I the current of the slot.

    Attributes
    ----------
    compliance : array (n, K, K)
        Symmetric; couples modes of equal parity only.
    current_share : array (n, K)
        Zero for odd modes. By reciprocity the winding's mean of A exceeds the mouth's by
        -current_share f as well.
    permeance : array (n,)
        Of A, mean over the winding minus mean over the mouth, over mu0 I with f = 0: the slot's
        leakage permeance number.
    tooth_permeance, yoke_permeance : arrays (n,)
        The same for A along the tooth body, mean over its length, and at the slot bottom: what a
        slot's own current adds to the flux of the teeth beside it and of the yoke behind it.
    wall, wall_permeance : arrays (n, 4, K) and (n, 4)
        Of A on the slot's wall at depths of `evaluators.analytic.tips.PLACES`: what f and mu0 I add
        to the winding's A less the slot's own leakage; odd modes with the sign of the wall behind.
    """

    compliance: FloatArray
    current_share: FloatArray
    permeance: FloatArray
    tooth_permeance: FloatArray
    yoke_permeance: FloatArray
    wall: FloatArray
    wall_permeance: FloatArray


def mouth(sections: CrossSections, modes: int) -> SlotMouth:
    """Answer of the slot of each design, by `modes` modes beside the uniform one."""
    rows = len(sections)
    decay = 0.5 * np.pi * np.arange(1, modes + 1)
    body = _body(sections)
    compliance = np.zeros((rows, modes, modes))
    diagonal = np.arange(modes)
    compliance[:, diagonal, diagonal] = 1.0 / (decay * np.tanh(decay * body.length[:, None]))
    share = np.zeros((rows, modes))
    permeance = body.winding.copy()
    identity = np.eye(modes)

    order = np.arange(1, modes + 1)
    at_wall = np.where(order % 2 == 0, (-1.0) ** (order // 2), (-1.0) ** ((order - 1) // 2))
    depths, back = [], []
    edges = _edges(sections)
    half_angle = 0.5 * sections.slot_angle(edges)
    for step in range(edges.shape[1] - 1):
        outer, inner = edges[:, step], edges[:, step + 1]
        middle = np.sqrt(outer * inner)[:, None]
        angle = 0.5 * sections.slot_angle(middle)[:, 0]
        length = np.log(outer / inner) / angle
        if step in WALL_STEPS:
            depths.append((step, compliance, share, permeance.copy()))
        compliance, share, gain, first, first_driven = _widen(
            compliance, share, np.log(angle / half_angle[:, step]), modes
        )
        permeance += gain
        # A straight piece: f and a swap by tanh, so the compliance approaches 1/decay.
        tanh = np.tanh(decay * length[:, None])
        cosh = np.cosh(decay * length[:, None])
        divisor = identity + (decay * tanh)[:, :, None] * compliance
        top = compliance + (tanh / decay)[:, :, None] * identity
        transposed = np.swapaxes(divisor, 1, 2)
        behind = share
        into = np.linalg.inv(divisor)
        share = np.linalg.solve(transposed, share[:, :, None])[:, :, 0] / cosh
        permeance += 0.5 * length - np.sum(behind * decay * tanh * cosh * share, axis=1)
        compliance = np.swapaxes(np.linalg.solve(transposed, np.swapaxes(top, 1, 2)), 1, 2)
        compliance, share, gain, second, second_driven = _widen(
            compliance, share, np.log(half_angle[:, step + 1] / angle), modes
        )
        permeance += gain
        straight = first @ into / cosh[:, None, :]
        kept = (first @ into @ (decay * tanh * behind)[:, :, None])[..., 0]
        back.append(
            (
                straight @ second,
                kept - (straight @ second_driven[:, :, None])[..., 0] - first_driven,
            )
        )
    wall, wall_permeance = [], []
    whole, added = np.broadcast_to(identity, compliance.shape), np.zeros((rows, modes))
    for step in range(len(back) - 1, -1, -1):
        matrix, own = back[step]
        whole, added = matrix @ whole, (matrix @ added[:, :, None])[..., 0] + own
        if depths and depths[-1][0] == step:
            _, there, shared, passed = depths.pop()
            weight = shared - there @ at_wall
            wall.append((weight[:, None, :] @ whole)[:, 0])
            wall_permeance.append(
                permeance - passed + shared @ at_wall + np.sum(weight * added, axis=1)
            )
    compliance = 0.5 * (compliance + np.swapaxes(compliance, 1, 2))
    through_mouth = permeance - body.winding
    return SlotMouth(
        compliance=compliance,
        current_share=share,
        permeance=permeance,
        tooth_permeance=through_mouth + body.tooth,
        yoke_permeance=through_mouth + body.yoke,
        wall=np.stack(wall, axis=1),
        wall_permeance=np.stack(wall_permeance, axis=1),
    )


def _edges(sections: CrossSections) -> FloatArray:
    """Radii of the steps from the winding inwards to the bore, (n, steps + 1)."""
    wedge = np.linspace(sections.wedge_radius, sections.tip_radius, WEDGE_STEPS + 1, axis=1)
    tip = np.linspace(sections.tip_radius, sections.bore_radius, TIP_STEPS + 1, axis=1)
    return np.concatenate([wedge, tip[:, 1:]], axis=1)


class _Body(NamedTuple):
    """Wound part of the slot, (n,) each: length in half-widths; leakage permeance numbers."""

    length: FloatArray
    winding: FloatArray
    tooth: FloatArray
    yoke: FloatArray


def _body(sections: CrossSections) -> _Body:
    """Length of the wound part, and its leakage: mean over winding, over tooth, and whole.

    With the current spread evenly over the slot, the current enclosed below radius r is
    s(r) = area(r)/area. The leakage that has crossed the slot up to r is the integral of
    s dr / (r * slot angle), and the mean linkage is that of s^2 dr / (r * slot angle) (slot
    leakage of any width profile; Pyrhonen et al. 2014, ch. 4).
    """
    depth = 0.5 * (sections.slot_radius - sections.wedge_radius)[:, None]
    radius = sections.wedge_radius[:, None] + depth * (1.0 + _NODES)
    angle = sections.slot_angle(radius)
    step = _WEIGHTS * depth / (angle * radius)
    half = 0.5 * sections.tooth_width[:, None]
    ring = np.pi / sections.family.slots * (sections.slot_radius[:, None] ** 2 - radius**2)
    bottom = sections.slot_radius[:, None]

    def tooth(r: FloatArray) -> FloatArray:
        return np.asarray(r**2 * np.arcsin(half / r) + half * np.sqrt(r**2 - half**2))

    enclosed = (ring - tooth(bottom) + tooth(radius)) / sections.slot_area[:, None]
    return _Body(
        length=np.sum(2.0 * step, axis=1),
        winding=np.sum(step * enclosed**2, axis=1),
        # Leakage that crosses at a depth is carried by the rest of the tooth behind it.
        tooth=np.sum(step * enclosed * 0.5 * (1.0 - _NODES), axis=1),
        yoke=np.sum(step * enclosed, axis=1),
    )


def _widen(
    compliance: FloatArray, share: FloatArray, stretch: FloatArray, modes: int
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray, FloatArray]:
    """Change of channel width by exp(stretch), (n,), going inwards, applied to the answer.

    Currents map as f' = B f + d f_0, so the potentials map by the inverse transpose: a = B^T a'
    and, of the means, a_0 = a_0' + d a' (the power, sum of a f, is the same on both sides).

    Returns
    -------
    compliance, share, gain
        The first two inside the change of width; what it adds to the permeance.
    """
    vectors, inverse, values = _dilation(modes)
    scale = np.exp(stretch[:, None] * values)  # (n, modes + 1)
    whole = np.real(np.einsum("ij,nj,jk->nik", vectors, scale, inverse))
    back = np.linalg.inv(whole[:, 1:, 1:])
    driven = whole[:, 1:, 0]
    returned = np.einsum("nij,nj->ni", back, driven)
    raised = share + np.einsum("nij,nj->ni", compliance, returned)
    compliance = np.swapaxes(back, 1, 2) @ compliance @ back
    inside = np.einsum("nji,nj->ni", back, raised)
    gain = np.sum(share * returned + inside * driven, axis=1)
    return compliance, inside, gain, back, returned


@lru_cache(maxsize=8)
def _dilation(
    modes: int,
) -> tuple[NDArray[np.complex128], NDArray[np.complex128], NDArray[np.complex128]]:
    """Generator of width changes on (f_0, f_1, ..), diagonalised: vectors, inverse, values.

    df/d(ln width) = P^T g^-1 f with P_kj = - integral psi_k xi psi_j' dxi over -1..1 and g the
    norms (2 for k = 0, else 1).
    """
    order = np.arange(modes + 1)
    wave = 0.5 * np.pi * order
    even = order % 2 == 0

    def integrand(xi: float) -> FloatArray:
        psi = np.where(even, np.cos(wave * xi), np.sin(wave * xi))
        slope = wave * np.where(even, -np.sin(wave * xi), np.cos(wave * xi))
        return np.asarray(-np.outer(psi, xi * slope))

    coupling, _ = quad_vec(integrand, -1.0, 1.0, epsabs=1e-13)
    norms = np.where(order == 0, 2.0, 1.0)
    generator = coupling.T / norms
    values, vectors = np.linalg.eig(generator)
    inverse = np.linalg.inv(vectors)
    check = np.real((vectors * np.exp(0.3 * values)) @ inverse)
    if not np.allclose(check, expm(0.3 * generator), rtol=1e-8, atol=1e-8):
        msg = f"the width change of {modes} modes could not be diagonalised"
        raise ArithmeticError(msg)
    return vectors, inverse, values
