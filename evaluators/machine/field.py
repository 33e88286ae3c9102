"""What a field model hands over: one slice of the machine, per metre of stack.

Every evaluator fills a `FieldSolution`; `evaluators.machine.performance` turns it into metrics, so
that all evaluators mean the same by the same name.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.task.task import Construction, Duty

FloatArray = NDArray[np.float64]
Selection = NDArray[np.bool_] | NDArray[np.int64] | slice


@dataclass(frozen=True)
class Excitation:
    """Peak ampere-turns of one coil (current times turns) for torque and for suspension, (n,) A.

    The torque current is in phase with the EMF (no current along the magnet axis). The suspension
    current turns with the rotor and commands a constant force.
    """

    torque: FloatArray
    suspension: FloatArray

    def rows(self, selection: Selection) -> Excitation:
        """The excitation of the selected designs only."""
        return Excitation(self.torque[selection], self.suspension[selection])


def excitation(
    sections: CrossSections, current_density: FloatArray, duty: Duty, construction: Construction
) -> Excitation:
    """Ampere-turns that the current density allows in the slots.

    A slot holds two coil sides. The peaks of both currents add up in the worst conductor, so the
    peak of the sum is held at sqrt(2) times the root-mean-square density; `suspension_share` of it
    is suspension current.

    Parameters
    ----------
    sections : CrossSections
        n designs.
    current_density : array (n,)
        Root-mean-square, A/m2.
    """
    copper = 0.5 * sections.slot_area * construction.copper_fill
    peak = np.sqrt(2.0) * current_density * copper
    return Excitation(
        torque=(1.0 - duty.suspension_share) * peak, suspension=duty.suspension_share * peak
    )


@dataclass(frozen=True)
class FieldSolution:
    """Results of a field model for n designs, per metre of stack; every attribute is (n,).

    Attributes
    ----------
    torque, torque_ripple, cogging : N m/m, 1, N m/m
        Mean over the turn with torque current; peak to peak over the mean; peak to peak without
        current.
    force, force_error_magnitude, force_error_angle : N/m, 1, rad
        Magnitude of the mean force with torque and suspension current, and its errors over the
        turn while a constant force is commanded (the worst of the commanded directions x and y).
    force_per_ampere_turn : N/m/A
        Mean force per peak ampere-turn of one coil, at small suspension current.
    displacement_stiffness : N/m per m
        Pull per eccentricity, magnets alone.
    flux_linkage : Wb/m
        Peak fundamental magnet flux linkage of one phase with one turn per coil, all its coils in
        series.
    torque_inductance, suspension_inductance : H/m
        Of one phase with one turn per coil, all its coils in series, gap and slot leakage, without
        end turns; the saturated machine.
    gap_flux_density, tooth_flux_density, yoke_flux_density, core_flux_density : T
        Peak fundamental of the magnets at the bore; largest mean densities at the duty.
    magnet_flux_density : T
        Smallest density along the magnetisation over the magnets' outer surface at the duty.
    loss_teeth, loss_yoke, loss_magnet, loss_sleeve : W/m
        At the duty.
    loss_iron_hysteresis, loss_iron_eddy, loss_iron_excess : W/m, optional
        Teeth and yoke together by mechanism: classical eddy currents apart from excess loss. All
        three or none; the sum is that of teeth and yoke.
    force_angle_bias : rad, optional
        Angle by which currents induced in the rotor turn the mean force away from the direction
        that is commanded without them, counter-clockwise; left out where none are induced, so
        that `torque` then lacks their drag.
    """

    torque: FloatArray
    torque_ripple: FloatArray
    cogging: FloatArray
    force: FloatArray
    force_error_magnitude: FloatArray
    force_error_angle: FloatArray
    force_per_ampere_turn: FloatArray
    displacement_stiffness: FloatArray
    flux_linkage: FloatArray
    torque_inductance: FloatArray
    suspension_inductance: FloatArray
    gap_flux_density: FloatArray
    tooth_flux_density: FloatArray
    yoke_flux_density: FloatArray
    core_flux_density: FloatArray
    magnet_flux_density: FloatArray
    loss_teeth: FloatArray
    loss_yoke: FloatArray
    loss_magnet: FloatArray
    loss_sleeve: FloatArray
    loss_iron_hysteresis: FloatArray | None = None
    loss_iron_eddy: FloatArray | None = None
    loss_iron_excess: FloatArray | None = None
    force_angle_bias: FloatArray | None = None

    def __post_init__(self) -> None:
        rows = self.torque.shape
        for item in fields(self):
            value = getattr(self, item.name)
            if value is not None and value.shape != rows:
                msg = f"{item.name} has shape {value.shape}, expected {rows}"
                raise ValueError(msg)
        parts = (self.loss_iron_hysteresis, self.loss_iron_eddy, self.loss_iron_excess)
        if 0 < sum(part is None for part in parts) < len(parts):
            msg = "iron loss by mechanism needs hysteresis, eddy and excess loss, or none of them"
            raise ValueError(msg)

    def rows(self, selection: Selection) -> FieldSolution:
        """The field of the selected designs only."""
        return FieldSolution(**{name: value[selection] for name, value in self._known().items()})

    @classmethod
    def joined(cls, parts: Sequence[FieldSolution]) -> FieldSolution:
        """The fields of several batches one after the other."""
        known = [part._known() for part in parts]
        return cls(**{name: np.concatenate([part[name] for part in known]) for name in known[0]})

    def _known(self) -> dict[str, FloatArray]:
        values = {item.name: getattr(self, item.name) for item in fields(self)}
        return {name: value for name, value in values.items() if value is not None}
