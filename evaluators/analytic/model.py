"""The analytic field of a batch of designs at the duty, from sources to a `FieldSolution`."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic import losses, rotor_state
from evaluators.analytic.answers import Answers
from evaluators.analytic.gap import GapField, Iron, SlottedGap, with_stator
from evaluators.analytic.linkage import Linkage
from evaluators.analytic.motion import Motion, move
from evaluators.analytic.rotation import Rotation
from evaluators.analytic.rotor import MU_0, MagnetSource, RotorRadii, magnetisation, source
from evaluators.analytic.rotor_state import at_order
from evaluators.analytic.saturation import (
    Paths,
    SaturatedIron,
    Steels,
    at_core,
    core_peak,
    saturate,
)
from evaluators.analytic.slots import SlotMouth, mouth
from evaluators.analytic.tips import ToothTips
from evaluators.analytic.waves import PerfectStator, Waves
from evaluators.machine.field import Excitation, FieldSolution
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.task.task import Task

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]


@dataclass(frozen=True)
class RotorState:
    """Stiffness in N/m per m, largest density of the core and lowest of the magnets in T, (n,)."""

    stiffness: FloatArray
    core: FloatArray
    magnet: FloatArray


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
    highest_order: int = 64
    positions: int = 24


class AnalyticModel:
    """Field model of one task; `solve` takes a batch."""

    def __init__(self, task: Task, resolution: Resolution) -> None:
        self.task, self.resolution = task, resolution
        family = task.winding.family
        self.reach = max(resolution.reach, family.pole_pairs // family.slots + 1)
        highest = min(max(15 * family.pole_pairs, 45), self.reach * family.slots)
        self.rotation = Rotation(
            winding=task.winding,
            highest_order=max(resolution.highest_order, 3 * family.slots, highest),
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
    ) -> tuple[Waves, MagnetSource, SaturatedIron]:
        """Gap fields at the duty, the source of the magnets, and the iron of one permeability.

        Iron is found first with perfect iron's flux, then the field once more with that iron.
        """
        rotation, magnet_orders = self.rotation, self.rotation.magnet_orders
        slots, reach = rotation.slots, self.reach
        radii = RotorRadii.of(sections, self.recoil)
        slot = mouth(sections, self.resolution.slot_modes)
        opening = sections.slot_opening_angle
        magnetised = magnetisation(
            sections.magnet_arc_ratio,
            self.remanence,
            rotation.pole_pairs,
            magnet_orders,
            self.task.construction.magnetisation,
        )
        residues, current = rotation.current_residues("torque")
        control, control_current = rotation.current_residues("suspension")

        def torque_phasor(magnets: GapField) -> ComplexArray:
            flux = self.linkage.magnets(magnets, magnet_orders)
            # EMF is d(flux)/dt: the current in phase with it leads the flux by a quarter period.
            return np.asarray(1j * exciting.torque * flux / np.abs(flux))

        perfect = Iron.perfect(len(sections))
        smooth = source(
            radii, *magnetised, magnet_orders, perfect.core_admittance(self.recoil, magnet_orders)
        )
        for_magnets = SlottedGap(radii, opening, slot, slots, magnet_orders, reach)
        for_slots = SlottedGap(radii, opening, slot, slots, np.arange(slots), reach)
        magnets = for_magnets.of_magnets(smooth.bore)
        phasor = torque_phasor(magnets)
        unit = for_slots.reaction.of(residues)
        driven = unit.times(MU_0 * np.conj(phasor)[:, None] * current)
        reaction = np.real(for_slots.reaction.slot[:, rotation.pole_pairs % slots])
        paths = self._paths(
            sections, radii, magnets, driven, phasor, slot, smooth, perfect, reaction
        )
        fundamental = (magnetised[0][:, :1], magnetised[1][:, :1])
        iron = saturate(sections, radii, fundamental, paths, self.steels)

        core = replace(iron.main, tooth=perfect.tooth, yoke=perfect.yoke)
        admittance = core.core_admittance(self.recoil, magnet_orders)
        smooth = source(radii, *magnetised, magnet_orders, admittance)
        tips = ToothTips.of(sections)
        for_slots = for_slots.with_iron(core, tips)
        reaction_of = for_slots.reaction
        magnets = for_magnets.with_iron(core, tips).of_magnets(smooth.bore)
        under_magnets = reaction_of.of(magnet_orders % slots)
        main = iron.main.stator_voltage(slots, magnet_orders)
        saturated = with_stator(magnets, under_magnets, main)
        phasor = torque_phasor(saturated)
        unit = reaction_of.of(residues)
        driven = unit.times(MU_0 * np.conj(phasor)[:, None] * current)
        under_control = reaction_of.of(control)
        suspension = under_control.times(MU_0 * control_current)
        tip = for_slots.tip_reaction()
        waves = Waves(
            magnets=saturated,
            current=with_stator(driven, unit, iron.main.stator_voltage(slots, residues)),
            suspension=with_stator(
                suspension, under_control, iron.small.stator_voltage(slots, control)
            ),
            slot=slot,
            tips=tips,
            phasor=phasor,
            perfect=PerfectStator(
                magnets, driven, suspension, reaction_of, tip, Answers.of(for_slots, tip)
            ),
        )
        return waves, smooth, iron

    def _paths(
        self,
        sections: CrossSections,
        radii: RotorRadii,
        magnets: GapField,
        driven: GapField,
        phasor: ComplexArray,
        slot: SlotMouth,
        smooth: MagnetSource,
        perfect: Iron,
        reaction: FloatArray,
    ) -> Paths:
        order = np.array([self.rotation.pole_pairs])
        field = at_core(
            radii,
            order,
            at_order(magnets, self.rotation.pole_pairs)[:, None],
            MagnetSource(bore=smooth.bore[:, :1], core=smooth.core[:, :1]),
            at_order(driven, self.rotation.pole_pairs),
            perfect.core_admittance(self.recoil, order),
        )
        teeth, yoke = self.linkage.iron_flux(magnets, driven, phasor, slot, self.rotation)
        main = driven.classes == self.rotation.pole_pairs % self.rotation.slots
        return Paths(
            magnet=magnets.slot[:, 0],
            current=driven.slot[:, main][:, 0],
            reaction=reaction,
            tooth_peak=np.abs(teeth).max(axis=(1, 2)) / sections.tooth_width,
            yoke_peak=np.abs(yoke).max(axis=(1, 2)) / sections.yoke_thickness,
            core_peak=core_peak(sections, field[:, 0], self.steels),
        )

    def motion(
        self, sections: CrossSections, waves: Waves, positions: FloatArray | None = None
    ) -> Motion:
        """Torque and force at rotor `positions` (k,), default one sector of the turn."""
        if positions is None:
            positions = self.rotation.positions(self.resolution.positions)
        return move(self.rotation, self.steels.stator, sections, waves, positions)

    def _rotor_state(
        self, sections: CrossSections, waves: Waves, smooth: MagnetSource, iron: SaturatedIron
    ) -> RotorState:
        """Stiffness and densities of the rotor."""
        rotation, orders = self.rotation, self.rotation.magnet_orders
        radii = RotorRadii.of(sections, self.recoil)
        core = replace(iron.main, tooth=0.0 * iron.main.tooth, yoke=0.0 * iron.main.yoke)
        parallel = self.task.construction.magnetisation == "parallel"
        beside = SlottedGap(
            radii,
            sections.slot_opening_angle,
            waves.slot,
            rotation.slots,
            rotor_state.beside(orders),
            self.reach,
            core,
        )
        still = at_core(
            radii,
            orders,
            np.stack([at_order(waves.magnets, int(n), k) for k, n in enumerate(orders)], axis=1),
            smooth,
            at_order(waves.current, rotation.pole_pairs),
            core.core_admittance(self.recoil, orders),
        )
        wide = np.arange(rotation.pole_pairs, rotation.edge_order + 1, 2 * rotation.pole_pairs)
        magnetised = magnetisation(
            sections.magnet_arc_ratio,
            self.remanence,
            rotation.pole_pairs,
            wide,
            self.task.construction.magnetisation,
        )
        alone = source(radii, *magnetised, wide, core.core_admittance(self.recoil, wide))
        return RotorState(
            stiffness=rotor_state.stiffness_of(beside, waves.magnets, orders, iron.main),
            core=rotor_state.core_density(sections, orders, still, self.steels.shaft_magnetic),
            magnet=rotor_state.lowest_magnet_density(
                sections,
                waves.magnets,
                waves.current,
                wide,
                alone.bore,
                self.recoil,
                self.remanence if parallel else None,
            ),
        )

    # -- everything ---------------------------------------------------------------------------

    def solve(self, sections: CrossSections, exciting: Excitation) -> FieldSolution:
        """Field of n designs, per metre of stack."""
        waves, smooth, iron_state = self.waves(sections, exciting)
        motion = self.motion(sections, waves)
        mean_torque = motion.torque.mean(axis=1)
        forces = motion.force_waves(exciting)
        mean_force = forces.mean(axis=2, keepdims=True)
        error = np.abs(np.abs(forces) - np.abs(mean_force)) / np.abs(mean_force)
        angle = np.abs(np.angle(forces * np.conj(mean_force)))

        pole_pairs = self.rotation.pole_pairs
        rotor = self._rotor_state(sections, waves, smooth, iron_state)
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
            force_per_ampere_turn=motion.force_per_ampere_turn,
            displacement_stiffness=rotor.stiffness,
            # The part a quarter period behind the current, which makes the EMF and the torque.
            flux_linkage=np.real(
                1j * motion.linkage * np.conj(waves.phasor) / np.abs(waves.phasor)
            ),
            torque_inductance=linkage.inductance(
                "torque", waves.current, slot.permeance, self.rotation, waves.phasor
            ),
            suspension_inductance=linkage.inductance(
                "suspension", waves.suspension, slot.permeance, self.rotation, None
            ),
            gap_flux_density=2.0
            * pole_pairs
            * np.abs(at_order(waves.magnets, pole_pairs))
            / sections.bore_radius,
            tooth_flux_density=(motion.tooth_flux + iron.tooth_extra) / sections.tooth_width,
            yoke_flux_density=(motion.yoke_flux + iron.yoke_extra) / sections.yoke_thickness,
            core_flux_density=rotor.core,
            magnet_flux_density=rotor.magnet,
            loss_teeth=iron.teeth.total,
            loss_yoke=iron.yoke.total,
            loss_magnet=eddy.magnet.sum(axis=1),
            loss_sleeve=eddy.sleeve.sum(axis=1),
            loss_iron_hysteresis=iron.teeth.hysteresis + iron.yoke.hysteresis,
            loss_iron_eddy=iron.teeth.classical + iron.yoke.classical,
            loss_iron_excess=iron.teeth.excess + iron.yoke.excess,
        )
