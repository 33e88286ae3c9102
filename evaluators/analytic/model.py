"""The analytic field of a batch of designs at the duty, from sources to a `FieldSolution`."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic import losses, rotor_state, stress
from evaluators.analytic.gap import GapField, Iron, SlottedGap
from evaluators.analytic.linkage import Linkage
from evaluators.analytic.rotation import Rotation
from evaluators.analytic.rotor import MagnetSource, RotorRadii, magnetisation, source
from evaluators.analytic.rotor_state import at_order
from evaluators.analytic.saturation import (
    Paths,
    SaturatedIron,
    Steels,
    core_peak,
    fundamental_at_core,
    saturate,
)
from evaluators.analytic.slots import SlotMouth, mouth
from evaluators.machine.field import Excitation, FieldSolution
from evaluators.machine.geometry import CrossSections
from evaluators.machine.task import Task

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]


MAGNETIC_FROM = 0.1  # T at 1 kA/m: any ferritic steel is far above, any austenitic one far below


@dataclass(frozen=True)
class Resolution:
    """How finely the analytic model works.

    Attributes
    ----------
    slot_modes : int
        Modes of the slot mouth beside the uniform one.
    reach : int
        Orders of the gap run to `reach` times the slots, at least beyond the pole pairs.
    highest_order : int
        Of the orders that torque and force are summed to.
    positions : int
        Rotor positions per 60 electrical degrees, at least.
    """

    slot_modes: int = 5
    reach: int = 16
    highest_order: int = 96
    positions: int = 24


@dataclass(frozen=True)
class Waves:
    """Gap fields of n designs (magnets, torque current, suspension current) and their slots.

    The suspension field is that of phasor one, per ampere-turn, and made with the small-signal
    iron; torque and magnet fields hold at the duty.
    """

    magnets: GapField
    current: GapField
    suspension: GapField
    slot: SlotMouth


@dataclass(frozen=True)
class Motion:
    """Torque and force over one sector of the turn, (n, positions).

    `direct` and `mirrored` are the force per ampere-turn on the suspension phasor i and on its
    conjugate; `rest` is the force without suspension current.
    """

    positions: FloatArray
    torque: FloatArray
    cogging: FloatArray
    rest: ComplexArray
    direct: ComplexArray
    mirrored: ComplexArray


class AnalyticModel:
    """Field model of one task; `solve` takes a batch."""

    def __init__(self, task: Task, resolution: Resolution) -> None:
        self.task, self.resolution = task, resolution
        family = task.winding.family
        self.reach = max(resolution.reach, family.pole_pairs // family.slots + 1)
        highest = min(max(15 * family.pole_pairs, 45), self.reach * family.slots)
        self.rotation = Rotation(
            winding=task.winding,
            highest_order=max(resolution.highest_order, 3 * family.slots),
            magnet_orders=np.arange(family.pole_pairs, highest + 1, 2 * family.pole_pairs),
        )
        self.linkage = Linkage(task.winding)
        materials = task.materials
        temperature = task.conditions.magnet_temperature
        self.remanence = float(materials.magnet.remanence.at(temperature))
        self.recoil = float(materials.magnet.recoil_permeability.at(temperature))
        self.stacking = float(materials.stator_steel.stacking_factor.value)
        self.steels = Steels(
            stator=materials.stator_steel.magnetization.laminated(self.stacking),
            rotor=materials.rotor_steel.magnetization.laminated(
                float(materials.rotor_steel.stacking_factor.value)
            ),
            shaft_magnetic=bool(materials.shaft.magnetization.flux_density(1e3) > MAGNETIC_FROM),
        )

    # -- fields -------------------------------------------------------------------------------

    def waves(
        self, sections: CrossSections, exciting: Excitation
    ) -> tuple[Waves, MagnetSource, ComplexArray, SaturatedIron]:
        """Gap fields at the duty, the smooth-bore source, and the torque phasor (n,).

        Iron is found first with perfect iron's flux, then the field once more with that iron.
        """
        magnet_orders = self.rotation.magnet_orders
        radii = RotorRadii.of(sections, self.recoil)
        slot = mouth(sections, self.resolution.slot_modes)
        magnetised = magnetisation(
            sections.magnet_arc_ratio,
            self.remanence,
            self.rotation.pole_pairs,
            magnet_orders,
            self.task.construction.magnetisation,
        )
        residues, current = self.rotation.current_residues("torque")
        control, control_current = self.rotation.current_residues("suspension")

        def gap(classes: NDArray[np.int64]) -> SlottedGap:
            return SlottedGap(
                radii,
                sections.slot_opening_angle,
                slot,
                self.rotation.slots,
                classes,
                self.reach,
            )

        def torque_phasor(magnets: GapField) -> ComplexArray:
            flux = self.linkage.magnets(magnets, magnet_orders)
            # EMF is d(flux)/dt: the current in phase with it leads the flux by a quarter period.
            return np.asarray(1j * exciting.torque * flux / np.abs(flux))

        perfect = Iron.perfect(len(sections))
        core = perfect.core_admittance(self.recoil, magnet_orders)
        smooth = source(radii, *magnetised, magnet_orders, core)
        for_magnets, for_current = gap(magnet_orders), gap(residues)
        magnets = for_magnets.of_magnets(smooth.bore)
        phasor = torque_phasor(magnets)
        driven = for_current.of_currents(np.conj(phasor)[:, None] * current)
        reaction = np.real(for_magnets.reaction.slot[:, 0])
        paths = self._paths(sections, radii, magnets, driven, smooth, perfect, reaction)
        iron = saturate(
            sections, radii, (magnetised[0][:, :1], magnetised[1][:, :1]), paths, self.steels
        )

        core = iron.main.core_admittance(self.recoil, magnet_orders)
        smooth = source(radii, *magnetised, magnet_orders, core)
        magnets = for_magnets.with_iron(iron.main).of_magnets(smooth.bore)
        phasor = torque_phasor(magnets)
        driven = for_current.with_iron(iron.main).of_currents(np.conj(phasor)[:, None] * current)
        suspension = gap(control).with_iron(iron.small).of_currents(control_current)
        return Waves(magnets, driven, suspension, slot), smooth, phasor, iron

    def _paths(
        self,
        sections: CrossSections,
        radii: RotorRadii,
        magnets: GapField,
        driven: GapField,
        smooth: MagnetSource,
        perfect: Iron,
        reaction: FloatArray,
    ) -> Paths:
        fundamental = at_order(magnets, self.rotation.pole_pairs)
        current = at_order(driven, self.rotation.pole_pairs)
        order = np.array([self.rotation.pole_pairs])
        at_core = fundamental_at_core(
            radii,
            fundamental,
            smooth.bore[:, 0],
            smooth.core[:, 0],
            current,
            self.rotation.pole_pairs,
            perfect.core_admittance(self.recoil, order),
        )
        teeth, yoke = self.linkage.iron_flux(magnets, driven, self.rotation)
        main = driven.classes == self.rotation.pole_pairs % self.rotation.slots
        return Paths(
            magnet=magnets.slot[:, 0],
            current=driven.slot[:, main][:, 0],
            reaction=reaction,
            tooth_peak=np.abs(teeth).max(axis=(1, 2)) / sections.tooth_width,
            yoke_peak=np.abs(yoke).max(axis=(1, 2)) / sections.yoke_thickness,
            core_peak=core_peak(sections, at_core, self.steels)[1],
        )

    # -- torque and force over the turn -------------------------------------------------------

    def motion(
        self, sections: CrossSections, waves: Waves, positions: FloatArray | None = None
    ) -> Motion:
        """Torque and force at rotor `positions` (k,), default one sector of the turn."""
        rotation = self.rotation
        if positions is None:
            positions = rotation.positions(self.resolution.positions)
        turning = np.exp(1j * rotation.magnet_exponents[:, None] * positions)
        pair = np.exp(1j * rotation.pole_pairs * np.array([-1.0, 1.0])[:, None] * positions)
        magnet_rising, magnet_falling = (part @ turning for part in rotation.dense(waves.magnets))
        rising, falling = (_collapse(part) @ pair for part in rotation.dense(waves.current))
        rising, falling = magnet_rising + rising, magnet_falling + falling
        control_rising, control_falling = (
            _collapse(part) for part in rotation.dense(waves.suspension)
        )
        bore = sections.bore_radius
        # The column of exp(-j p angle) goes with the conjugate of the phasor, the other with it.
        on_mirrored = stress.force(
            rising, control_falling[:, :, 0, None] * pair[0], bore
        ) + stress.force(control_rising[:, :, 1, None] * pair[1], falling, bore)
        on_direct = stress.force(
            rising, control_falling[:, :, 1, None] * pair[1], bore
        ) + stress.force(control_rising[:, :, 0, None] * pair[0], falling, bore)
        return Motion(
            positions=positions,
            torque=stress.torque(rising, falling),
            cogging=stress.torque(magnet_rising, magnet_falling),
            rest=stress.force(rising, falling, bore),
            direct=on_direct,
            mirrored=on_mirrored,
        )

    def whole_turn(self, motion: Motion) -> tuple[ComplexArray, ComplexArray, ComplexArray]:
        """Force parts (rest, direct, mirrored) over the whole turn, (n, sectors * positions)."""
        sectors = self.rotation.sectors
        turn = 2.0 * np.pi / sectors * np.arange(sectors)
        parts = (motion.rest, motion.direct, motion.mirrored)
        whole = [
            (part[:, None, :] * np.exp(1j * exponent * turn)[None, :, None]).reshape(
                part.shape[0], -1
            )
            for part, exponent in zip(parts, self.rotation.force_exponents, strict=True)
        ]
        return whole[0], whole[1], whole[2]

    def command(self, motion: Motion, direction: float) -> ComplexArray:
        """Suspension phasor of one ampere-turn that makes the mean force point to `direction`."""
        direct, mirrored = motion.direct.mean(axis=1), motion.mirrored.mean(axis=1)
        if self._direct_commands:
            return np.asarray(np.exp(1j * direction) * np.conj(direct) / np.abs(direct))
        return np.asarray(np.exp(-1j * direction) * mirrored / np.abs(mirrored))

    @property
    def _direct_commands(self) -> bool:
        """Whether the mean force follows the phasor itself (else its conjugate)."""
        family = self.task.winding.family
        return family.suspension_pole_pairs > family.pole_pairs

    def force_waves(self, motion: Motion, exciting: Excitation) -> ComplexArray:
        """Force over the whole turn, commanded along x and along y, (n, 2, positions), N/m."""
        rest, direct, mirrored = self.whole_turn(motion)
        commanded = []
        for direction in (0.0, 0.5 * np.pi):
            phasor = (exciting.suspension * self.command(motion, direction))[:, None]
            commanded.append(rest + direct * phasor + mirrored * np.conj(phasor))
        return np.stack(commanded, axis=1)

    # -- everything ---------------------------------------------------------------------------

    def solve(self, sections: CrossSections, exciting: Excitation) -> FieldSolution:
        """Field of n designs, per metre of stack."""
        waves, smooth, phasor, iron_state = self.waves(sections, exciting)
        motion = self.motion(sections, waves)
        mean_torque = motion.torque.mean(axis=1)
        forces = self.force_waves(motion, exciting)
        mean_force = forces.mean(axis=2, keepdims=True)
        error = np.abs(np.abs(forces) - np.abs(mean_force)) / np.abs(mean_force)
        angle = np.abs(np.angle(forces * np.conj(mean_force)))
        per_turn = np.abs(
            motion.direct.mean(axis=1) if self._direct_commands else motion.mirrored.mean(axis=1)
        )

        radii = RotorRadii.of(sections, self.recoil)
        pole_pairs = self.rotation.pole_pairs
        at_core = fundamental_at_core(
            radii,
            at_order(waves.magnets, pole_pairs),
            smooth.bore[:, 0],
            smooth.core[:, 0],
            at_order(waves.current, pole_pairs),
            pole_pairs,
            iron_state.main.core_admittance(self.recoil, np.array([pole_pairs])),
        )
        slot, linkage = waves.slot, self.linkage
        iron = losses.iron(
            self.task, self.rotation, linkage, sections, waves, exciting, self.stacking
        )
        length = self.task.duty.shaft_torque / np.abs(mean_torque)
        eddy = losses.rotor_eddy(
            self.task, self.rotation, sections, waves, exciting, length, self.recoil
        )
        return FieldSolution(
            torque=mean_torque,
            torque_ripple=np.ptp(motion.torque, axis=1) / np.abs(mean_torque),
            cogging=np.ptp(motion.cogging, axis=1),
            force=np.abs(mean_force[:, :, 0]).mean(axis=1),
            force_error_magnitude=error.max(axis=(1, 2)),
            force_error_angle=angle.max(axis=(1, 2)),
            force_per_ampere_turn=per_turn,
            displacement_stiffness=rotor_state.stiffness_of(
                sections, waves.magnets, self.rotation.magnet_orders
            ),
            flux_linkage=np.abs(linkage.magnets(waves.magnets, self.rotation.magnet_orders)),
            torque_inductance=linkage.inductance(
                "torque", waves.current, slot.permeance, self.rotation, phasor
            ),
            suspension_inductance=linkage.inductance(
                "suspension", waves.suspension, slot.permeance, self.rotation, None
            ),
            gap_flux_density=2.0
            * pole_pairs
            * np.abs(at_order(waves.magnets, pole_pairs))
            / sections.bore_radius,
            tooth_flux_density=iron.tooth_peak,
            yoke_flux_density=iron.yoke_peak,
            core_flux_density=core_peak(sections, at_core, self.steels)[0],
            magnet_flux_density=rotor_state.lowest_magnet_density(
                sections,
                waves.magnets,
                waves.current,
                self.rotation.magnet_orders,
                self.recoil,
                self.remanence if self.task.construction.magnetisation == "parallel" else None,
            ),
            loss_teeth=iron.teeth,
            loss_yoke=iron.yoke,
            loss_magnet=eddy.magnet.sum(axis=1),
            loss_sleeve=eddy.sleeve.sum(axis=1),
        )


def _collapse(dense: ComplexArray) -> ComplexArray:
    """Sum the residue classes of a current field: all vary as exp(-+j p angle), (n, N, 2)."""
    classes = dense.shape[2] // 2
    return np.stack([dense[..., :classes].sum(axis=2), dense[..., classes:].sum(axis=2)], axis=2)
