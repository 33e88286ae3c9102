"""The field quantities of the exchange: key with unit, place in `FieldSolution`, possible range."""

from __future__ import annotations

from dataclasses import dataclass
from math import pi


@dataclass(frozen=True)
class FieldQuantity:
    """One number of a reply.

    Attributes
    ----------
    key : str
        Name in the reply, with its unit.
    attribute : str
        Of `evaluators.machine.field.FieldSolution`.
    lowest, highest : float
        A value outside is a mistake of unit or of the program, not a result.
    factor : float
        From the unit of the reply to SI.
    """

    key: str
    attribute: str
    lowest: float
    highest: float
    factor: float = 1.0


# The bounds lie a few powers of ten beyond any machine of up to 1 m rotor radius; linkages and
# inductances are divided by and so may not be zero.
FIELD: tuple[FieldQuantity, ...] = (
    FieldQuantity("torque_Nm_per_m", "torque", -1e8, 1e8),
    FieldQuantity("torque_ripple", "torque_ripple", 0.0, 1e4),
    FieldQuantity("cogging_Nm_per_m", "cogging", 0.0, 1e8),
    FieldQuantity("force_N_per_m", "force", 0.0, 1e9),
    FieldQuantity("force_error_magnitude", "force_error_magnitude", 0.0, 1e4),
    FieldQuantity("force_error_angle_deg", "force_error_angle", 0.0, 180.0, pi / 180.0),
    FieldQuantity("force_per_ampere_turn_N_per_m_A", "force_per_ampere_turn", 1e-9, 1e6),
    FieldQuantity("displacement_stiffness_N_per_m2", "displacement_stiffness", -1e12, 1e12),
    FieldQuantity("flux_linkage_Wb_per_m", "flux_linkage", 1e-9, 1e4),
    FieldQuantity("torque_inductance_H_per_m", "torque_inductance", 1e-12, 10.0),
    FieldQuantity("suspension_inductance_H_per_m", "suspension_inductance", 1e-12, 10.0),
    FieldQuantity("gap_flux_density_T", "gap_flux_density", 0.0, 10.0),
    FieldQuantity("tooth_flux_density_T", "tooth_flux_density", 0.0, 10.0),
    FieldQuantity("yoke_flux_density_T", "yoke_flux_density", 0.0, 10.0),
    FieldQuantity("core_flux_density_T", "core_flux_density", 0.0, 10.0),
    FieldQuantity("magnet_flux_density_T", "magnet_flux_density", -10.0, 10.0),
    FieldQuantity("loss_teeth_W_per_m", "loss_teeth", 0.0, 1e9),
    FieldQuantity("loss_yoke_W_per_m", "loss_yoke", 0.0, 1e9),
    FieldQuantity("loss_magnet_W_per_m", "loss_magnet", 0.0, 1e9),
    FieldQuantity("loss_sleeve_W_per_m", "loss_sleeve", 0.0, 1e9),
)
