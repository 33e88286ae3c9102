"""Random designs of every family of the shipped studies, for tests of an evaluator over all."""

from __future__ import annotations

import os
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.geometry.cross_sections import cross_sections
from evaluators.machine.geometry.variables import VARIABLE_NAMES
from evaluators.machine.task.task import Task
from studies.shipped.library import find_study, shipped
from studies.study_file.definition import Study

FloatArray = NDArray[np.float64]

STUDIES = {name: find_study(name) for name in shipped()}


class Case(NamedTuple):
    """One family of one study."""

    study: str
    family: str

    @property
    def of(self) -> Study:
        return STUDIES[self.study]

    @property
    def bounds(self) -> dict[str, tuple[float, float]]:
        return {name: self.of.bounds[self.family][name] for name in VARIABLE_NAMES}

    def task(self) -> Task:
        return self.of.task(self.family)

    def random(self, rows: int, seed: int) -> dict[str, FloatArray]:
        """`rows` designs spread evenly at random over the box."""
        generator = np.random.default_rng(seed)
        return {name: generator.uniform(*bounds, rows) for name, bounds in self.bounds.items()}

    def valid(self, rows: int, seed: int) -> dict[str, FloatArray]:
        """The first `rows` random designs that are cross-sections."""
        task = self.task()
        batch = self.random(40 * rows, seed)
        found = cross_sections(task.winding.family, batch, task.construction)[1][:rows]
        assert found.size == rows, f"{self}: only {found.size} of {40 * rows} are cross-sections"
        return {name: column[found] for name, column in batch.items()}


CASES = tuple(Case(name, family) for name, study in STUDIES.items() for family in study.families)
LABELS = tuple(" ".join(case) for case in CASES)


def number_from_environment(name: str, default: int) -> int:
    """A whole number that the environment may change, for tests that take as long as one lets."""
    return int(os.environ.get(name, default))
