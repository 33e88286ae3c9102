"""A lumped heat network for a batch of machines: nodes, conductances, sources, one solution."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from evaluators.machine.quantity import FloatArray


@dataclass
class Network:
    """Conductances between the nodes of n networks of the same shape, and to fixed temperatures.

    Built up by `connect` and `connect_to`; `solve` leaves it as it is.

    Attributes
    ----------
    rows : int
        n, the number of networks.
    nodes : tuple of str
        Names of the nodes whose temperatures are sought.
    """

    rows: int
    nodes: tuple[str, ...]
    _matrix: FloatArray = field(init=False, repr=False)
    _load: FloatArray = field(init=False, repr=False)

    def __post_init__(self) -> None:
        count = len(self.nodes)
        self._matrix = np.zeros((self.rows, count, count))
        self._load = np.zeros((self.rows, count))

    def connect(self, first: str, second: str, conductance: FloatArray) -> None:
        """Join two nodes by a conductance (n,) in W/K."""
        i, j = self.nodes.index(first), self.nodes.index(second)
        self._matrix[:, i, i] += conductance
        self._matrix[:, j, j] += conductance
        self._matrix[:, i, j] -= conductance
        self._matrix[:, j, i] -= conductance

    def connect_to(
        self, node: str, temperature: FloatArray | float, conductance: FloatArray
    ) -> None:
        """Join a node to a fixed temperature (degC) by a conductance (n,) in W/K."""
        i = self.nodes.index(node)
        self._matrix[:, i, i] += conductance
        self._load[:, i] += conductance * temperature

    def solve(self, sources: FloatArray, slopes: FloatArray | None = None) -> FloatArray:
        """Return the temperatures of all nodes, (n, nodes), degC.

        Parameters
        ----------
        sources : array (n, nodes)
            Heat set free in each node in W; with `slopes`, what it would be at 0 degC.
        slopes : array (n, nodes), optional
            Growth of the sources with the temperature of their own node, W/K.
        """
        matrix = self._matrix
        if slopes is not None:
            matrix = matrix.copy()
            diagonal = np.arange(len(self.nodes))
            matrix[:, diagonal, diagonal] -= slopes
        return np.asarray(np.linalg.solve(matrix, (self._load + sources)[..., None])[..., 0])

    def outflow(self, temperatures: FloatArray) -> FloatArray:
        """Return the heat that leaves to the fixed temperatures in W, (n,)."""
        flow = np.einsum("nij,nj->ni", self._matrix, temperatures) - self._load
        return np.asarray(flow.sum(axis=1))


def series(*resistances: FloatArray | float) -> FloatArray:
    """Return the conductance of resistances in series, by definition the inverse sum; W/K, K/W."""
    total: FloatArray = np.asarray(0.0)
    for resistance in resistances:
        total = np.asarray(total + resistance)
    return np.asarray(1.0 / total)
