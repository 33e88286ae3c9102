"""Values a metric can take at all, so that a limit beyond them is caught before a search."""

from __future__ import annotations

from evaluators.machine.metrics import METRIC

INFINITE = float("inf")

# Metrics that may be negative. All others are magnitudes, ratios of magnitudes, sizes or losses.
SIGNED = frozenset({"contact_pressure_MPa", "magnet_flux_density_T"})

# No material carries more than about 2.5 T; fields above this are a slip of the unit.
LARGEST_FLUX_DENSITY_T = 5.0

LARGEST = {
    "efficiency": 1.0,
    "force_error_angle_deg": 180.0,
}


def possible_range(metric: str) -> tuple[float, float]:
    """Smallest and largest value `metric` can take, infinite where open."""
    low = -INFINITE if metric in SIGNED else 0.0
    high = LARGEST.get(metric, INFINITE)
    if METRIC[metric].unit == "T":
        high = LARGEST_FLUX_DENSITY_T
        low = -LARGEST_FLUX_DENSITY_T if metric in SIGNED else 0.0
    return low, high


def range_words(metric: str) -> str:
    """The possible range in words, with the unit."""
    low, high = possible_range(metric)
    unit = METRIC[metric].unit
    unit = "" if unit == "1" else f" {unit}"
    if high == INFINITE:
        return f"not below {low:g}{unit}" if low > -INFINITE else f"any number{unit}"
    return f"between {low:g} and {high:g}{unit}"
