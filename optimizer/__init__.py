"""Constrained multi-objective search over arrays, its archive and its fronts; knows nothing of machines."""
