"""The search itself: a population with one member for each weight vector.

A decomposition-based evolutionary algorithm after Zhang and Li, IEEE Trans. Evol. Comput. 11
(2007) 712-731, with limited replacement (Li and Zhang, same journal 13 (2009) 284-302), children
sent to the weight they serve best (Wang et al., same journal 20 (2016) 475-480) and an epsilon
comparison of constraints (Takahama and Sakai, CEC 2006, 1-8). The result is the front of all
feasible designs ever told, not the population.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from optimizer.errors import ProblemError
from optimizer.fronts import Front
from optimizer.problem import AnyArray, FloatArray, Outcome, Variable
from optimizer.search.population import Population, Scale
from optimizer.search.variation import (
    differential,
    draw_pairs,
    latin_hypercube,
    polynomial_mutation,
    simulated_binary,
)
from optimizer.search.weights import neighbourhoods, weight_vectors

MATING = 30  # nearest weights whose members are mates
MATING_NEAR = 0.9  # chance that the mates are taken from there, not from everywhere
# Children are rounded to this many steps a unit, so that the last bit of a power function,
# which differs between processors and library versions, does not decide a design.
_STEPS = 2.0**40
_ATTEMPTS = 10  # to find another design for one that would repeat itself by rounding to integers


@dataclass(frozen=True)
class SearchState:
    """Everything needed to go on: plain arrays, and values that JSON can hold."""

    arrays: dict[str, AnyArray]
    values: dict[str, Any]


class DecompositionSearch:
    """Ask for designs, tell what they gave; the same seed gives the same designs.

    Parameters
    ----------
    variables : sequence of Variable
        Fixed ones keep their value and take no part. Each value of an integer has an equal share
        of the unit interval and stands at the middle of it, so parents are what was evaluated.
    objectives, constraints : int
        Numbers of columns of each outcome.
    seed : int
    population : int, optional
        Wanted size; see :func:`optimizer.search.weights.weight_vectors`.

    Examples
    --------
    >>> import numpy as np
    >>> from optimizer.problem import Outcome, Variable
    >>> search = DecompositionSearch([Variable("x", -1.0, 1.0)], 1, 0, seed=3)
    >>> for _ in range(20):
    ...     x = search.ask()
    ...     search.tell(Outcome(x**2, np.zeros((len(x), 0))))
    >>> bool(search.front.points[0, 0] < 1e-6)
    True
    """

    def __init__(
        self,
        variables: Sequence[Variable],
        objectives: int,
        constraints: int,
        seed: int,
        population: int | None = None,
    ) -> None:
        self._lower = np.array([v.lower for v in variables], dtype=np.float64)
        self._upper = np.array([v.upper for v in variables], dtype=np.float64)
        self._free = np.flatnonzero(self._lower < self._upper)
        if len(self._free) == 0:
            msg = "a search needs at least one variable whose bounds differ"
            raise ProblemError(msg)
        self._whole = np.array([variables[column].integer for column in self._free.tolist()])
        self._values = (self._upper - self._lower)[self._free][self._whole] + 1.0
        weights = weight_vectors(objectives, population)
        self._order = neighbourhoods(weights)
        self._population = Population(weights, self._order, len(self._free), constraints)
        self._scale = Scale(objectives, constraints)
        self._random = np.random.Generator(np.random.PCG64(seed))
        self._asked: FloatArray | None = None
        self.front = Front(objectives)
        self.generation = 0

    @property
    def size(self) -> int:
        """Designs in a generation."""
        return len(self._order)

    @property
    def evaluations(self) -> int:
        """Designs told so far."""
        return self.generation * self.size

    def ask(self) -> FloatArray:
        """Return the designs (N, v) of the next generation; the same ones until they are told."""
        if self._asked is None:
            first = not self._population.filled
            made = latin_hypercube(self.size, len(self._free), self._random)
            self._asked = self._without_repeats(made if first else self._children())
        low, high = self._lower[self._free], self._upper[self._free]
        values = np.clip(low + self._asked * (high - low), low, high)
        share = self._asked[:, self._whole]
        values[:, self._whole] = low[self._whole] + np.floor(share * self._values)
        x = np.tile(self._lower, (self.size, 1))
        x[:, self._free] = values
        return x

    def tell(self, outcome: Outcome) -> None:
        """Take in the outcome of the designs asked for; failed rows leave no trace.

        Raises
        ------
        ProblemError
            If nothing was asked, or the outcome has another number of rows.
        """
        if self._asked is None or len(outcome) != self.size:
            wanted = 0 if self._asked is None else self.size
            msg = f"{len(outcome)} outcomes were told, {wanted} were asked for"
            raise ProblemError(msg)
        ok = outcome.ok
        unit, objectives = self._asked[ok], outcome.objectives[ok]
        constraints = outcome.constraints[ok]
        feasible = outcome.feasible
        numbers = self.evaluations + np.flatnonzero(feasible)
        self.front.add(outcome.objectives[feasible], numbers)
        # Drawn for each row, failed or not, so that the stream of numbers stays in step.
        turn = np.argsort(self._random.random(self.size), kind="stable")
        draws = self._random.random((self.size, self._population.reach))
        shuffle = np.argsort(draws, axis=1, kind="stable")
        if len(unit):
            self._scale.see(constraints)
            if not self._population.filled:
                self._scale.start(constraints, self.generation)
            self._scale.set_objectives(self.front, self._population.objectives, objectives)
            turn = (np.cumsum(ok) - 1)[turn[ok[turn]]]
            born = np.flatnonzero(ok)
            self._population.update(
                unit, objectives, constraints, self._scale, born, turn, shuffle[ok]
            )
        self._scale.relax()
        self._asked = None
        self.generation += 1

    def state(self) -> SearchState:
        """Return a copy of all that decides what comes next."""
        values = {
            "generation": self.generation,
            "random": self._random.bit_generator.state,
            **self._scale.values(),
        }
        arrays = {
            "front_points": self.front.points,
            "front_evaluations": self.front.evaluations,
            "largest_violation": self._scale.largest,
            **self._population.arrays(),
        }
        if self._asked is not None:
            arrays["asked"] = self._asked
        return SearchState({name: array.copy() for name, array in arrays.items()}, values)

    def restore(self, state: SearchState) -> None:
        """Go on from ``state`` of a search made with the same arguments."""
        arrays, values = state.arrays, state.values
        self._population.restore(arrays)
        self._scale.restore(values, arrays["largest_violation"])
        self.front.replace(arrays["front_points"], arrays["front_evaluations"])
        self._random.bit_generator.state = values["random"]
        self.generation = int(values["generation"])
        self._asked = arrays["asked"].copy() if "asked" in arrays else None

    def _rounded(self, unit: FloatArray) -> FloatArray:
        whole = unit[:, self._whole] * self._values
        unit = unit.copy()
        unit[:, self._whole] = (np.minimum(np.floor(whole), self._values - 1) + 0.5) / self._values
        return np.asarray(np.round(unit * _STEPS) / _STEPS)

    def _without_repeats(self, unit: FloatArray) -> FloatArray:
        """Rounded designs; where integers make two the same, or one a member, it moves on."""
        unit, members = self._rounded(unit), self._population.unit
        if not self._whole.any():
            return unit
        for _ in range(_ATTEMPTS):
            _, first = np.unique(np.concatenate([members, unit]), axis=0, return_index=True)
            new = np.zeros(len(members) + len(unit), dtype=np.bool_)
            new[first] = True
            again = np.flatnonzero(~new[len(members) :])
            if len(again) == 0:
                break
            forced = np.ones(len(again), dtype=np.bool_)
            unit[again] = self._rounded(polynomial_mutation(unit[again], forced, self._random))
        return unit

    def _children(self) -> FloatArray:
        members, random = self._population.unit, self._random
        near = draw_pairs(self._order[:, 1 : MATING + 1], random)
        everyone = draw_pairs(self._order[:, 1:], random)
        mates = np.where(random.random((self.size, 1)) < MATING_NEAR, near, everyone)
        a, b = members[mates[:, 0]], members[mates[:, 1]]
        crossed = simulated_binary(members, a, random)
        moved = differential(members, a, b, random)
        child = np.where(random.random((self.size, 1)) < 0.5, crossed, moved)
        same = (child == members).all(axis=1) | (child == a).all(axis=1)
        return polynomial_mutation(child, same, random)
