"""The run whose archive the tests look at."""

from __future__ import annotations

from optimizer.settings import Settings

BUDGET = 230  # two generations and a part of the third
SETTINGS = Settings(
    population=100,
    budget=BUDGET,
    seed=7,
    evaluator="toy",
    evaluator_version="3",
    labels={"study": "plates"},
)
