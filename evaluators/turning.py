"""Waveforms over one turn of the rotor that every field model names alike."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.interface import Waveform

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

TURN = "rotor angle, rad"


@dataclass(frozen=True)
class TurningMachine:
    """What one machine does over a turn, at equal steps from rotor angle 0; per metre.

    Attributes
    ----------
    pole_pairs : int
    torque, cogging : arrays
        With torque current and without, N m/m.
    commanded : pair of complex arrays
        Force F_x + j F_y with torque current and the suspension current that commands a mean force
        along x, and along y, N/m.
    rest : complex array
        Force without suspension current, N/m.
    command : pair of complex
        Phasors of those suspension currents at rotor angle 0, ampere-turns of a coil of phase one.
        They keep their phase to the rotor: what a controller must add to the rotor angle can be
        read from them.
    emf : array
        Of phase one by the magnets for one turn per coil, V/m.
    """

    pole_pairs: int
    torque: FloatArray
    cogging: FloatArray
    commanded: tuple[ComplexArray, ComplexArray]
    rest: ComplexArray
    command: tuple[complex, complex]
    emf: FloatArray

    def waveforms(self) -> tuple[Waveform, ...]:
        """All of it under the names that exports and reports look for."""
        angle = np.exp(1j * self.pole_pairs * _angles(self.rest.size))
        forces = [
            _over_turn(f"force along {axis}, commanded along {command}", "N/m", values)
            for command, force in zip("xy", self.commanded, strict=True)
            for axis, values in (("x", force.real), ("y", force.imag))
        ]
        currents = [
            _over_turn(
                f"suspension current of phase one, commanded along {command}",
                "A turns",
                np.real(phasor * angle),
            )
            for command, phasor in zip("xy", self.command, strict=True)
        ]
        return (
            _over_turn("torque", "N m/m", self.torque),
            _over_turn("cogging torque", "N m/m", self.cogging),
            *forces,
            _over_turn("force along x, no suspension current", "N/m", self.rest.real),
            _over_turn("force along y, no suspension current", "N/m", self.rest.imag),
            *currents,
            _over_turn("EMF of phase one per turn of a coil", "V/m", self.emf),
        )


def _angles(count: int) -> FloatArray:
    return 2.0 * np.pi * np.arange(count) / count


def _over_turn(name: str, unit: str, values: FloatArray) -> Waveform:
    return Waveform(name, unit, TURN, _angles(values.size), values)
