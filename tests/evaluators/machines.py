"""Invented machines for the tests of all evaluators; their numbers belong to no real drive."""

from __future__ import annotations

from dataclasses import replace
from math import pi

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.cost import Price, Prices
from evaluators.machine.geometry.cross_sections import CrossSections, cross_sections
from evaluators.machine.materials import library as materials
from evaluators.machine.materials.library import (
    Conductor,
    ElectricalSteel,
    Magnet,
    ShaftSteel,
    SleeveMaterial,
)
from evaluators.machine.materials.magnetization import MagnetizationCurve
from evaluators.machine.quantity import MU_0
from evaluators.machine.task.task import Construction, Duty, MaterialSet, Task
from evaluators.machine.winding.families import design_winding
from evaluators.machine.winding.winding import Winding

FloatArray = NDArray[np.float64]
Numbers = tuple[int, int, int]

# Tooth coils and distributed windings, both signs of ps - p, few and many slots per pole.
FAMILIES: tuple[Numbers, ...] = ((6, 2, 1), (12, 4, 5), (12, 1, 2), (12, 5, 4), (24, 4, 5))

DESIGN: dict[str, float] = {
    "rotor_radius_mm": 20.0,
    "clearance_mm": 0.6,
    "sleeve_thickness_mm": 1.6,
    "magnet_thickness_mm": 3.0,
    "magnet_arc_ratio": 0.85,
    "core_ratio": 0.5,
    "tooth_width_ratio": 0.5,
    "tip_span_ratio": 1.5,
    "tip_height_mm": 1.0,
    "wedge_height_mm": 1.0,
    "slot_depth_ratio": 0.6,
    "yoke_ratio": 1.0,
    "current_density_A_mm2": 6.0,
}

# Of round numbers, for geometry.
PLAIN: dict[str, float] = {
    "rotor_radius_mm": 20.0,
    "clearance_mm": 0.5,
    "sleeve_thickness_mm": 1.0,
    "magnet_thickness_mm": 4.0,
    "magnet_arc_ratio": 0.9,
    "core_ratio": 0.5,
    "tooth_width_ratio": 0.5,
    "tip_span_ratio": 1.3,
    "tip_height_mm": 1.0,
    "wedge_height_mm": 2.0,
    "slot_depth_ratio": 0.5,
    "yoke_ratio": 1.0,
    "current_density_A_mm2": 5.0,
}

BOUNDS: dict[str, tuple[float, float]] = {
    "rotor_radius_mm": (14.0, 24.0),
    "clearance_mm": (0.5, 1.0),
    "sleeve_thickness_mm": (1.0, 3.0),
    "magnet_thickness_mm": (2.0, 6.0),
    "magnet_arc_ratio": (0.6, 1.0),
    "core_ratio": (0.2, 0.7),
    "tooth_width_ratio": (0.3, 0.7),
    "tip_span_ratio": (0.7, 1.7),
    "tip_height_mm": (0.5, 2.0),
    "wedge_height_mm": (0.5, 2.0),
    "slot_depth_ratio": (0.3, 1.0),
    "yoke_ratio": (0.6, 1.5),
    "current_density_A_mm2": (4.0, 10.0),
}


def task(
    slots: int = 12,
    pole_pairs: int = 4,
    suspension_pole_pairs: int = 5,
    *,
    sleeve: str = "Carbon fibre, wound",
    shaft: str = "42CrMo4",
    ideal_iron: bool = False,
    duty: dict[str, object] | None = None,
    construction: dict[str, object] | None = None,
) -> Task:
    """A drive of 11 kW at 48 000 r/min with the stated family.

    `ideal_iron` gives the sheets a relative permeability of ten million up to 30 T.
    """
    steel = materials.load(ElectricalSteel, "NO20-1200")
    if ideal_iron:
        top = 30.0 / (1e7 * MU_0)
        steel = replace(steel, magnetization=MagnetizationCurve([0.0, top], [0.0, 30.0]))
    return Task(
        winding=design_winding(slots, pole_pairs, suspension_pole_pairs),
        duty=replace(Duty(power=11e3, speed=48_000 * 2 * pi / 60), **(duty or {})),
        materials=MaterialSet(
            stator_steel=steel,
            rotor_steel=steel,
            magnet=materials.load(Magnet, "REFeB 300/160"),
            conductor=materials.load(Conductor, "Copper"),
            sleeve=materials.load(SleeveMaterial, sleeve),
            shaft=materials.load(ShaftSteel, shaft),
        ),
        prices=Prices(
            electrical_steel=Price(4.0, waste_share=0.5),
            copper=Price(11.0),
            magnet=Price(90.0),
            sleeve=Price(60.0),
        ),
        construction=Construction(**(construction or {})),
    )


def designs(rows: int = 1, **changes: float | FloatArray) -> dict[str, FloatArray]:
    """`rows` copies of `DESIGN`, with some variables changed."""
    return {
        name: np.broadcast_to(np.asarray(value, dtype=np.float64), (rows,)).copy()
        for name, value in {**DESIGN, **changes}.items()
    }


def scattered(rows: int, seed: int = 0) -> dict[str, FloatArray]:
    """`rows` designs spread evenly at random over `BOUNDS`; nearly all are real cross-sections."""
    generator = np.random.default_rng(seed)
    return {name: generator.uniform(low, high, rows) for name, (low, high) in BOUNDS.items()}


def sections(of: Task, batch: dict[str, FloatArray]) -> CrossSections:
    """Cross-sections of a batch in which every design must be one."""
    found, valid, reasons = cross_sections(of.winding.family, batch, of.construction)
    assert valid.size == reasons.size, reasons
    return found


def plain_machine(
    slots: int, pole_pairs: int, suspension_pole_pairs: int, **changes: float
) -> tuple[CrossSections, Winding]:
    """Cross-section and winding of `PLAIN`, with some variables changed, in the usual task."""
    of = task(slots, pole_pairs, suspension_pole_pairs)
    return sections(of, designs(**{**PLAIN, **changes})), of.winding
