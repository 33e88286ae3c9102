"""The field of LANES designs at all rotor positions: torque field, suspension, displacement."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol, TypeVar

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.mesh import geometry as mesh
from evaluators.finite_element.mesh.symmetry import Sector
from evaluators.finite_element.model import FieldModel
from evaluators.finite_element.rotor import uniform as rotor
from evaluators.finite_element.solution import newton
from evaluators.finite_element.solution.factor import Pattern
from evaluators.finite_element.solution.gap import GapCoupling
from evaluators.finite_element.solution.lanes import LANES
from evaluators.finite_element.solution.system import System, Topology, slot_load
from evaluators.machine.geometry.cross_sections import CrossSections

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]
Field = TypeVar("Field", FloatArray, ComplexArray)


class SolverFactory(Protocol):
    """Makes the linear solver of a pattern."""

    def __call__(self, pattern: Pattern) -> newton.LinearSolver:
        """Solver for all matrices of `pattern`."""
        ...


@dataclass(frozen=True)
class Waves:
    """Field on the bore at some rotor positions, two-sided Fourier coefficients.

    Attributes
    ----------
    angles : array (t,)
        Rotor positions, rad.
    orders : array (m,)
        Positive orders.
    potential, tangential : arrays (t, m, LANES)
        Coefficients of A and of h = -r H_phi on the gap side of the bore.
    """

    angles: FloatArray
    orders: IntArray
    potential: ComplexArray
    tangential: ComplexArray


@dataclass(frozen=True)
class Induced:
    """Effect of currents induced in the rotor on a field with the magnets.

    Attributes
    ----------
    orders : array (m,)
        Positive orders.
    tangential : array (t, m, LANES)
        What the currents add to the coefficients of h on the bore, A.
    start : array (t, size, LANES)
        Potential to start from at every position.
    """

    orders: IntArray
    tangential: ComplexArray
    start: FloatArray


@dataclass(frozen=True)
class Solution:
    """Torque field at some rotor positions.

    Attributes
    ----------
    nodes : array (t, size, LANES)
        Potential, Wb/m.
    linkage : array (t, slots, LANES)
        Potential averaged over the wound part of each slot of the sector, Wb/m.
    waves : Waves
        Orders of the sector's class.
    converged : array (LANES,)
    """

    nodes: FloatArray
    linkage: FloatArray
    waves: Waves
    converged: BoolArray


@dataclass(frozen=True)
class Equations:
    """Equations of a sector and the solver of their tangent."""

    system: System
    solver: newton.LinearSolver

    @property
    def topology(self) -> Topology:
        """Index arrays of the sector."""
        return self.system.topology


class BatchField:
    """Field of one batch of LANES cross-sections of a model's family.

    Parameters
    ----------
    model : FieldModel
    sections : CrossSections
        LANES designs.
    make_solver : SolverFactory
        Batched LDL^T by default; `reference.SciPySolver` is the slow path held against it.
    """

    def __init__(
        self,
        model: FieldModel,
        sections: CrossSections,
        make_solver: SolverFactory = newton.BatchSolver,
    ) -> None:
        self.model, self.sections, self.make_solver = model, sections, make_solver
        self.mesh = mesh.build(sections, model.resolution)
        self.gap = GapCoupling(self.mesh.angle[0], model.slots, model.orders)
        rings = model.discretisation.iron_rings
        share = np.arange(1, rings + 1)[:, None] / rings
        shaft, core = sections.shaft_radius, sections.core_radius
        self.rotor = rotor.Rotor(
            iron_radius=np.concatenate([shaft * share, shaft + (core - shaft) * share]),
            magnet_radius=sections.magnet_radius,
            sleeve_radius=sections.rotor_radius,
            bore_radius=sections.bore_radius,
            magnet_permeability=model.recoil,
            sleeve_permeability=float(model.task.materials.sleeve.relative_permeability.value),
        )
        self.remanence = tuple(
            model.remanence * item
            for item in rotor.magnetisation(
                sections.magnet_arc_ratio,
                model.pole_pairs,
                model.magnet_orders,
                model.task.construction.magnetisation,
            )
        )
        self.torque = Equations(
            System(model.torque, self.mesh, model.stator_curve), make_solver(model.torque.pattern)
        )
        self.load = slot_load(self.mesh, model.torque.lattice)
        self.response = np.zeros((model.orders + 1, LANES))
        self.source = np.zeros((model.magnet_orders.size, LANES), dtype=np.complex128)
        small, _ = model.rotor_curve.reluctivity(1.0)
        self.set_rotor_iron(np.full((2 * rings, LANES), float(small)))

    # -- sources ------------------------------------------------------------------------------

    def set_rotor_iron(self, reluctivity: FloatArray) -> None:
        """Take over the reluctivity of the iron rings, (k, LANES) m/H."""
        self.reluctivity = reluctivity
        y, radial, tangential = self.rotor.at_bore(np.arange(1, self.model.orders + 1), reluctivity)
        self.response[1:] = y
        row = self.model.magnet_orders - 1
        self.source = np.asarray(
            -1j * (radial[row] * self.remanence[0] + tangential[row] * self.remanence[1])
        )
        self.gap.set_response(self.response)
        self.torque.system.set_gap(self.gap.stiffness(self.model.symmetry.torque))

    def equations(self, topology: Topology) -> Equations:
        """Equations and solver of another sector than that of the torque field."""
        system = System(topology, self.mesh, self.model.stator_curve)
        system.set_gap(self.gap.stiffness(topology.lattice.sector))
        return Equations(system, self.make_solver(topology.pattern))

    def magnet_load(self, angles: FloatArray, slots: int) -> FloatArray:
        """Right-hand side of the magnets at rotor `angles` (t,), (t, slots, 2 C, LANES)."""
        model = self.model
        relative = angles[:, None] - model.pitch * np.arange(slots)
        load = self.gap.source_load(self.source, model.magnet_orders, relative.ravel())
        return load.reshape(angles.size, slots, *load.shape[1:])

    def torque_currents(
        self, angles: FloatArray, ampere_turns: FloatArray, slots: int
    ) -> FloatArray:
        """Currents of the first `slots` slots, in phase with the EMF, (t, slots, LANES), A."""
        model = self.model
        phasor = np.exp(1j * (model.pole_pairs * angles + model.symmetry.torque_phase))
        slot = model.task.winding.torque_slot_mmf[:slots]
        return np.real(np.outer(phasor, slot))[:, :, None] * ampere_turns

    def add_currents(self, load: FloatArray, topology: Topology, currents: FloatArray) -> None:
        """Add slot currents (slots, LANES) to a right-hand side (size, LANES)."""
        for nodes, current in zip(topology.slot_nodes, currents, strict=True):
            np.add.at(load, nodes, self.load * current)

    # -- torque field -------------------------------------------------------------------------

    def solve_torque(
        self, angles: FloatArray, ampere_turns: FloatArray, start: FloatArray | None = None
    ) -> Solution:
        """Torque field at rotor `angles` (t,), each started from those before.

        `ampere_turns` (LANES,) are the peak ampere-turns of a coil, zero for no load.
        """
        currents = self.torque_currents(angles, ampere_turns, self.torque.topology.lattice.slots)
        return self.solve(self.torque, angles, currents, start)

    def solve(
        self,
        equations: Equations,
        angles: FloatArray,
        currents: FloatArray,
        start: FloatArray | None = None,
        induced: Induced | None = None,
    ) -> Solution:
        """Field of magnets and slot `currents` (t, slots, LANES) at rotor `angles` (t,).

        `induced` adds currents in the rotor and brings a start for every position.
        """
        topology = equations.topology
        magnets = self.magnet_load(angles, topology.lattice.slots)
        nodes = np.empty((angles.size, topology.size, LANES))
        converged = np.ones(LANES, dtype=np.bool_)
        for t in range(angles.size):
            load = np.zeros((topology.size, LANES))
            load[topology.lattice.bore] = magnets[t]
            self.add_currents(load, topology, currents[t])
            if induced is not None:
                load[topology.lattice.bore] += self.gap.source_load(
                    induced.tangential[t],
                    induced.orders,
                    -self.model.pitch * np.arange(topology.lattice.slots, dtype=np.float64),
                )
                guess = induced.start[t]
            elif t == 0:
                guess = np.zeros_like(load) if start is None else start
            elif t == 1:
                guess = nodes[0]
            else:
                guess = 2.0 * nodes[t - 1] - nodes[t - 2]
            nodes[t], state = newton.solve(
                equations.system,
                equations.solver,
                guess,
                load,
                self.model.discretisation.newton,
            )
            converged &= state.converged
        waves = self.waves(topology, angles, nodes)
        if induced is not None:
            place = np.searchsorted(waves.orders, induced.orders)
            waves.tangential[:, place] += induced.tangential
        return Solution(nodes, self.slot_means(topology, nodes), waves, converged)

    def settle_rotor_iron(
        self, angle: float, ampere_turns: FloatArray, rounds: int = 3
    ) -> FloatArray:
        """Find the reluctivity of the rotor's iron at the duty; returns the field, (size, LANES).

        The field of the lowest magnet orders stands still in the rotor; slotting is left out. The
        suspension field meets the same reluctivity: that of the tangent, H(B) linearised in every
        ring and averaged over directions, changes the force by less than 2e-3 (32 designs of four
        families). Of eight random machines of each of three families the one whose torque depends
        most on the core, against a core saturated point by point on an independent mesh (NGSolve):
        torque within 1e-3, force within 3.4e-3 and 0.3 degrees; more rings change nothing.
        """
        model = self.model
        orders = model.magnet_orders[:3]
        start: FloatArray | None = None
        for _ in range(rounds):
            solution = self.solve_torque(np.array([angle]), ampere_turns, start)
            start = solution.nodes[0]
            inside = self.rotor_field(orders, solution.waves)
            square = rotor.mean_square_density(inside, self.rotor, orders, self.reluctivity)
            half = model.discretisation.iron_rings
            self.set_rotor_iron(
                np.concatenate(
                    [
                        model.shaft_curve.reluctivity(square[:half])[0],
                        model.rotor_curve.reluctivity(square[half:])[0],
                    ]
                )
            )
        if start is None:
            msg = "rounds must be at least 1"
            raise ValueError(msg)
        return start

    def slot_means(self, topology: Topology, nodes: Field) -> Field:
        """Mean potential over the wound part of each slot, (..., slots, LANES)."""
        local: Field = nodes[..., topology.slot_nodes, :]
        result: Field = np.einsum("...scal,cal->...sl", local, self.load)
        return result

    # -- waves --------------------------------------------------------------------------------

    def waves(self, topology: Topology, angles: FloatArray, nodes: FloatArray) -> Waves:
        """Fourier coefficients on the bore of a field with the magnets."""
        model = self.model
        sector = topology.lattice.sector
        orders = self.gap.class_orders(sector)
        orders = orders[orders <= self.highest_wave]
        bore = nodes[:, topology.lattice.bore]
        potential = self.gap.coefficients(bore, sector, orders)
        tangential = self.response[orders] * potential
        magnet = np.searchsorted(orders, model.magnet_orders[model.magnet_orders <= orders[-1]])
        turned = np.exp(-1j * np.outer(angles, orders[magnet]))
        tangential[:, magnet] += turned[:, :, None] * self.source[: magnet.size]
        return Waves(angles, orders, potential, tangential)

    @property
    def highest_wave(self) -> int:
        """Highest order evaluated for torque and force; beyond, the rotor hardly answers."""
        return min(self.model.orders, 12 * self.model.slots)

    def rotor_field(self, orders: IntArray, waves: Waves) -> rotor.Inside:
        """Field in the rotor of some magnet orders, averaged over the positions."""
        place = np.searchsorted(waves.orders, orders)
        turned = np.exp(1j * np.outer(waves.angles, orders))[:, :, None]
        mean = (waves.potential[:, place] * turned).mean(axis=0)
        magnet = np.searchsorted(self.model.magnet_orders, orders)
        return self.rotor.inside(
            orders,
            self.reluctivity,
            self.remanence[0][magnet],
            self.remanence[1][magnet],
            mean,
        )

    # -- small fields on top ------------------------------------------------------------------

    def perturb(
        self,
        equations: Equations,
        nodes: FloatArray,
        loads: list[tuple[FloatArray, FloatArray]],
    ) -> ComplexArray:
        """Solve with the tangent of a torque field for complex loads, (t, size, LANES).

        `nodes` (t, ...) is the torque field; `loads` gives real and imaginary part per position,
        each (size, LANES).
        """
        result = np.empty((len(nodes), equations.topology.size, LANES), dtype=np.complex128)
        for t, (real, imag) in enumerate(loads):
            self.factorise_at(equations, nodes[t])
            result[t] = equations.solver.solve(real) + 1j * equations.solver.solve(imag)
        return result

    def factorise_at(self, equations: Equations, nodes: FloatArray) -> None:
        """Factorise the tangent of another sector at a torque field (size, LANES)."""
        source, factor = self.model.unfold(equations.topology)
        small, large = self.torque.topology.lattice, equations.topology.lattice
        past = float(small.sector.sign) ** (large.slots // small.slots)
        field = nodes[source] * factor[:, None]
        equations.solver.factorise(equations.system.tangent_at(field, past))

    def coefficients_both_sides(
        self, nodes: ComplexArray, sector: Sector, lattice_bore: IntArray, orders: IntArray
    ) -> tuple[ComplexArray, ComplexArray]:
        """Coefficients of positive and of negative `orders` of a complex field on the bore."""
        bore = nodes[:, lattice_bore]
        real = self.gap.coefficients(bore.real, sector, orders)
        imag = self.gap.coefficients(bore.imag, sector, orders)
        return real + 1j * imag, np.conj(real) + 1j * np.conj(imag)
