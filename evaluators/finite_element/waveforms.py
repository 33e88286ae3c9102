"""Waveforms of one design over one turn of the rotor."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element import analysis
from evaluators.finite_element.lanes import LANES
from evaluators.finite_element.model import FieldModel
from evaluators.interface import Waveform
from evaluators.machine.field import Excitation, excitation
from evaluators.machine.geometry import cross_sections

FloatArray = NDArray[np.float64]

TURN = "rotor angle, rad"


def waveforms(model: FieldModel, design: Mapping[str, float]) -> tuple[Waveform, ...]:
    """Torque, cogging torque, and forces with the suspension currents that command them.

    The force is given without suspension current and with the one that commands a mean force along
    x, and along y; that current as ampere-turns of one coil of phase one.
    """
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
    result = analysis.evaluate(analysis.solve(model, sections.rows(lanes), current), current)
    family = task.winding.family
    forward = family.suspension_pole_pairs > family.pole_pairs
    commands = {
        name: current.suspension * result.force.command(direction, forward)
        for name, direction in (("x", 0.0), ("y", 0.5 * np.pi))
    }
    forces = {name: result.force.at(phasor)[:, 0] for name, phasor in commands.items()}
    turning = np.exp(1j * family.pole_pairs * result.force.angles)

    def over_turn(name: str, unit: str, values: FloatArray) -> Waveform:
        angle = 2.0 * np.pi * np.arange(values.size) / values.size
        return Waveform(name, unit, TURN, angle, values)

    return (
        over_turn("torque", "N m/m", np.tile(result.torque[:, 0], 6 * family.pole_pairs)),
        over_turn("cogging torque", "N m/m", np.tile(result.cogging[:, 0], family.cogging_periods)),
        *(
            over_turn(f"force along {along}, commanded along {name}", "N/m", part)
            for name, force in forces.items()
            for along, part in (("x", force.real), ("y", force.imag))
        ),
        over_turn("force along x, no suspension current", "N/m", result.force.rest[:, 0].real),
        over_turn("force along y, no suspension current", "N/m", result.force.rest[:, 0].imag),
        *(
            over_turn(
                f"suspension current of phase one, commanded along {name}",
                "A turns",
                np.real(phasor[0] * turning),
            )
            for name, phasor in commands.items()
        ),
    )
