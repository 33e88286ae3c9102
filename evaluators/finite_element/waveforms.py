"""Waveforms of one design over one turn of the rotor."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element import static
from evaluators.finite_element.lanes import LANES
from evaluators.finite_element.model import FieldModel
from evaluators.interface import Waveform
from evaluators.machine.field import Excitation, excitation
from evaluators.machine.geometry import cross_sections

FloatArray = NDArray[np.float64]

TURN = "rotor angle, rad"


def waveforms(model: FieldModel, design: Mapping[str, float]) -> tuple[Waveform, ...]:
    """Torque, cogging torque and both force components, commanded along x."""
    task = model.task
    batch = {name: np.array([float(value)]) for name, value in design.items()}
    sections, valid, reasons = cross_sections(task.winding.family, batch, task.construction)
    if not valid.size:
        raise ValueError(str(reasons[0]))
    exciting = excitation(
        sections, batch["current_density_A_mm2"] * 1e6, task.duty, task.construction
    )
    lanes = np.zeros(LANES, dtype=np.int64)
    current = Excitation(exciting.torque[lanes], exciting.suspension[lanes])
    result = static.evaluate(static.solve(model, sections.rows(lanes), current), current)
    family = task.winding.family
    forward = family.suspension_pole_pairs > family.pole_pairs
    force = result.force.at(current.suspension * result.force.command(0.0, forward))[:, 0]

    def over_turn(name: str, unit: str, values: FloatArray) -> Waveform:
        angle = 2.0 * np.pi * np.arange(values.size) / values.size
        return Waveform(name, unit, TURN, angle, values)

    return (
        over_turn("torque", "N m/m", np.tile(result.torque[:, 0], 6 * family.pole_pairs)),
        over_turn("cogging torque", "N m/m", np.tile(result.cogging[:, 0], family.cogging_periods)),
        over_turn("force along x, commanded along x", "N/m", force.real),
        over_turn("force along y, commanded along x", "N/m", force.imag),
    )
