"""Waveforms of one design over one turn of the rotor, and force against suspension current."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element import analysis, nonlinear_force
from evaluators.finite_element.lanes import LANES
from evaluators.finite_element.model import FieldModel
from evaluators.finite_element.quantities import suspension_force
from evaluators.interface import Waveform
from evaluators.machine.field import Excitation, excitation
from evaluators.machine.geometry import cross_sections

FloatArray = NDArray[np.float64]

TURN = "rotor angle, rad"
SHARES = np.arange(1, LANES + 1) / LANES
"""Suspension currents of the force curve over the whole slot current, one a lane."""


def waveforms(model: FieldModel, design: Mapping[str, float]) -> tuple[Waveform, ...]:
    """Torque, cogging torque, both force components, and force against suspension current."""
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
    fields = analysis.solve(model, sections.rows(lanes), current)
    result = analysis.evaluate(fields, current)
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
        *force_curve(fields, current, forward),
    )


def force_curve(
    fields: analysis.StaticFields, current: Excitation, forward: bool
) -> tuple[Waveform, Waveform]:
    """Force and its angle error against suspension current, without linearisation.

    Up to the whole slot current on top of the duty's torque current. Mean force over 60 electrical
    degrees while it is commanded along x, and the largest angle between it and its mean there. All
    lanes of the batch must be the same design.
    """
    batch, model = fields.batch, fields.batch.model
    angles = model.angles[::2]
    linear, _ = suspension_force(batch, fields.loaded, fields.small)
    amplitude = (current.torque + current.suspension) * SHARES
    phasor = amplitude * linear.command(0.0, forward)
    source, factor = model.unfold(model.whole)
    start = fields.loaded.nodes[0][source] * factor[:, None]
    solution = nonlinear_force.solve(
        batch, batch.equations(model.whole), angles, current.torque, phasor, start
    )
    force = nonlinear_force.force(batch, solution)
    mean = force.mean(axis=0)
    error = np.degrees(np.abs(np.angle(force * np.conj(mean))).max(axis=0))
    axis = "peak suspension ampere-turns of a coil, A"
    good = solution.converged
    return (
        Waveform(
            "force against suspension current",
            "N/m",
            axis,
            amplitude,
            np.where(good, np.abs(mean), np.nan),
        ),
        Waveform(
            "force error angle against suspension current",
            "deg",
            axis,
            amplitude,
            np.where(good, error, np.nan),
        ),
    )
