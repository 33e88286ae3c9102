"""A slot solved by finite elements of an outside library, for the tests of its mouth.

In the plane (ln r, angle) Laplace's equation keeps its form, so the slot is a channel whose
half-width is half the slot angle. Second-order triangles of scikit-fem.
"""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray
from scipy.sparse.linalg import splu
from skfem import (
    Basis,
    BilinearForm,
    ElementTriP2,
    FacetBasis,
    LinearForm,
    MeshQuad,
)
from skfem.helpers import dot, grad

from evaluators.machine.geometry.cross_sections import CrossSections

FloatArray = NDArray[np.float64]


def shape(mode: int, xi: FloatArray) -> FloatArray:
    wave = 0.5 * np.pi * mode * xi
    return np.cos(wave) if mode % 2 == 0 else np.sin(wave)


def solve_slot(
    sections: CrossSections, modes: int, along: int = 30, across: int = 24
) -> tuple[FloatArray, FloatArray, float]:
    """Compliance (K, K), current share (K,) and leakage permeance of the first design's slot.

    Iron walls and bottom (natural condition), current spread evenly over the wound part.
    """
    radii = [
        float(part[0])
        for part in (
            sections.bore_radius,
            sections.tip_radius,
            sections.wedge_radius,
            sections.slot_radius,
        )
    ]
    ends = np.log(radii)
    pieces = [
        low + (high - low) * 0.5 * (1.0 - np.cos(np.pi * np.arange(along + 1) / along))
        for low, high in pairwise(ends)
    ]
    depth = np.unique(np.concatenate(pieces))
    mesh = MeshQuad.init_tensor(depth, -np.cos(np.pi * np.arange(across + 1) / across))
    points = mesh.p.copy()
    points[1] *= 0.5 * sections.slot_angle(np.exp(points[0])[None])[0]
    mesh = MeshQuad(points, mesh.t).to_meshtri()
    mouth_half = 0.5 * float(sections.slot_opening_angle[0])

    element = ElementTriP2()
    basis = Basis(mesh, element)
    stiffness = BilinearForm(lambda u, v, _: dot(grad(u), grad(v))).assemble(basis)
    wound = np.flatnonzero(mesh.p[0][mesh.t].mean(axis=0) > ends[2])
    body = Basis(mesh, element, elements=wound, intorder=6)
    current = LinearForm(lambda v, w: np.exp(2.0 * w.x[0]) * v).assemble(body)  # area r dr dtheta
    current = current / current.sum()
    facets = mesh.facets_satisfying(lambda x: np.abs(x[0] - ends[0]) < 1e-12)
    edge = FacetBasis(mesh, element, facets=facets, intorder=8)
    amplitude = [
        LinearForm(lambda v, w, k=k: shape(k, w.x[1] / mouth_half) * v).assemble(edge) / mouth_half
        for k in range(modes + 1)
    ]
    mean = 0.5 * amplitude[0]

    # Potentials are counted from their mean over the mouth.
    bordered = sparse.bmat([[stiffness, mean[:, None]], [mean[None, :], None]], format="csc")
    factor = splu(bordered)

    def potential(load: FloatArray) -> FloatArray:
        return factor.solve(np.append(load, 0.0))[:-1]

    by_current = potential(current - mean)  # mu0 I = 1 leaves through a uniform mouth
    share = np.array([amplitude[k] @ by_current for k in range(1, modes + 1)])
    compliance = np.empty((modes, modes))
    for k in range(1, modes + 1):
        by_mode = potential(-amplitude[k])
        compliance[:, k - 1] = [-(amplitude[j] @ by_mode) for j in range(1, modes + 1)]
    return compliance, share, float(current @ by_current)
