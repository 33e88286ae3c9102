"""Metrics of size, mass and cost."""

from __future__ import annotations

from evaluators.machine.metrics.definition import DESIGN, Metric

METRICS: tuple[Metric, ...] = (
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
    Metric(
        "cost_low",
        "money",
        "cost",
        "active materials at the low prices of the study",
        DESIGN,
        True,
    ),
    Metric(
        "cost_high",
        "money",
        "cost",
        "active materials at the high prices of the study",
        DESIGN,
        True,
    ),
)
