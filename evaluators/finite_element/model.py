"""What one task and one resolution fix: sectors, topologies, positions, materials."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.mesh.lattice import Lattice, Resolution
from evaluators.finite_element.mesh.symmetry import Sector, Symmetry, symmetry
from evaluators.finite_element.solution import newton
from evaluators.finite_element.solution.system import CurveTable, Topology
from evaluators.machine.task.task import Task

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


@dataclass(frozen=True)
class Discretisation:
    """How finely space and time are divided.

    Attributes
    ----------
    resolution : Resolution, optional
        Of the stator mesh; left out, `Resolution.suited` to the number of slots.
    positions : int
        Rotor positions in 60 electrical degrees with current.
    cogging_positions : int
        Rotor positions in one cogging period without current.
    orders_per_slot : int
        Highest Fourier order on the bore over the number of slots.
    iron_rings : int
        Rings into which shaft and rotor core each are divided.
    refinement : int
        Cells in every direction over those of `resolution`.
    transient : bool
        Whether currents are induced in the rotor.
    separate_magnets : bool
        Whether the spaces between the magnets are non-magnetic instead of magnet without
        magnetisation.
    newton : newton.Settings
    """

    resolution: Resolution | None = None
    positions: int = 12
    cogging_positions: int = 8
    orders_per_slot: int = 40
    iron_rings: int = 6
    refinement: int = 1
    transient: bool = False
    separate_magnets: bool = False
    newton: newton.Settings = field(default_factory=newton.Settings)

    def __post_init__(self) -> None:
        limits = {
            "positions": (4, 240),
            "cogging_positions": (4, 240),
            "orders_per_slot": (8, 400),
            "iron_rings": (1, 48),
            "refinement": (1, 8),
        }
        for name, (low, high) in limits.items():
            value = getattr(self, name)
            if not low <= value <= high:
                msg = f"{name} = {value} must lie between {low} and {high}"
                raise ValueError(msg)

    def cells(self, slots: int) -> Resolution:
        """Cells of a slot pitch for a machine with `slots` slots."""
        return (self.resolution or Resolution.suited(slots)).refined(self.refinement)

    def refined(self, factor: int) -> Discretisation:
        """Mesh, iron rings and steps `factor` times as fine."""
        return replace(
            self,
            refinement=factor * self.refinement,
            positions=factor * self.positions,
            cogging_positions=factor * self.cogging_positions,
            orders_per_slot=factor * self.orders_per_slot,
            iron_rings=factor * self.iron_rings,
        )


class FieldModel:
    """Everything of a task that does not depend on the design; made once, used for all batches."""

    def __init__(self, task: Task, discretisation: Discretisation) -> None:
        self.task = task
        self.discretisation = discretisation
        family = task.winding.family
        self.resolution = discretisation.cells(family.slots)
        self.slots, self.pole_pairs = family.slots, family.pole_pairs
        self.pitch = 2.0 * np.pi / family.slots
        self.symmetry: Symmetry = symmetry(task.winding)
        self.orders = discretisation.orders_per_slot * family.slots
        materials, conditions = task.materials, task.conditions
        self.stacking = float(materials.stator_steel.stacking_factor.value)
        self.stator_curve = CurveTable.of(
            materials.stator_steel.magnetization.laminated(self.stacking)
        )
        self.rotor_curve = materials.rotor_steel.magnetization.laminated(
            float(materials.rotor_steel.stacking_factor.value)
        )
        self.shaft_curve = materials.shaft.magnetization
        self.remanence = float(materials.magnet.remanence.at(conditions.magnet_temperature))
        self.recoil = float(materials.magnet.recoil_permeability.at(conditions.magnet_temperature))

    @cached_property
    def torque(self) -> Topology:
        """Topology of the sector of the torque field."""
        return Topology(Lattice(self.resolution, self.symmetry.torque))

    @cached_property
    def suspension(self) -> Topology:
        """Topology of the sector of the suspension field."""
        return Topology(Lattice(self.resolution, self.symmetry.suspension))

    @cached_property
    def whole(self) -> Topology:
        """Topology of the whole circle, for torque and suspension field together."""
        sector = Sector(self.slots, 1, 1)
        return Topology(Lattice(self.resolution, sector))

    def unfold(self, target: Topology) -> tuple[IntArray, FloatArray]:
        """Unknown of the torque sector behind each one of a larger sector, and its sign."""
        small, large = self.torque.lattice, target.lattice
        sign = self.symmetry.torque.sign
        source = np.empty(large.size, dtype=np.int64)
        factor = np.empty(large.size)
        column = np.arange(large.columns)
        number = np.broadcast_to(small.node[:, column % small.columns], large.node.shape)
        turns = np.broadcast_to(float(sign) ** (column // small.columns), large.node.shape)
        there = large.node >= 0
        source[large.node[there]] = number[there]
        factor[large.node[there]] = turns[there]
        return source, factor

    @property
    def sixth(self) -> float:
        """Rotor angle of 60 electrical degrees, rad."""
        return float(np.pi / (3 * self.pole_pairs))

    @cached_property
    def angles(self) -> FloatArray:
        """Rotor positions with current, rad: 60 electrical degrees."""
        count = self.discretisation.positions
        return np.asarray(self.sixth * np.arange(count) / count)

    @cached_property
    def cogging_angles(self) -> FloatArray:
        """Rotor positions without current, rad: one cogging period."""
        count = self.discretisation.cogging_positions
        period = 2.0 * np.pi / self.task.winding.family.cogging_periods
        return np.asarray(period * np.arange(count) / count)

    @cached_property
    def magnet_orders(self) -> IntArray:
        """Odd multiples of p up to the highest order."""
        return np.arange(self.pole_pairs, self.orders + 1, 2 * self.pole_pairs)
