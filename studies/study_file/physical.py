"""Values a metric can take at all, so that a limit beyond them is caught before a search."""

from __future__ import annotations

from evaluators.machine.metrics import METRIC

INFINITE = float("inf")
ABSOLUTE_ZERO_C = -273.15

# No material carries more than about 2.5 T; fields above this are a slip of the unit.
LARGEST_FLUX_DENSITY_T = 5.0

LARGEST = {
    "efficiency": 1.0,
    "copper_fill": 1.0,
    "power_factor": 1.0,
    "force_error_angle_deg": 180.0,
    "force_angle_bias_deg": 180.0,
}


def possible_range(metric: str) -> tuple[float, float]:
    """Smallest and largest value `metric` can take, infinite where open."""
    known = METRIC[metric]
    high = LARGEST.get(metric, INFINITE)
    if known.unit == "T":
        return (-LARGEST_FLUX_DENSITY_T if known.signed else 0.0), LARGEST_FLUX_DENSITY_T
    if known.unit == "degC":
        return ABSOLUTE_ZERO_C, high
    return (-INFINITE if known.signed else 0.0), high


def range_words(metric: str) -> str:
    """The possible range in words, with the unit."""
    low, high = possible_range(metric)
    unit = METRIC[metric].unit
    unit = "" if unit == "1" else f" {unit}"
    if high == INFINITE:
        return f"not below {low:g}{unit}" if low > -INFINITE else f"any number{unit}"
    return f"between {low:g} and {high:g}{unit}"
