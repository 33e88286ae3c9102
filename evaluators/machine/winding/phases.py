"""Phases of the two currents that follow from the winding alone, slots and saturation left out.

A field model may find slightly different ones for a saturated machine under load; these are where
it starts, and what a solver outside is told.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from evaluators.machine.winding.winding import Winding


@dataclass(frozen=True)
class CurrentPhases:
    """Phases of the currents of phase one at rotor angle 0, electrical rad.

    Attributes
    ----------
    torque : float
        In phase with the EMF of the magnets.
    suspension_x, suspension_y : float
        For a mean force along x and along y.
    """

    torque: float
    suspension_x: float
    suspension_y: float


def current_phases(winding: Winding) -> CurrentPhases:
    """Phases of the currents at rotor angle 0, where a north magnet lies on x.

    Torque: the magnets' field B cos(p (phi - theta)) has the vector potential
    A = (r B / p) sin(p (phi - theta)), so phase one links |P| sin(arg P - p theta), P being its
    complex winding factor; the EMF leads that linkage by a quarter period.

    Suspension: the slot currents make the radial field b exp(j (p theta - ps phi)) that falls
    where a current along +z flows. Its product with the magnets' field pulls the rotor to where
    both add up. The shear stress of the same pair is never larger than that pull (a current sheet
    at the bore: the radial field is larger by (R^2ps + r^2ps) / (R^2ps - r^2ps)), so it cannot
    turn the sign (Maxwell stress in a slotless gap).
    """
    family = winding.family
    order = family.suspension_pole_pairs
    linked = winding.phase_phasors("torque", family.pole_pairs)[0, 0]
    slot_angle = 2.0 * np.pi * (np.arange(family.slots) + 0.5) / family.slots
    wave = -1j * np.sum(winding.suspension_slot_mmf * np.exp(1j * order * slot_angle))
    towards_x = -float(np.angle(wave))
    # The sum of both fields turns with the direction of the force for ps = p + 1, against it else.
    quarter = 0.5 * np.pi * (order - family.pole_pairs)
    return CurrentPhases(
        torque=_wrapped(np.pi - float(np.angle(linked))),
        suspension_x=_wrapped(towards_x),
        suspension_y=_wrapped(towards_x + quarter),
    )


def _wrapped(angle: float) -> float:
    """The same angle between -pi and pi."""
    return float(np.angle(np.exp(1j * angle)))
