"""The field at another magnet temperature than it was solved with."""

from __future__ import annotations

from dataclasses import replace

from evaluators.machine.field import FieldSolution
from evaluators.machine.quantity import FloatArray


def at_remanence(field: FieldSolution, ratio: FloatArray) -> FieldSolution:
    """Field of n designs with the remanence `ratio` (n,) times that it was solved with.

    The field is not solved again: flux, torque and force grow as the remanence, magnetic pull,
    cogging and iron loss as its square. Iron that saturates less with weaker magnets gives some of
    it back, so a warm machine is judged a little too harshly and a cool one too kindly. Eddy
    currents of the rotor stay, as most of them come from slotting and currents together. The
    lowest density in the magnets falls by what the fundamental of the gap loses.
    """
    square = ratio * ratio

    def squared(part: FloatArray | None) -> FloatArray | None:
        return None if part is None else part * square

    return replace(
        field,
        torque=field.torque * ratio,
        cogging=field.cogging * square,
        force=field.force * ratio,
        force_per_ampere_turn=field.force_per_ampere_turn * ratio,
        displacement_stiffness=field.displacement_stiffness * square,
        flux_linkage=field.flux_linkage * ratio,
        gap_flux_density=field.gap_flux_density * ratio,
        tooth_flux_density=field.tooth_flux_density * ratio,
        yoke_flux_density=field.yoke_flux_density * ratio,
        core_flux_density=field.core_flux_density * ratio,
        magnet_flux_density=field.magnet_flux_density - (1.0 - ratio) * field.gap_flux_density,
        loss_teeth=field.loss_teeth * square,
        loss_yoke=field.loss_yoke * square,
        loss_iron_hysteresis=squared(field.loss_iron_hysteresis),
        loss_iron_eddy=squared(field.loss_iron_eddy),
        loss_iron_excess=squared(field.loss_iron_excess),
    )
