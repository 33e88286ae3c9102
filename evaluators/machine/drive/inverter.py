"""Turns, parallel groups and currents for the inverter, and what it must be rated for."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.quantity import FloatArray, floats

SERIES, PARALLEL = 1.0, 2.0


class Turns(NamedTuple):
    """Connection of n windings, arrays (n,)."""

    per_coil: FloatArray
    """Whole turns of one coil."""
    groups: FloatArray
    """Groups a and b of a phase in parallel (2) or in series (1) for the torque current."""


def choose_turns(per_turn: ArrayLike, limit: float, groups: int | None) -> Turns:
    """Return the most turns that the terminal voltage allows (common practice).

    Only the two groups of a phase can be in parallel for torque: their torque EMFs are equal. Two
    coils of one group are never alike in both fields, as p and p+-1 have no common divisor, so
    coils in parallel would short-circuit a part of the suspension voltage.

    Parameters
    ----------
    per_turn : array (n,)
        Largest phase voltage with one turn per coil and all coils in series, V.
    limit : float
        Largest permitted phase voltage, V.
    groups : int or None
        1 or 2 parallel groups; None for the one that uses the voltage better, series if equal.
    """
    voltage = floats(per_turn)
    choices = (SERIES, PARALLEL) if groups is None else (float(groups),)
    best = None
    for paths in choices:
        turns = np.maximum(np.floor(limit * paths / voltage), 1.0)
        use = turns * voltage / paths / limit
        if best is None:
            best, best_use, best_paths = turns, use, np.full_like(voltage, paths)
            continue
        # Above the limit the lower voltage is better, below it the higher.
        better = np.where(best_use > 1.0, use < best_use, (use <= 1.0) & (use > best_use + 1e-9))
        best = np.where(better, turns, best)
        best_use = np.where(better, use, best_use)
        best_paths = np.where(better, paths, best_paths)
    return Turns(per_coil=np.asarray(best), groups=np.asarray(best_paths))


class PhaseVoltage(NamedTuple):
    """Voltages of n machines, peak values, arrays (n,)."""

    torque: FloatArray
    suspension: FloatArray
    power_factor: FloatArray


def phase_voltage(
    emf: ArrayLike,
    resistance: ArrayLike,
    torque_reactance: ArrayLike,
    suspension_reactance: ArrayLike,
    torque_current: ArrayLike,
    suspension_current: ArrayLike,
) -> PhaseVoltage:
    """Return the peak voltages of both currents and the displacement power factor of the torque's.

    Torque current in phase with the EMF, no saliency; the suspension current meets no EMF. Phasor
    diagram of a synchronous machine (common practice).

    Parameters
    ----------
    emf : array (n,)
        Peak, V.
    resistance, torque_reactance, suspension_reactance : array (n,)
        Of one phase, ohm.
    torque_current, suspension_current : array (n,)
        Peak, A.
    """
    active = floats(emf) + floats(resistance) * floats(torque_current)
    torque = np.hypot(active, floats(torque_reactance) * floats(torque_current))
    suspension = floats(suspension_current) * np.hypot(resistance, suspension_reactance)
    return PhaseVoltage(torque, np.asarray(suspension), np.asarray(active / torque))
