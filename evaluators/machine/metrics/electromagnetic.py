"""Metrics of torque, suspension force and field."""

from __future__ import annotations

from evaluators.machine.metrics.definition import CHIBA, DESIGN, STRESS, ZHU, Metric

METRICS: tuple[Metric, ...] = (
    # -- torque --
    Metric(
        "torque_Nm",
        "N m",
        "torque",
        "mean electromagnetic torque at the duty: the shaft's and the drag of friction and "
        "of losses in iron and rotor",
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
        "force_angle_bias_deg",
        "deg",
        "suspension",
        "angle by which currents induced in the rotor turn the mean force away from the direction "
        "commanded without them; zero where the evaluator induces none",
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
        signed=True,
    ),
)
