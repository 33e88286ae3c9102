"""The registry of metrics: every number an evaluation returns, with unit, meaning and source.

Tables, documents, the study file's checks and `hovergap metrics` are made from it.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Metric:
    """One metric.

    `smaller_is_better` is None where neither direction is better in itself. `source` names where
    the definition or the formula comes from.
    """

    name: str
    unit: str
    group: str
    definition: str
    source: str
    smaller_is_better: bool | None = None


STRESS = "Maxwell stress in the gap"
DESIGN = "definition"
ZHU = "Zhu, Howe, Chan, IEEE Trans. Magn. 38(1), 2002"
CHIBA = "Chiba et al., Magnetic Bearings and Bearingless Drives, 2005"

METRICS: tuple[Metric, ...] = (
    # -- torque --
    Metric(
        "torque_Nm",
        "N m",
        "torque",
        "mean electromagnetic torque at the duty: shaft torque plus air friction",
        STRESS,
    ),
    Metric(
        "torque_ripple",
        "1",
        "torque",
        "largest minus smallest torque over the turn, over the mean",
        STRESS,
        True,
    ),
    Metric(
        "cogging_torque_Nm",
        "N m",
        "torque",
        "largest minus smallest torque over the turn without current",
        STRESS,
        True,
    ),
    # -- suspension --
    Metric(
        "force_N",
        "N",
        "suspension",
        "magnitude of the mean force over the turn while a constant force is commanded at the "
        "suspension share of slot current",
        STRESS,
        False,
    ),
    Metric(
        "force_error_magnitude",
        "1",
        "suspension",
        "largest | |F| - |Fm| | / |Fm| over the turn; Fm is the mean force vector",
        DESIGN,
        True,
    ),
    Metric(
        "force_error_angle_deg",
        "deg",
        "suspension",
        "largest angle between the force F and its mean Fm over the turn",
        DESIGN,
        True,
    ),
    Metric(
        "force_per_ampere_N_A",
        "N/A",
        "suspension",
        "mean force per ampere of peak suspension phase current",
        STRESS,
        False,
    ),
    Metric(
        "residual_voltage",
        "1",
        "suspension",
        "torque EMF left at the suspension terminals over the torque EMF",
        CHIBA,
        True,
    ),
    Metric(
        "ripple_index",
        "1",
        "suspension",
        "weighted sum of torque ripple, force error magnitude and force error angle, each over "
        "its own limit",
        DESIGN,
        True,
    ),
    # -- levitation --
    Metric("rotor_weight_N", "N", "levitation", "weight of the active rotor", DESIGN, True),
    Metric(
        "force_per_weight",
        "1",
        "levitation",
        "force at the suspension share over the rotor weight",
        DESIGN,
        False,
    ),
    Metric(
        "displacement_stiffness_N_mm",
        "N/mm",
        "levitation",
        "magnetic pull per displacement of the rotor (destabilising), magnets alone",
        "exact linear stiffness of concentric cylinders; thin-gap form by Covo, AIEE Trans. 73, "
        "1954",
        True,
    ),
    Metric(
        "lift_off_ratio",
        "1",
        "levitation",
        "force of the whole slot current at standstill over weight (horizontal shaft) plus "
        "magnetic pull at the touchdown clearance, half the mechanical clearance",
        DESIGN,
        False,
    ),
    Metric(
        "unbalance_force_N",
        "N",
        "levitation",
        "rotating force of the permissible residual unbalance at the duty speed",
        "ISO 21940-11:2016",
        True,
    ),
    # -- fields --
    Metric(
        "gap_flux_density_T",
        "T",
        "field",
        "peak fundamental of the magnets' radial flux density at the bore",
        ZHU,
    ),
    Metric(
        "tooth_flux_density_T",
        "T",
        "field",
        "largest mean flux density across a tooth body at the duty",
        DESIGN,
        True,
    ),
    Metric(
        "yoke_flux_density_T",
        "T",
        "field",
        "largest mean flux density across the stator yoke at the duty",
        DESIGN,
        True,
    ),
    Metric(
        "core_flux_density_T",
        "T",
        "field",
        "largest mean flux density across the rotor core (with the shaft, if magnetic) at the duty",
        DESIGN,
        True,
    ),
    Metric(
        "magnet_flux_density_T",
        "T",
        "field",
        "smallest flux density along the magnetisation over the magnets' outer surface at the duty",
        DESIGN,
        False,
    ),
    # -- circuit --
    Metric("turns_per_coil", "1", "circuit", "whole turns of one coil", DESIGN),
    Metric(
        "phase_current_A",
        "A",
        "circuit",
        "root-mean-square current of one conductor, torque and suspension current together",
        DESIGN,
        True,
    ),
    Metric(
        "back_emf_V",
        "V",
        "circuit",
        "peak fundamental EMF of one phase at the duty speed",
        "Faraday's law",
    ),
    Metric(
        "phase_voltage_V",
        "V",
        "circuit",
        "peak fundamental phase voltage at the duty",
        "phasor diagram of the non-salient machine",
        True,
    ),
    Metric(
        "voltage_use",
        "1",
        "circuit",
        "phase voltage at the duty over what the inverter makes after its reserve",
        "two-level inverter, linear modulation (common practice)",
        True,
    ),
    Metric("torque_inductance_mH", "mH", "circuit", "inductance to the torque current", DESIGN),
    Metric(
        "suspension_inductance_mH", "mH", "circuit", "inductance to the suspension current", DESIGN
    ),
    # -- losses --
    Metric(
        "loss_copper_W",
        "W",
        "losses",
        "copper loss of both currents with end turns and strand eddy currents, at temperature",
        "IEC 60028; round wire in a transverse field (Landau, Lifshitz)",
        True,
    ),
    Metric("loss_teeth_W", "W", "losses", "iron loss of the teeth", "Bertotti 1988", True),
    Metric("loss_yoke_W", "W", "losses", "iron loss of the stator yoke", "Bertotti 1988", True),
    Metric("loss_iron_W", "W", "losses", "iron loss of teeth and yoke", "Bertotti 1988", True),
    Metric(
        "loss_magnet_W",
        "W",
        "losses",
        "eddy-current loss of the magnets",
        "strip formula with reaction factor per field harmonic",
        True,
    ),
    Metric(
        "loss_sleeve_W",
        "W",
        "losses",
        "eddy-current loss of a conducting sleeve",
        "thin shell per field harmonic",
        True,
    ),
    Metric(
        "loss_air_friction_W",
        "W",
        "losses",
        "air friction of gap and rotor faces",
        "Bilgen and Boulos 1973; Daily and Nece 1960",
        True,
    ),
    Metric("loss_total_W", "W", "losses", "sum of all losses", DESIGN, True),
    Metric("efficiency", "1", "losses", "shaft power over shaft power plus losses", DESIGN, False),
    # -- mechanics --
    Metric("tip_speed_m_s", "m/s", "mechanics", "surface speed of the sleeve", DESIGN, True),
    Metric(
        "sleeve_interference_um",
        "um",
        "mechanics",
        "radial interference of sleeve and magnets, cold and at rest: the study's, or the one "
        "that keeps the stated pressure between magnets and core at overspeed and temperature",
        "orthotropic ring (Lekhnitskii, Anisotropic Plates, 1968) on segments on a disc",
    ),
    Metric(
        "sleeve_stress_MPa",
        "MPa",
        "mechanics",
        "largest stress of the sleeve at overspeed and temperature or cold at rest: von Mises in a "
        "metal, along the fibre in a wound sleeve",
        "orthotropic ring (Lekhnitskii, Anisotropic Plates, 1968) on segments on a disc",
        True,
    ),
    Metric(
        "sleeve_stress_ratio",
        "1",
        "mechanics",
        "sleeve stress over the yield strength (metal) or the strength (fibre) at temperature",
        DESIGN,
        True,
    ),
    Metric(
        "contact_pressure_MPa",
        "MPa",
        "mechanics",
        "pressure left between magnets and core at overspeed and temperature; negative if they "
        "part",
        "orthotropic ring (Lekhnitskii, Anisotropic Plates, 1968) on segments on a disc",
        False,
    ),
    # -- heat --
    Metric(
        "surface_loss_W_cm2",
        "W/cm2",
        "heat",
        "copper and iron loss over the outer cylinder of the stator",
        "common practice, first-order heat limit",
        True,
    ),
    # -- size, mass, cost --
    Metric(
        "stack_length_mm", "mm", "size", "iron length that makes the duty's torque", DESIGN, True
    ),
    Metric("outer_diameter_mm", "mm", "size", "of the stator", DESIGN, True),
    Metric("length_ratio", "1", "size", "stack length over bore diameter", DESIGN, True),
    Metric("slot_opening_mm", "mm", "size", "chord of the slot opening at the bore", DESIGN),
    Metric("mass_kg", "kg", "size", "mass of all active materials", DESIGN, True),
    Metric("magnet_mass_kg", "kg", "size", "mass of the magnets", DESIGN, True),
    Metric(
        "torque_density_Nm_L",
        "N m/L",
        "size",
        "torque over the volume of the outer cylinder of the stack",
        DESIGN,
        False,
    ),
    Metric("cost", "money", "cost", "active materials at the study's prices", DESIGN, True),
)

METRIC: dict[str, Metric] = {metric.name: metric for metric in METRICS}
