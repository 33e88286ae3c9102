"""The static analysis of a batch: all fields without induced currents, and what follows."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element import losses, newton, stress
from evaluators.finite_element.batch import BatchField, Equations, Solution, SolverFactory
from evaluators.finite_element.densities import Densities, densities
from evaluators.finite_element.displacement import stiffness
from evaluators.finite_element.lanes import LANES
from evaluators.finite_element.model import FieldModel
from evaluators.finite_element.quantities import (
    Force,
    fundamental_linkage,
    interpolate,
    loaded_inductance,
    suspension_force,
    suspension_inductance,
    suspension_loads,
)
from evaluators.machine.field import Excitation, FieldSolution
from evaluators.machine.geometry import CrossSections

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
BoolArray = NDArray[np.bool_]


@dataclass(frozen=True)
class StaticFields:
    """Solved fields of a batch.

    Attributes
    ----------
    batch : BatchField
    loaded, unloaded : Solution
        With torque current over 60 electrical degrees; without over one cogging period.
    small : array (t, size, LANES), complex
        Suspension field of one ampere-turn at the positions of `loaded`.
    stiffness : array (LANES,)
        N/m per m.
    """

    batch: BatchField
    loaded: Solution
    unloaded: Solution
    small: ComplexArray
    stiffness: FloatArray

    @property
    def converged(self) -> BoolArray:
        """Lanes whose every position converged."""
        return self.loaded.converged & self.unloaded.converged


def solve(
    model: FieldModel,
    sections: CrossSections,
    exciting: Excitation,
    make_solver: SolverFactory = newton.BatchSolver,
) -> StaticFields:
    """Solve all static fields of LANES designs."""
    batch = BatchField(model, sections, make_solver)
    start = batch.settle_rotor_iron(float(model.angles[0]), exciting.torque)
    loaded = batch.solve_torque(model.angles, exciting.torque, start)
    unloaded = batch.solve_torque(model.cogging_angles, np.zeros(LANES), loaded.nodes[0])
    suspension = batch.equations(model.suspension)
    small = suspension_field(batch, suspension, loaded)
    some = [0, model.cogging_angles.size // 2]
    pull = stiffness(batch, unloaded, some, suspension).mean(axis=0)
    return StaticFields(batch, loaded, unloaded, small, pull)


def suspension_field(batch: BatchField, equations: Equations, solution: Solution) -> ComplexArray:
    """Field of one ampere-turn of suspension on top of a torque field, (t, size, LANES)."""
    return batch.perturb(equations, solution.nodes, [suspension_loads(batch)] * len(solution.nodes))


@dataclass(frozen=True)
class StaticResult:
    """What comes out of a batch: the quantities (LANES,) and the waveforms behind them.

    Torque and cogging waveforms are (fine positions, LANES) over 60 electrical degrees and over one
    cogging period.
    """

    field: FieldSolution
    torque: FloatArray
    cogging: FloatArray
    force: Force
    densities: Densities
    iron: losses.IronLoss


def evaluate(fields: StaticFields, exciting: Excitation) -> StaticResult:
    """All quantities of the solved fields."""
    batch, loaded = fields.batch, fields.loaded
    model = batch.model
    torque = interpolate(_torque(loaded)).real
    cogging = interpolate(_torque(fields.unloaded)).real
    mean_torque = torque.mean(axis=0)
    force, forward = suspension_force(batch, loaded, fields.small)
    commanded = [
        force.at(exciting.suspension * force.command(direction, forward))
        for direction in (0.0, 0.5 * np.pi)
    ]
    means = [item.mean(axis=0) for item in commanded]
    error = [
        np.abs(np.abs(item) - np.abs(mean)).max(axis=0) / np.abs(mean)
        for item, mean in zip(commanded, means, strict=True)
    ]
    angle = [
        np.abs(np.angle(item * np.conj(mean))).max(axis=0)
        for item, mean in zip(commanded, means, strict=True)
    ]
    main = force.direct if forward else force.mirrored
    seen = densities(fields.batch, loaded, fields.unloaded, fields.small, exciting.suspension)
    iron = losses.iron_loss(batch, loaded)
    share = losses.suspension_share(batch, loaded, fields.small, exciting.suspension)
    length = model.task.duty.shaft_torque / np.abs(mean_torque)
    orders = batch.gap.class_orders(model.symmetry.suspension)
    orders = orders[orders <= 4 * model.slots]
    plus, minus = batch.coefficients_both_sides(
        fields.small.mean(axis=0, keepdims=True),
        model.symmetry.suspension,
        model.suspension.lattice.bore,
        orders,
    )
    eddy = losses.rotor_loss(
        batch, loaded, (orders, plus[0], minus[0]), exciting.suspension, length
    )
    field = FieldSolution(
        torque=mean_torque,
        torque_ripple=np.ptp(torque, axis=0) / np.abs(mean_torque),
        cogging=np.ptp(cogging, axis=0),
        force=np.mean(np.abs(means), axis=0),
        force_error_magnitude=np.max(error, axis=0),
        force_error_angle=np.max(angle, axis=0),
        force_per_ampere_turn=np.abs(main.mean(axis=0)),
        displacement_stiffness=fields.stiffness,
        flux_linkage=np.abs(fundamental_linkage(batch, fields.unloaded)),
        torque_inductance=loaded_inductance(batch, loaded, exciting.torque),
        suspension_inductance=suspension_inductance(batch, fields.small),
        gap_flux_density=seen.gap,
        tooth_flux_density=seen.tooth,
        yoke_flux_density=seen.yoke,
        core_flux_density=seen.core,
        magnet_flux_density=seen.magnet,
        loss_teeth=np.sum(iron.teeth, axis=0) * (1.0 + share[0]),
        loss_yoke=np.sum(iron.yoke, axis=0) * (1.0 + share[1]),
        loss_magnet=eddy.magnet.sum(axis=1),
        loss_sleeve=eddy.sleeve.sum(axis=1),
    )
    return StaticResult(field, torque, cogging, force, seen, iron)


def _torque(solution: Solution) -> ComplexArray:
    waves = solution.waves
    torque = stress.torque(waves.orders, waves.potential, waves.tangential)
    return torque.astype(np.complex128)
