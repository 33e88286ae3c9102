"""Damped Newton iteration for a batch of designs, each lane on its own.

The equations are the gradient of a convex energy (H rises with B), so the derivative of the energy
along a step tells whether the step goes too far: it is negative at the start and zero at the lowest
point of the line. A step that overshoots by more than half is shortened to where the secant through
both derivatives vanishes. Near the solution full steps pass this test and the iteration converges
quadratically.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.solution import factor
from evaluators.finite_element.solution.lanes import LANES
from evaluators.finite_element.solution.system import System

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

OVERSHOOT = 0.5
"""A step is taken if the energy's slope at its end is at most this share of that at its start."""


class LinearSolver(Protocol):
    """Solves with the tangent of a batch; made once per topology."""

    def factorise(self, values: FloatArray) -> None:
        """Factorise entries (entries, LANES) of the pattern."""
        ...

    def solve(self, load: FloatArray) -> FloatArray:
        """Solution (size, LANES) for a right-hand side of that shape."""
        ...


class BatchSolver:
    """LDL^T of all lanes at once."""

    def __init__(self, pattern: factor.Pattern) -> None:
        self.pattern = pattern
        self._lower = np.empty((pattern.index.size, LANES))
        self._diagonal = np.empty((pattern.size, LANES))
        self._work = np.empty((pattern.size, factor.PANEL, LANES))

    def factorise(self, values: FloatArray) -> None:
        """Factorise entries (entries, LANES) of the pattern."""
        factor.factorise(  # type: ignore[call-arg]
            values, *self.pattern.tables, self._lower, self._diagonal, self._work
        )

    def solve(self, load: FloatArray) -> FloatArray:
        """Solution (size, LANES) for a right-hand side of that shape."""
        x = load.copy()
        factor.solve(self.pattern.start, self.pattern.index, self._lower, self._diagonal, x)
        return x


@dataclass
class Convergence:
    """Lanes that converged, and the norm of the residual (LANES,) before every iteration."""

    converged: BoolArray
    history: list[FloatArray]


@dataclass(frozen=True)
class Settings:
    """When to stop.

    Attributes
    ----------
    tolerance : float
        Estimated error of the potential over the potential, both in the Euclidean norm. A step
        reduces the error at least as much as the step before it did, so step^2/step before is an
        upper estimate of what is left. What is left differs from one rotor position to the next
        and so adds to dB/dt: at 1e-4 up to 1 % of the teeth's iron loss, at 3e-5 a tenth of that.
    iterations : int
        After which a lane counts as not converged.
    """

    tolerance: float = 3e-5
    iterations: int = 60


def solve(
    system: System,
    solver: LinearSolver,
    potential: FloatArray,
    load: FloatArray,
    settings: Settings,
) -> tuple[FloatArray, Convergence]:
    """Solve K(A) A = load from a start, both (size, LANES)."""
    potential = potential.copy()
    active: BoolArray = np.ones(LANES, dtype=np.bool_)
    fresh: BoolArray = np.ones(LANES, dtype=np.bool_)  # trial is an accepted point
    step_length = np.ones(LANES)
    direction = np.zeros_like(potential)
    slope = np.zeros(LANES)
    before = np.zeros(LANES)
    trial = potential.copy()
    history: list[FloatArray] = []
    for _ in range(settings.iterations):
        residual, values = system.tangent(trial, load)
        solver.factorise(values)
        history.append(np.linalg.norm(residual, axis=0))
        new_slope = _dot(direction, residual)
        good = np.abs(new_slope) <= OVERSHOOT * np.abs(slope)
        accepted = active & (fresh | good | (new_slope <= 0.0))
        rejected = active & ~accepted
        potential[:, accepted] = trial[:, accepted]
        step = solver.solve(-residual)
        direction[:, accepted] = step[:, accepted]
        with np.errstate(invalid="ignore", divide="ignore"):
            shorter = np.clip(slope / (slope - new_slope), 0.1, 0.7)
        step_length = np.where(rejected, step_length * shorter, 1.0)
        slope = np.where(accepted, _dot(direction, residual), slope)
        size = np.linalg.norm(direction, axis=0)
        scale = np.linalg.norm(potential, axis=0)
        with np.errstate(invalid="ignore", divide="ignore"):
            left = size * np.fmin(1.0, size / before)
        finished = accepted & (left <= settings.tolerance * scale)
        before = np.where(accepted, size, before)
        potential[:, finished] += direction[:, finished]
        active &= ~finished
        fresh = np.zeros(LANES, dtype=np.bool_)
        if not np.any(active):
            break
        trial = potential + np.where(active, step_length, 0.0) * direction
    converged = ~active & np.isfinite(np.linalg.norm(potential, axis=0))
    return potential, Convergence(converged, history)


def _dot(a: FloatArray, b: FloatArray) -> FloatArray:
    return np.asarray(np.einsum("il,il->l", a, b))
