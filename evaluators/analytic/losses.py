"""Iron loss of teeth and yoke and eddy-current loss of the rotor, from the analytic field."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic.linkage import Linkage
from evaluators.analytic.mixing import mixed_to_separate
from evaluators.analytic.rotation import Rotation
from evaluators.analytic.waves import Waves
from evaluators.machine.field import Excitation
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.losses.eddy import RotorEddyLoss, rotor_eddy_loss
from evaluators.machine.losses.iron import IronLoss, iron_loss_from_waveform
from evaluators.machine.task.task import Task

FloatArray = NDArray[np.float64]

MIXED = 2  # orders up to so many times the slots mix in the magnets, as in the finite elements


@dataclass(frozen=True)
class IronState:
    """Iron loss in W/m, and the largest flux that the suspension current adds in Wb/m, (n,)."""

    teeth: IronLoss
    yoke: IronLoss
    tooth_extra: FloatArray
    yoke_extra: FloatArray


def iron(
    task: Task,
    rotation: Rotation,
    linkage: Linkage,
    sections: CrossSections,
    waves: Waves,
    exciting: Excitation,
    stacking: float,
) -> IronState:
    """Loss of the stator iron at the duty, from mean densities over tooth and yoke.

    The suspension's flux has the same frequency in the stator and any phase to the main flux, so
    it counts by its square in the loss and by its peak in the density. In a thick yoke the
    density falls outwards: for a wave of order p and constant permeability the mean square of both
    components is 2 t^2 p coth(p x) / (Ro^2 - Ri^2), x = ln(Ro/Ri), times that of the mean over the
    thickness t (plane field in a ring, closed form).
    """
    teeth, yoke = linkage.iron_flux(
        waves.magnets, waves.current, waves.phasor, waves.slot, rotation
    )
    tooth_extra, yoke_extra = linkage.suspension_flux(waves.suspension, waves.slot, rotation)
    tooth_extra = tooth_extra * exciting.suspension[:, None]
    yoke_extra = yoke_extra * exciting.suspension[:, None]
    thickness, width = sections.yoke_thickness, sections.tooth_width
    steel = task.materials.stator_steel
    frequency = task.electrical_frequency
    density = float(steel.density.value) * stacking

    inner, outer = sections.slot_radius, sections.outer_radius
    order = rotation.pole_pairs
    spread = (
        2.0 * thickness**2 * order / np.tanh(order * np.log(outer / inner)) / (outer**2 - inner**2)
    )

    def loss(flux: FloatArray, extra: FloatArray, across: FloatArray, area: FloatArray) -> IronLoss:
        main = 0.5 * np.ptp(flux, axis=2)
        raised = np.sqrt(1.0 + (extra / np.maximum(main, 1e-12)) ** 2)
        wave = flux * raised[:, :, None] / (across * stacking)[:, None, None]
        per_mass = iron_loss_from_waveform(steel.losses, wave, frequency, minor_loops=True)
        return IronLoss(*(np.asarray(part.mean(axis=1) * density * area) for part in per_mass))

    return IronState(
        teeth=loss(teeth, tooth_extra, width, sections.teeth_area),
        yoke=loss(yoke, yoke_extra, thickness / np.sqrt(spread), sections.yoke_area),
        tooth_extra=tooth_extra.max(axis=1),
        yoke_extra=yoke_extra.max(axis=1),
    )


def rotor_eddy(
    task: Task,
    rotation: Rotation,
    sections: CrossSections,
    waves: Waves,
    exciting: Excitation,
    length: FloatArray,
    recoil: float,
) -> RotorEddyLoss:
    """Eddy-current loss of magnets and sleeve per order and time dependence, W/m.

    Orders of one frequency mix in the magnets (`mixing`), those of the torque field at least.

    Every wave exp(j (n theta + tau angle)) of the stator frame turns against the rotor with the
    frequency |n + tau| times that of the shaft. Waves of magnets and torque current are added with
    their phase, the suspension's by its square.
    """
    order = np.arange(1, rotation.highest_order + 1)
    exponent = rotation.magnet_exponents
    half = exponent.size // 2
    turns = order[:, None] + exponent
    ratio = (sections.rotor_radius / sections.bore_radius)[:, None] ** order

    def at_surface(
        parts: tuple[NDArray[np.complex128], NDArray[np.complex128]],
    ) -> NDArray[np.complex128]:
        rising, falling = parts
        return rising * ratio[:, :, None] + falling / ratio[:, :, None]

    main = at_surface(rotation.dense(waves.magnets))
    both = at_surface(rotation.pair(waves.current))
    control = at_surface(rotation.pair(waves.suspension))
    main[:, :, 0] += both[..., 0]
    main[:, :, half] += both[..., 1]
    square = np.abs(main) ** 2
    square[:, :, 0] += np.abs(control[..., 0] * exciting.suspension[:, None]) ** 2
    square[:, :, half] += np.abs(control[..., 1] * exciting.suspension[:, None]) ** 2
    active = (turns != 0) & (square.max(axis=0) > 0.0)
    row, column = np.nonzero(active)
    orders = order[row]
    density = 2.0 * orders * np.sqrt(square[:, row, column]) / sections.rotor_radius[:, None]
    temperature = task.conditions
    magnet = task.materials.magnet
    pitch = np.pi / rotation.pole_pairs
    segments = task.construction.magnet_segments
    found = rotor_eddy_loss(
        orders.astype(np.float64),
        np.abs(turns[row, column]) * task.duty.speed / (2.0 * np.pi),
        density,
        iron_radius=sections.core_radius,
        magnet_radius=sections.magnet_radius,
        rotor_radius=sections.rotor_radius,
        bore_radius=sections.bore_radius,
        length=length,
        magnet_resistivity=np.full_like(
            length, float(magnet.resistivity.at(temperature.magnet_temperature))
        ),
        magnet_segment_angle=sections.magnet_arc_ratio * pitch / segments,
        magnet_segment_length=np.full_like(length, task.construction.magnet_axial_segment),
        magnet_coverage=sections.magnet_arc_ratio,
        recoil_permeability=np.full_like(length, recoil),
        sleeve_resistivity=np.full_like(
            length, float(task.materials.sleeve.resistivity.at(temperature.sleeve_temperature))
        ),
    )
    turn, wave = turns[row, column], main[:, row, column]
    near = orders <= MIXED * rotation.slots + rotation.pole_pairs
    share = mixed_to_separate(
        found.magnet[:, near],
        (np.where(turn > 0, wave, np.conj(wave)) / np.sqrt(square[:, row, column]))[:, near],
        (orders * np.sign(turn))[near],
        np.abs(turn)[near],
        rotation.pole_pairs,
        segments,
        sections.magnet_arc_ratio * pitch / segments,
    )
    mixed = found.magnet.copy()
    mixed[:, near] *= share[:, None]
    return found._replace(magnet=mixed)
