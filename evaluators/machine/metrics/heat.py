"""Metrics of temperature and demagnetisation."""

from __future__ import annotations

from evaluators.machine.metrics.definition import DESIGN, Metric

METRICS: tuple[Metric, ...] = (
    # -- heat --
    Metric(
        "surface_loss_W_cm2",
        "W/cm2",
        "heat",
        "copper and iron loss over the outer cylinder of the stator",
        "common practice, first-order heat limit",
        True,
    ),
    # -- temperatures --
    Metric(
        "winding_temperature_C",
        "degC",
        "heat",
        "mean temperature of the winding, as its resistance shows it",
        "lumped heat network",
        True,
        signed=True,
    ),
    Metric(
        "hot_spot_temperature_C",
        "degC",
        "heat",
        "hottest point of slots and end turns with the allowance of the study",
        "Poisson's equation on a rectangle (Timoshenko, Goodier)",
        True,
        signed=True,
    ),
    Metric(
        "insulation_margin_K",
        "K",
        "heat",
        "temperature of the insulation class less the hot spot",
        "IEC 60085",
        False,
        signed=True,
    ),
    Metric(
        "temperature_rise_margin_K",
        "K",
        "heat",
        "permitted mean winding temperature (40 degC and the permitted rise) less the "
        "mean winding temperature",
        "IEC 60034-1, resistance method",
        False,
        signed=True,
    ),
    Metric(
        "magnet_temperature_C",
        "degC",
        "heat",
        "mean temperature of the magnets",
        "lumped heat network",
        True,
        signed=True,
    ),
    Metric(
        "sleeve_temperature_C",
        "degC",
        "heat",
        "mean temperature of the sleeve",
        "lumped heat network",
        True,
        signed=True,
    ),
    Metric(
        "gap_temperature_C",
        "degC",
        "heat",
        "temperature of the gas in the gap",
        "Becker, Kaye, J. Heat Transfer 84, 1962",
        True,
        signed=True,
    ),
    Metric(
        "rotor_material_margin_K",
        "K",
        "heat",
        "smallest distance of magnets, sleeve and shaft to the end of their material's "
        "data; beyond it properties are held and mean little",
        DESIGN,
        False,
        signed=True,
    ),
    # -- demagnetisation --
    Metric(
        "knee_flux_density_T",
        "T",
        "magnet",
        "flux density at the knee of the magnets' curve at their temperature",
        "IEC 60404-8-1 for the terms",
        True,
        signed=True,
    ),
    Metric(
        "demagnetisation_margin_T",
        "T",
        "magnet",
        "smallest flux density in the magnets at the duty less that of the knee",
        DESIGN,
        False,
        signed=True,
    ),
    Metric(
        "fault_current_ratio",
        "1",
        "magnet",
        "peak of the current against the magnets in the stated fault over the peak torque current",
        "short circuit of three phases at constant speed",
        True,
    ),
    Metric(
        "fault_magnet_flux_density_T",
        "T",
        "magnet",
        "smallest flux density in the magnets in the stated fault",
        "Zhu, Howe, IEEE Trans. Magn. 29(1), 1993 (armature field)",
        False,
        signed=True,
    ),
    Metric(
        "fault_demagnetisation_margin_T",
        "T",
        "magnet",
        "smallest flux density in the magnets in the stated fault less that of the knee",
        DESIGN,
        False,
        signed=True,
    ),
)
