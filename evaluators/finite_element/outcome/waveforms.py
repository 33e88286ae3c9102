"""Waveforms of one design over one turn of the rotor, and force against suspension current."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element import analysis
from evaluators.finite_element.model import FieldModel
from evaluators.finite_element.outcome import nonlinear_force
from evaluators.finite_element.outcome.emf import emf, phase_linkage
from evaluators.finite_element.outcome.quantities import suspension_force
from evaluators.finite_element.solution.lanes import LANES
from evaluators.interface import Waveform
from evaluators.machine.field import Excitation, excitation
from evaluators.machine.geometry.cross_sections import cross_sections

FloatArray = NDArray[np.float64]

TURN = "rotor angle, rad"
SHARES = np.arange(1, LANES + 1) / LANES
"""Suspension currents of the force curve over the whole slot current, one a lane."""


def waveforms(model: FieldModel, design: Mapping[str, float]) -> tuple[Waveform, ...]:
    """Torque, cogging, forces with the currents that command them, EMF, and the force curve.

    The force is given without suspension current and with the one that commands a mean force along
    x, and along y. That current, as ampere-turns of one coil of phase one, keeps its phase to the
    rotor. The EMF is that of the magnets alone, without currents induced in the rotor.
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
    fields = analysis.solve(model, sections.rows(lanes), current)
    result = analysis.evaluate(fields, current)
    family = task.winding.family
    forward = family.suspension_pole_pairs > family.pole_pairs
    phasors = [
        current.suspension * result.force.command(direction, forward)
        for direction in (0.0, 0.5 * np.pi)
    ]
    along_x, along_y = (result.force.at(phasor)[:, 0] for phasor in phasors)
    rest = result.force.at(0.0 * phasors[0])[:, 0]
    turn = 2.0 * np.pi * np.arange(rest.size) / rest.size
    command_x, command_y = (
        np.real(phasor[0] * np.exp(1j * family.pole_pairs * turn)) for phasor in phasors
    )
    voltage = emf(phase_linkage(fields.batch, fields.unloaded), task.duty.speed)[:, 0]

    def over_turn(name: str, unit: str, values: FloatArray) -> Waveform:
        angle = 2.0 * np.pi * np.arange(values.size) / values.size
        return Waveform(name, unit, TURN, angle, values)

    return (
        over_turn("torque", "N m/m", np.tile(result.torque[:, 0], 6 * family.pole_pairs)),
        over_turn("cogging torque", "N m/m", np.tile(result.cogging[:, 0], family.cogging_periods)),
        over_turn("force along x, commanded along x", "N/m", along_x.real),
        over_turn("force along y, commanded along x", "N/m", along_x.imag),
        over_turn("force along x, commanded along y", "N/m", along_y.real),
        over_turn("force along y, commanded along y", "N/m", along_y.imag),
        over_turn("force along x, no suspension current", "N/m", rest.real),
        over_turn("force along y, no suspension current", "N/m", rest.imag),
        over_turn("suspension current of phase one, commanded along x", "A turns", command_x),
        over_turn("suspension current of phase one, commanded along y", "A turns", command_y),
        over_turn("EMF of phase one per turn of a coil", "V/m", voltage),
        *force_curve(fields, current, forward),
    )


def force_curve(
    fields: analysis.StaticFields, current: Excitation, forward: bool
) -> tuple[Waveform, Waveform]:
    """Force and its angle error against suspension current, without linearisation.

    Up to the whole slot current on top of the duty's torque current. Mean force over 60 electrical
    degrees while it is commanded along x, and the largest angle between it and its mean there. All
    lanes of the batch must be the same design. The rotor is the uniform one in any case.
    """
    batch, model = fields.batch, fields.batch.model
    angles = model.angles[::2]
    linear, _ = suspension_force(batch, fields.loaded, fields.small, added=fields.added)
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
