"""One design solved by the analytic model step by step, for tests that look inside."""

from __future__ import annotations

import machines
import numpy as np
from numpy.typing import NDArray

from evaluators.analytic.model import AnalyticModel, Resolution
from evaluators.analytic.motion import Motion
from evaluators.analytic.waves import Waves
from evaluators.machine.field import Excitation, FieldSolution, excitation
from evaluators.machine.geometry.cross_sections import CrossSections

FloatArray = NDArray[np.float64]

# Few modes: laws hold for every resolution.
COARSE = Resolution(slot_modes=3, reach=8, highest_order=96, positions=8)


class AnalyticCase:
    """Model, cross-section and excitation of one design."""

    def __init__(
        self,
        numbers: machines.Numbers,
        resolution: Resolution = COARSE,
        *,
        ideal_iron: bool = False,
        duty: dict[str, object] | None = None,
        **changes: float,
    ) -> None:
        self.task = machines.task(*numbers, ideal_iron=ideal_iron, duty=duty)
        self.model = AnalyticModel(self.task, resolution)
        batch = machines.designs(**changes)
        self.sections: CrossSections = machines.sections(self.task, batch)
        self.exciting: Excitation = excitation(
            self.sections,
            batch["current_density_A_mm2"] * 1e6,
            self.task.duty,
            self.task.construction,
        )

    def waves(self) -> Waves:
        return self.model.waves(self.sections, self.exciting)[0]

    def motion(self, positions: FloatArray | None = None) -> Motion:
        return self.model.motion(self.sections, self.waves(), positions)

    def solve(self) -> FieldSolution:
        return self.model.solve(self.sections, self.exciting)


def roomy(slots: int) -> dict[str, float]:
    """A rotor large enough for slots that can be wound, whatever their number."""
    return {"rotor_radius_mm": 20.0 * max(1.0, slots / 15.0)}
