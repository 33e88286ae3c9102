"""The design variables: what a search may vary, with unit and widest sensible range."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class DesignVariable:
    """One design variable.

    `lowest` and `highest` bound what makes sense at all (both allowed); a study narrows them.
    """

    name: str
    unit: str
    lowest: float
    highest: float
    definition: str


VARIABLES: tuple[DesignVariable, ...] = (
    DesignVariable(
        "rotor_radius_mm", "mm", 2.0, 1000.0, "outer radius of the rotor, over the sleeve"
    ),
    DesignVariable(
        "clearance_mm", "mm", 0.1, 20.0, "radial mechanical clearance from sleeve to bore"
    ),
    DesignVariable("sleeve_thickness_mm", "mm", 0.1, 50.0, "radial thickness of the sleeve"),
    DesignVariable("magnet_thickness_mm", "mm", 0.3, 200.0, "radial thickness of the magnets"),
    DesignVariable(
        "magnet_arc_ratio", "1", 0.3, 1.0, "arc covered by one magnet over the pole pitch"
    ),
    DesignVariable("core_ratio", "1", 0.1, 0.95, "shaft radius over inner radius of the magnets"),
    DesignVariable(
        "tooth_width_ratio",
        "1",
        0.1,
        0.9,
        "width of the parallel-sided tooth body over the chord of one slot pitch at the bore",
    ),
    DesignVariable(
        "tip_span_ratio",
        "1",
        0.2,
        1.95,
        "tip width: up to 1 over the tooth width (pointed tip below 1, straight walls at 1); "
        "above 1 plus the closed share of the straight slot mouth (half-closed slot)",
    ),
    DesignVariable(
        "tip_height_mm", "mm", 0.1, 50.0, "radial height over which the tip keeps its width"
    ),
    DesignVariable(
        "wedge_height_mm",
        "mm",
        0.1,
        50.0,
        "radial height over which the tip width passes to the tooth width",
    ),
    DesignVariable(
        "slot_depth_ratio",
        "1",
        0.02,
        3.0,
        "radial depth of the wound part of the slot over the bore radius",
    ),
    DesignVariable(
        "yoke_ratio",
        "1",
        0.1,
        5.0,
        "yoke thickness over Q * tooth width / (2 pi p): at 1 a sinusoidal pole flux loads yoke "
        "and teeth alike",
    ),
    DesignVariable(
        "current_density_A_mm2",
        "A/mm2",
        0.1,
        60.0,
        "root-mean-square current density of the most loaded conductor, in which the peaks of "
        "torque and suspension current add up",
    ),
)

VARIABLE_NAMES: tuple[str, ...] = tuple(variable.name for variable in VARIABLES)
