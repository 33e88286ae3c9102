"""Values a metric can take at all, so that a limit beyond them is caught before a search."""

from __future__ import annotations

from evaluators.machine.metrics import METRIC

INFINITE = float("inf")
ABSOLUTE_ZERO_C = -273.15

# Words in the names of metrics that may be negative: differences, and pressures that may turn
# into gaps. All others are magnitudes, ratios of magnitudes, sizes or losses.
SIGNED_WORDS = frozenset({"margin", "window", "tension", "contact", "interference", "knee"})

# No material carries more than about 2.5 T; fields above this are a slip of the unit.
LARGEST_FLUX_DENSITY_T = 5.0

LARGEST = {
    "efficiency": 1.0,
    "copper_fill": 1.0,
    "power_factor": 1.0,
    "force_error_angle_deg": 180.0,
}


def possible_range(metric: str) -> tuple[float, float]:
    """Smallest and largest value `metric` can take, infinite where open."""
    unit, words = METRIC[metric].unit, frozenset(metric.split("_"))
    high = LARGEST.get(metric, INFINITE)
    if unit == "T":
        # A magnet's flux density counts along its magnetisation and is negative once reversed.
        signed = bool(words & (SIGNED_WORDS | {"magnet"}))
        return (-LARGEST_FLUX_DENSITY_T if signed else 0.0), LARGEST_FLUX_DENSITY_T
    if unit == "degC":
        return ABSOLUTE_ZERO_C, high
    return (-INFINITE if words & SIGNED_WORDS else 0.0), high


def range_words(metric: str) -> str:
    """The possible range in words, with the unit."""
    low, high = possible_range(metric)
    unit = METRIC[metric].unit
    unit = "" if unit == "1" else f" {unit}"
    if high == INFINITE:
        return f"not below {low:g}{unit}" if low > -INFINITE else f"any number{unit}"
    return f"between {low:g} and {high:g}{unit}"
