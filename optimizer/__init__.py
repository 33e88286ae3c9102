"""Constrained multi-objective search over arrays, with its archive; it knows no machines."""
