"""Waveforms of one design over one turn of the rotor."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from evaluators.analytic.linkage import SAMPLES
from evaluators.analytic.model import AnalyticModel
from evaluators.interface import Waveform
from evaluators.machine.field import excitation
from evaluators.machine.geometry.cross_sections import cross_sections


def waveforms(model: AnalyticModel, design: Mapping[str, float]) -> tuple[Waveform, ...]:
    """Torque, cogging, forces with the currents that command them, EMF, iron flux densities.

    The force is given without suspension current and with the one that commands a mean force along
    x, and along y. That current, as ampere-turns of one coil of phase one, keeps its phase to the
    rotor: what a controller must add to the rotor angle can be read from it.
    """
    task = model.task
    batch = {name: np.array([float(value)]) for name, value in design.items()}
    sections, valid, reasons = cross_sections(task.winding.family, batch, task.construction)
    if not valid.size:
        raise ValueError(str(reasons[0]))
    density = batch["current_density_A_mm2"] * 1e6
    exciting = excitation(sections, density, task.duty, task.construction)
    waves, *_ = model.waves(sections, exciting)
    motion = model.motion(sections, waves)
    sectors = model.rotation.sectors
    count = motion.positions.size * sectors
    angle = 2.0 * np.pi * np.arange(count) / count
    rest = motion.whole_turn()[0][0]
    force_x, force_y = motion.force_waves(exciting)[0]
    turning = np.exp(1j * task.winding.family.pole_pairs * angle)
    command_x, command_y = (
        np.real(exciting.suspension[0] * motion.command(direction)[0] * turning)
        for direction in (0.0, 0.5 * np.pi)
    )
    teeth, yoke = model.linkage.iron_flux(
        waves.magnets, waves.current, waves.phasor, waves.slot, model.rotation
    )
    orders = model.rotation.magnet_orders
    flux = model.linkage.magnet_harmonics(waves.magnets, orders)[0]
    phase = np.exp(1j * orders[:, None] * angle)
    emf = np.real(1j * (orders * task.duty.speed * flux) @ phase)
    electrical = 2.0 * np.pi * np.arange(SAMPLES) / SAMPLES
    turn, period = "rotor angle, rad", "electrical angle, rad"

    def over_turn(
        name: str, unit: str, values: np.ndarray[tuple[int], np.dtype[np.float64]]
    ) -> Waveform:
        return Waveform(name, unit, turn, angle, values)

    return (
        over_turn("torque", "N m/m", np.tile(motion.torque[0], sectors)),
        over_turn("cogging torque", "N m/m", np.tile(motion.cogging[0], sectors)),
        over_turn("force along x, commanded along x", "N/m", np.real(force_x)),
        over_turn("force along y, commanded along x", "N/m", np.imag(force_x)),
        over_turn("force along x, commanded along y", "N/m", np.real(force_y)),
        over_turn("force along y, commanded along y", "N/m", np.imag(force_y)),
        over_turn("force along x, no suspension current", "N/m", np.real(rest)),
        over_turn("force along y, no suspension current", "N/m", np.imag(rest)),
        over_turn("suspension current of phase one, commanded along x", "A turns", command_x),
        over_turn("suspension current of phase one, commanded along y", "A turns", command_y),
        over_turn("EMF of phase one per turn of a coil", "V/m", emf),
        Waveform(
            "tooth flux density",
            "T",
            period,
            electrical,
            teeth[0, 0] / sections.tooth_width[0],
        ),
        Waveform(
            "yoke flux density",
            "T",
            period,
            electrical,
            yoke[0, 0] / sections.yoke_thickness[0],
        ),
    )
