"""A ring of nonlinear iron round a wire: H = I/(2 pi r) whatever the iron, B from its table."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.finite_element.mesh import geometry as mesh
from evaluators.finite_element.mesh.lattice import Lattice, Resolution
from evaluators.finite_element.mesh.symmetry import Sector
from evaluators.finite_element.solution import newton
from evaluators.finite_element.solution.lanes import LANES
from evaluators.finite_element.solution.system import CurveTable, System, Topology
from evaluators.machine.materials.magnetization import MagnetizationCurve

check = OutsideChecks("field")

# B-H table of TEAM workshop problem 13 (Nakata, Takahashi, Fujiwara), T and A/m.
FLUX_DENSITY = [
    0.0, 0.0025, 0.005, 0.0125, 0.025, 0.05, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1.0, 1.1,
    1.2, 1.3, 1.4, 1.5, 1.55, 1.6, 1.65, 1.7, 1.75, 1.8,
]  # fmt: skip
FIELD = [
    0.0, 16.0, 30.0, 54.0, 93.0, 143.0, 191.0, 210.0, 222.0, 233.0, 247.0, 258.0, 272.0, 289.0,
    313.0, 342.0, 377.0, 433.0, 509.0, 648.0, 933.0, 1228.0, 1934.0, 2913.0, 4993.0, 7189.0, 9423.0,
]  # fmt: skip

# Ring from 10 to 20 mm, current in the wire in A: flux in Wb/m, integral of the linearly
# interpolated table over the radius (closed form).
FLUX = {20.0: 0.003387282, 50.0: 0.01307828, 200.0: 0.01612306}


def straight_pieces() -> MagnetizationCurve:
    """The table interpolated linearly: a monotone cubic through many points on its lines."""
    share = np.arange(8) / 8.0
    b, h = np.array(FLUX_DENSITY), np.array(FIELD)
    fine = [np.append((x[:-1, None] + np.diff(x)[:, None] * share).ravel(), x[-1]) for x in (h, b)]
    return MagnetizationCurve(fine[0], fine[1])


@pytest.mark.parametrize("current", FLUX)
def test_ring_round_a_wire(current: float) -> None:
    resolution = Resolution(tooth=2, slot=2, tip=2, wedge=2, body=4, yoke=4)
    sector = Sector(1, 6, 1)
    lattice = Lattice(resolution, sector)
    topology = Topology(lattice, iron=np.ones_like(lattice.iron))
    ones = np.ones(LANES)
    half_tooth = np.radians(15.0)
    sections = SimpleNamespace(
        bore_radius=10e-3 * ones,
        tip_radius=11e-3 * ones,
        wedge_radius=12.5e-3 * ones,
        slot_radius=16e-3 * ones,
        outer_radius=20e-3 * ones,
        family=SimpleNamespace(slots=6),
        tooth_half_width=lambda radius: radius * np.sin(half_tooth),
    )
    grid = mesh.build(sections, resolution)
    system = System(topology, grid, CurveTable.of(straight_pieces()))
    # The current goes through the hole: r H_phi = I/(2 pi) on the ring's inner face.
    width = np.diff(grid.angle[0][::2], axis=0)
    load = np.zeros((topology.size, LANES))
    bore = lattice.bore[0]
    simpson = np.zeros((bore.size, LANES))
    simpson[0::2] += width / 6.0
    simpson[1::2] += 4.0 * width / 6.0
    simpson[2::2] += width[:-1] / 6.0
    simpson[0] += width[-1] / 6.0
    load[bore] = current / (2.0 * np.pi) * simpson
    solver = newton.BatchSolver(topology.pattern)
    potential, state = newton.solve(
        system, solver, np.zeros_like(load), load, newton.Settings(tolerance=1e-8)
    )
    assert np.all(state.converged)
    check(
        "flux in a ring of nonlinear iron round a wire",
        potential[bore],
        FLUX[current],
        relative=1e-3,
        why="the cubic cuts the corners of the table: measured 3e-4 at the smallest current",
        source="H = I/(2 pi r); integral of the table of TEAM problem 13 (Nakata, Takahashi, "
        "Fujiwara), closed form",
    )
