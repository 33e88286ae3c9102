"""Slotless machines with perfect iron, whose fields are known in closed form."""

from __future__ import annotations

from collections.abc import Callable

import machines
import numpy as np
import pytest

from evaluators.finite_element.mesh.lattice import Lattice, Resolution
from evaluators.finite_element.model import Discretisation, FieldModel
from evaluators.finite_element.rotor.uniform import NU_0
from evaluators.finite_element.solution.batch import BatchField
from evaluators.finite_element.solution.lanes import LANES
from evaluators.finite_element.solution.system import CurveTable, Topology
from evaluators.machine.geometry.cross_sections import CrossSections

PERFECT = 1e9  # relative permeability; its magnetic voltage is 1e-7 of the gap's

SlotlessMaker = Callable[..., BatchField]


def slotless(
    numbers: machines.Numbers,
    core: float,
    magnet: float,
    bore: float,
    *,
    recoil: float = 1.05,
    magnetisation: str = "radial",
    refinement: int = 1,
    fundamental_only: bool = False,
) -> BatchField:
    """A machine without slots: radii in mm, magnets of 1.2 T over 0.8 of the pole pitch."""
    task = machines.task(*numbers, construction={"magnetisation": magnetisation})
    model = FieldModel(task, Discretisation(resolution=Resolution().refined(refinement)))
    for name in ("torque", "suspension"):
        sector = getattr(model.symmetry, name)
        lattice = Lattice(model.resolution, sector)
        setattr(model, name, Topology(lattice, iron=np.ones_like(lattice.iron)))
    model.stator_curve = CurveTable.linear(PERFECT)
    model.recoil, model.remanence = recoil, 1.2

    def lanes(value: float) -> np.ndarray:
        return np.full(LANES, value * 1e-3)

    sections = CrossSections(
        family=task.winding.family,
        shaft_radius=lanes(0.4 * core),
        core_radius=lanes(core),
        magnet_radius=lanes(magnet),
        rotor_radius=lanes(0.5 * (magnet + bore)),
        bore_radius=lanes(bore),
        tip_radius=lanes(bore + 1.0),
        wedge_radius=lanes(bore + 2.0),
        slot_radius=lanes(1.5 * bore),
        outer_radius=lanes(1.8 * bore),
        tooth_width=lanes(np.pi * bore / numbers[0]),
        tip_half_width=lanes(0.6 * np.pi * bore / numbers[0]),
        magnet_arc_ratio=np.full(LANES, 0.8),
    )
    batch = BatchField(model, sections)
    if fundamental_only:
        keep = (model.magnet_orders == model.pole_pairs)[:, None]
        batch.remanence = (batch.remanence[0] * keep, batch.remanence[1] * keep)
    batch.set_rotor_iron(np.full_like(batch.reluctivity, NU_0 / PERFECT))
    return batch


@pytest.fixture(scope="session")
def slotless_machine() -> SlotlessMaker:
    """Function that makes a slotless machine."""
    return slotless
