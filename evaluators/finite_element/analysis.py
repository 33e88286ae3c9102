"""The analysis of a batch: all static fields, induced currents on request, and what follows."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element import transient
from evaluators.finite_element.model import FieldModel
from evaluators.finite_element.outcome import losses, stress
from evaluators.finite_element.outcome.densities import densities
from evaluators.finite_element.outcome.displacement import stiffness
from evaluators.finite_element.outcome.quantities import (
    Force,
    fundamental_linkage,
    interpolate,
    loaded_inductance,
    suspension_force,
    suspension_inductance,
    suspension_loads,
)
from evaluators.finite_element.rotor.answer import eddy_rotor
from evaluators.finite_element.rotor.separate_magnets import SeparateMagnets
from evaluators.finite_element.solution import newton
from evaluators.finite_element.solution.batch import BatchField, Equations, Solution, SolverFactory
from evaluators.finite_element.solution.lanes import LANES
from evaluators.machine.field import Excitation, FieldSolution
from evaluators.machine.geometry.cross_sections import CrossSections

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
BoolArray = NDArray[np.bool_]

UNSETTLED = 0.02
"""Disagreement of rotor and stator from which a design with induced currents counts as failed."""


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
    added : pair of arrays (t, m, LANES), optional
        What separate magnets add to h of the suspension field, see `separate_magnets`.
    separate : SeparateMagnets, optional
    """

    batch: BatchField
    loaded: Solution
    unloaded: Solution
    small: ComplexArray
    stiffness: FloatArray
    added: tuple[ComplexArray, ComplexArray] | None = None
    separate: SeparateMagnets | None = None

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
    """Solve all static fields of LANES designs.

    The stiffness is that of the uniform rotor in any case.
    """
    batch = BatchField(model, sections, make_solver)
    start = batch.settle_rotor_iron(float(model.angles[0]), exciting.torque)
    loaded = batch.solve_torque(model.angles, exciting.torque, start)
    unloaded = batch.solve_torque(model.cogging_angles, np.zeros(LANES), loaded.nodes[0])
    suspension = batch.equations(model.suspension)
    some = [0, model.cogging_angles.size // 2]
    pull = stiffness(batch, unloaded, some, suspension).mean(axis=0)
    if not model.discretisation.separate_magnets:
        small = suspension_field(batch, suspension, loaded)
        return StaticFields(batch, loaded, unloaded, small, pull)
    magnets = SeparateMagnets(batch)
    loaded = magnets.torque_field(batch, loaded, exciting.torque)
    unloaded = magnets.torque_field(batch, unloaded, np.zeros(LANES))
    small, added = magnets.suspension_field(batch, suspension, loaded)
    return StaticFields(batch, loaded, unloaded, small, pull, added, magnets)


def suspension_field(batch: BatchField, equations: Equations, solution: Solution) -> ComplexArray:
    """Field of one ampere-turn of suspension on top of a torque field, (t, size, LANES)."""
    return batch.perturb(equations, solution.nodes, [suspension_loads(batch)] * len(solution.nodes))


@dataclass(frozen=True)
class Induced:
    """What the rotor's induced currents add to the static fields.

    Attributes
    ----------
    loaded, small
        In place of those of `StaticFields`.
    added : pair of arrays, see `transient.InducedSuspension`
    magnet, sleeve : arrays (LANES,)
        Loss, W/m; that of the shaft counts with the sleeve's.
    unsettled : array (LANES,)
        How far rotor and stator still disagreed at the end, see `transient.InducedTorque`.
    """

    loaded: Solution
    small: ComplexArray
    added: tuple[ComplexArray, ComplexArray]
    magnet: FloatArray
    sleeve: FloatArray
    unsettled: FloatArray


def induce(fields: StaticFields, exciting: Excitation) -> Induced:
    """Add the rotor's induced currents to static fields."""
    batch = fields.batch
    rotor = eddy_rotor(batch, _torque(fields.loaded).real.mean(axis=0))
    main = transient.torque_field(batch, rotor, fields.loaded, exciting.torque, fields.separate)
    equations = batch.equations(batch.model.suspension)
    control = transient.suspension_field(
        batch, equations, rotor, main.solution, fields.separate, fields.added
    )
    loss = control.loss(exciting.suspension)
    return Induced(
        main.solution,
        control.small,
        control.added,
        main.loss.magnet + loss.magnet,
        main.loss.sleeve + main.loss.shaft + loss.sleeve + loss.shaft,
        np.maximum(main.unsettled, control.unsettled),
    )


@dataclass(frozen=True)
class Result:
    """What comes out of a batch: the quantities (LANES,) and the waveforms behind them.

    Attributes
    ----------
    field : FieldSolution
    torque, cogging : arrays (fine positions, LANES)
        Over 60 electrical degrees and over one cogging period, N m/m.
    force : Force
    iron : losses.IronLoss
    converged : array (LANES,)
    unsettled : array (LANES,)
        See `Induced`; zero in the static analysis.
    """

    field: FieldSolution
    torque: FloatArray
    cogging: FloatArray
    force: Force
    iron: losses.IronLoss
    converged: BoolArray
    unsettled: FloatArray


def evaluate(fields: StaticFields, exciting: Excitation) -> Result:
    """All quantities of the solved fields, with induced currents if the model has them."""
    batch, loaded, small = fields.batch, fields.loaded, fields.small
    model = batch.model
    force, forward = suspension_force(batch, loaded, small, fields.added)
    bias: FloatArray | None = None
    induced = induce(fields, exciting) if model.discretisation.transient else None
    if induced is not None:
        still = _main(force, forward)
        loaded, small = induced.loaded, induced.small
        force, _ = suspension_force(batch, loaded, small, induced.added)
        # The same phasor, or its conjugate, makes both forces.
        bias = np.angle(_main(force, forward) * np.conj(still))
    torque = interpolate(_torque(loaded)).real
    cogging = interpolate(_torque(fields.unloaded)).real
    mean_torque = torque.mean(axis=0)
    commanded = np.array(
        [
            force.at(exciting.suspension * force.command(direction, forward))
            for direction in (0.0, 0.5 * np.pi)
        ]
    )
    means = commanded.mean(axis=1, keepdims=True)
    error = np.abs(np.abs(commanded) - np.abs(means)) / np.abs(means)
    angle = np.abs(np.angle(commanded * np.conj(means)))
    seen = densities(batch, loaded, fields.unloaded, small, exciting.suspension)
    iron = losses.iron_loss(batch, loaded)
    share = losses.suspension_share(batch, loaded, small, exciting.suspension)
    teeth = np.array(iron.teeth) * (1.0 + share[0])
    yoke = np.array(iron.yoke) * (1.0 + share[1])
    hysteresis, eddy, excess = teeth + yoke
    if induced is None:
        loss = losses.rotor_loss(
            batch, mean_torque, loaded, small, exciting.suspension, fields.separate
        )
        magnet, sleeve = loss.magnet, loss.sleeve + loss.shaft
    else:
        magnet, sleeve = induced.magnet, induced.sleeve
    field = FieldSolution(
        torque=mean_torque,
        torque_ripple=np.ptp(torque, axis=0) / np.abs(mean_torque),
        cogging=np.ptp(cogging, axis=0),
        force=np.abs(means).mean(axis=(0, 1)),
        force_error_magnitude=error.max(axis=(0, 1)),
        force_error_angle=angle.max(axis=(0, 1)),
        force_per_ampere_turn=np.abs(_main(force, forward)),
        displacement_stiffness=fields.stiffness,
        flux_linkage=np.abs(fundamental_linkage(batch, fields.unloaded)),
        torque_inductance=loaded_inductance(batch, loaded, exciting.torque),
        suspension_inductance=suspension_inductance(batch, small),
        gap_flux_density=seen.gap,
        tooth_flux_density=seen.tooth,
        yoke_flux_density=seen.yoke,
        core_flux_density=seen.core,
        magnet_flux_density=seen.magnet,
        loss_teeth=teeth.sum(axis=0),
        loss_yoke=yoke.sum(axis=0),
        loss_magnet=magnet,
        loss_sleeve=sleeve,
        loss_iron_hysteresis=hysteresis,
        loss_iron_eddy=eddy,
        loss_iron_excess=excess,
        force_angle_bias=bias,
    )
    converged, unsettled = fields.converged, np.zeros(LANES)
    if induced is not None:
        unsettled = induced.unsettled
        converged = converged & loaded.converged & (unsettled <= UNSETTLED)
    return Result(field, torque, cogging, force, iron, converged, unsettled)


def _main(force: Force, forward: bool) -> ComplexArray:
    """Mean force per ampere-turn, by whichever of phasor and conjugate makes it, (LANES,)."""
    return np.asarray((force.direct if forward else force.mirrored).mean(axis=0))


def _torque(solution: Solution) -> ComplexArray:
    waves = solution.waves
    torque = stress.torque(waves.orders, waves.potential, waves.tangential)
    return torque.astype(np.complex128)
