"""Metrics of levitation, strength and bending of the rotor."""

from __future__ import annotations

from evaluators.machine.metrics.definition import DESIGN, RING, Metric

METRICS: tuple[Metric, ...] = (
    # -- levitation --
    Metric(
        "rotor_weight_N",
        "N",
        "levitation",
        "weight of the rotor: active part, shaft ends, mounted parts",
        DESIGN,
        True,
    ),
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
        "force of the rated suspension current at standstill over weight (horizontal shaft) plus "
        "magnetic pull at the touchdown clearance",
        DESIGN,
        False,
    ),
    Metric(
        "unbalance_force_N",
        "N",
        "levitation",
        "rotating force of the permissible residual unbalance at the highest speed",
        "ISO 21940-11:2016",
        True,
    ),
    # -- mechanics --
    Metric("tip_speed_m_s", "m/s", "mechanics", "surface speed of the sleeve", DESIGN, True),
    Metric(
        "sleeve_interference_um",
        "um",
        "mechanics",
        "radial interference of sleeve and magnets, cold and at rest: the study's, or the one "
        "that keeps the stated pressure between magnets and core at overspeed and temperature",
        RING,
    ),
    Metric(
        "sleeve_stress_MPa",
        "MPa",
        "mechanics",
        "largest stress of the sleeve at overspeed and temperature or cold at rest: von Mises in a "
        "metal, along the fibre in a wound sleeve",
        RING,
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
        RING,
        False,
        signed=True,
    ),
    # -- suspension budget --
    Metric(
        "rotor_mass_kg",
        "kg",
        "levitation",
        "mass of the active rotor, the shaft ends and what is mounted on them",
        DESIGN,
        True,
    ),
    Metric(
        "rated_force_N",
        "N",
        "levitation",
        "force of the rated suspension current, linear in the current",
        DESIGN,
        False,
    ),
    Metric(
        "magnetic_pull_N",
        "N",
        "levitation",
        "pull of the magnets at the displacement that operation may use",
        "zone A of ISO 14839-2:2004 unless the study says otherwise",
        True,
    ),
    Metric(
        "suspension_demand_N",
        "N",
        "levitation",
        "weight (horizontal shaft), unbalance, magnetic pull and process force at once, "
        "in one direction",
        DESIGN,
        True,
    ),
    Metric(
        "suspension_ratio",
        "1",
        "levitation",
        "force at the suspension share over the suspension demand",
        DESIGN,
        False,
    ),
    Metric(
        "rated_suspension_ratio",
        "1",
        "levitation",
        "force at rated suspension current over the suspension demand",
        DESIGN,
        False,
    ),
    Metric(
        "force_slew_N_ms",
        "N/ms",
        "levitation",
        "fastest change of the force with the voltage that the duty and the residual voltage leave",
        "Schweitzer, Maslen, Magnetic Bearings, 2009",
        False,
    ),
    Metric(
        "control_bandwidth_Hz",
        "Hz",
        "levitation",
        "highest frequency of a sinusoidal force as large as that of the suspension share "
        "(power bandwidth)",
        "Schweitzer, Maslen, Magnetic Bearings, 2009",
        False,
    ),
    Metric(
        "unstable_pole_Hz",
        "Hz",
        "levitation",
        "square root of magnetic pull per displacement over rotor mass, over 2 pi",
        "Schweitzer, Maslen, Magnetic Bearings, 2009",
        True,
    ),
    Metric(
        "bandwidth_ratio",
        "1",
        "levitation",
        "control bandwidth over the unstable pole",
        DESIGN,
        False,
    ),
    Metric(
        "zone_a_displacement_um",
        "um",
        "levitation",
        "largest peak displacement of zone A: 0.3 of the touchdown clearance",
        "ISO 14839-2:2004 (from memory)",
    ),
    # -- strength --
    Metric(
        "interference_window_um",
        "um",
        "mechanics",
        "interference at which the sleeve reaches its strength less the one that keeps "
        "the magnets pressed; negative if no interference holds",
        RING,
        False,
        signed=True,
    ),
    Metric(
        "sleeve_radial_tension_MPa",
        "MPa",
        "mechanics",
        "largest radial tension in the sleeve, which splits a wound fibre",
        RING,
        True,
    ),
    Metric(
        "lift_off_speed_ratio",
        "1",
        "mechanics",
        "speed at which the magnets leave the core over the overspeed, colder or hotter "
        "whichever is lower; at most 10",
        RING,
        False,
    ),
    Metric(
        "magnet_pressure_MPa",
        "MPa",
        "mechanics",
        "largest pressure of the sleeve on the magnets, whose segments carry no hoop tension",
        RING,
        True,
    ),
    Metric(
        "magnet_stress_ratio",
        "1",
        "mechanics",
        "magnet pressure over the compressive strength",
        DESIGN,
        True,
    ),
    Metric(
        "core_stress_MPa",
        "MPa",
        "mechanics",
        "largest hoop stress at the bore of the laminated core, at rest and at overspeed, without "
        "that of its fit on the shaft",
        "rotating disc (Timoshenko, Strength of Materials II)",
        True,
    ),
    Metric(
        "core_stress_ratio",
        "1",
        "mechanics",
        "core stress over the yield strength of the core's sheets at temperature",
        DESIGN,
        True,
    ),
    # -- bending --
    Metric(
        "free_bending_speed_rpm",
        "r/min",
        "mechanics",
        "first bending speed of the rotor hanging free; a first estimate that replaces no "
        "rotor-dynamic analysis",
        "stepped Timoshenko beam (Przemieniecki 1968)",
        False,
    ),
    Metric(
        "bending_speed_rpm",
        "r/min",
        "mechanics",
        "first speed on suspension and second bearing at which mostly the rotor bends, without "
        "gyroscopic effect; a first estimate that replaces no rotor-dynamic analysis",
        "stepped Timoshenko beam (Przemieniecki 1968)",
        False,
    ),
    Metric(
        "separation_margin",
        "1",
        "mechanics",
        "smallest distance of any bending speed from the speed range less the distance required, "
        "over the speed",
        "API 617 and API RP 684 (from memory)",
        False,
        signed=True,
    ),
)
