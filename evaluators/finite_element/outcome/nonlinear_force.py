"""Force against suspension current without linearisation, up to the whole slot current.

Torque and suspension field share no sector, so the whole circle is solved, with the torque current
kept and the suspension current as strong as wanted.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.outcome import stress
from evaluators.finite_element.solution.batch import BatchField, Equations, Solution

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]


def solve(
    batch: BatchField,
    equations: Equations,
    angles: FloatArray,
    torque: FloatArray,
    suspension: ComplexArray,
    start: FloatArray | None = None,
) -> Solution:
    """Field of magnets, torque and suspension current at rotor `angles` (t,).

    Parameters
    ----------
    equations : Equations
        Of `FieldModel.whole`.
    torque : array (LANES,)
        Peak ampere-turns of a coil.
    suspension : array (LANES,), complex
        Phasor of the suspension ampere-turns; it turns with exp(j p angle).
    """
    model = batch.model
    slot = model.task.winding.suspension_slot_mmf
    phasor = np.exp(1j * model.pole_pairs * angles)
    control = np.real(np.einsum("t,s,l->tsl", phasor, slot, suspension))
    main = batch.torque_currents(angles, torque, model.slots)
    return batch.solve(equations, angles, main + control, start)


def force(batch: BatchField, solution: Solution) -> ComplexArray:
    """Force F_x + j F_y of a field of the whole circle, (t, LANES), N/m."""
    waves = solution.waves
    highest = batch.highest_wave
    radius = batch.sections.bore_radius
    field = stress.rotating(
        stress.spread(waves.orders, waves.potential, highest),
        stress.spread(waves.orders, waves.tangential, highest),
        radius,
    )
    return stress.pair(field, field, radius)
