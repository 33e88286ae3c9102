"""Waveforms of one design over one turn of the rotor."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from evaluators.analytic.linkage import SAMPLES
from evaluators.analytic.model import AnalyticModel
from evaluators.batching import one_machine
from evaluators.interface import Waveform
from evaluators.turning import TurningMachine


def waveforms(model: AnalyticModel, design: Mapping[str, float]) -> tuple[Waveform, ...]:
    """Those of `TurningMachine`, and flux densities of tooth and yoke over an electrical period.

    Raises
    ------
    ValueError
        If the design has no cross-section.
    """
    task = model.task
    sections, exciting = one_machine(task, design)
    waves, *_ = model.waves(sections, exciting)
    motion = model.motion(sections, waves)
    sectors = model.rotation.sectors
    count = motion.positions.size * sectors
    angle = 2.0 * np.pi * np.arange(count) / count
    along_x, along_y = motion.force_waves(exciting)[0]
    current = exciting.suspension[0]
    command_x, command_y = (
        complex(current * motion.command(direction)[0]) for direction in (0.0, 0.5 * np.pi)
    )
    teeth, yoke = model.linkage.iron_flux(
        waves.magnets, waves.current, waves.phasor, waves.slot, model.rotation
    )
    orders = model.rotation.magnet_orders
    flux = model.linkage.magnet_harmonics(waves.magnets, orders)[0]
    phase = np.exp(1j * orders[:, None] * angle)
    turn = TurningMachine(
        pole_pairs=task.winding.family.pole_pairs,
        torque=np.tile(motion.torque[0], sectors),
        cogging=np.tile(motion.cogging[0], sectors),
        commanded=(along_x, along_y),
        rest=motion.whole_turn()[0][0],
        command=(command_x, command_y),
        emf=np.real(1j * (orders * task.duty.speed * flux) @ phase),
    )
    electrical, period = 2.0 * np.pi * np.arange(SAMPLES) / SAMPLES, "electrical angle, rad"
    tooth, behind = teeth[0, 0] / sections.tooth_width[0], yoke[0, 0] / sections.yoke_thickness[0]
    return (
        *turn.waveforms(),
        Waveform("tooth flux density", "T", period, electrical, tooth),
        Waveform("yoke flux density", "T", period, electrical, behind),
    )
