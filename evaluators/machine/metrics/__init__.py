"""The registry of metrics: every number an evaluation returns, with unit, meaning and source.

Tables, documents, the study file's checks and `hovergap metrics` are made from it.
"""

from evaluators.machine.metrics import circuit, electromagnetic, heat, rotor, size
from evaluators.machine.metrics.definition import Metric

__all__ = ["METRIC", "METRICS", "Metric"]

METRICS: tuple[Metric, ...] = (
    *electromagnetic.METRICS,
    *circuit.METRICS,
    *rotor.METRICS,
    *heat.METRICS,
    *size.METRICS,
)
"""All metrics, in the order in which tables show them."""

METRIC: dict[str, Metric] = {metric.name: metric for metric in METRICS}
