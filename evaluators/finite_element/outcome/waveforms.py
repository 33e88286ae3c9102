"""Waveforms of one design over one turn of the rotor, and force against suspension current."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from evaluators.batching import one_machine
from evaluators.finite_element import analysis
from evaluators.finite_element.model import FieldModel
from evaluators.finite_element.outcome import nonlinear_force
from evaluators.finite_element.outcome.emf import emf, phase_linkage
from evaluators.finite_element.outcome.quantities import suspension_force
from evaluators.finite_element.solution.lanes import LANES
from evaluators.interface import Waveform
from evaluators.machine.field import Excitation
from evaluators.turning import TurningMachine

SHARES = np.arange(1, LANES + 1) / LANES
"""Suspension currents of the force curve over the whole slot current, one a lane."""


def waveforms(model: FieldModel, design: Mapping[str, float]) -> tuple[Waveform, ...]:
    """Those of `TurningMachine`, and the force curve.

    The EMF is without currents induced in the rotor.

    Raises
    ------
    ValueError
        If the design has no cross-section.
    """
    task = model.task
    sections, exciting = one_machine(task, design)
    lanes = np.zeros(LANES, dtype=np.int64)
    current = exciting.rows(lanes)
    fields = analysis.solve(model, sections.rows(lanes), current)
    result = analysis.evaluate(fields, current)
    family = task.winding.family
    forward = family.suspension_pole_pairs > family.pole_pairs
    phasors = [
        current.suspension * result.force.command(direction, forward)
        for direction in (0.0, 0.5 * np.pi)
    ]
    along_x, along_y = (result.force.at(phasor)[:, 0] for phasor in phasors)
    turn = TurningMachine(
        pole_pairs=family.pole_pairs,
        torque=np.tile(result.torque[:, 0], 6 * family.pole_pairs),
        cogging=np.tile(result.cogging[:, 0], family.cogging_periods),
        commanded=(along_x, along_y),
        rest=result.force.rest[:, 0],
        command=(complex(phasors[0][0]), complex(phasors[1][0])),
        emf=emf(phase_linkage(fields.batch, fields.unloaded), task.duty.speed)[:, 0],
    )
    return (*turn.waveforms(), *force_curve(fields, current, forward))


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
