"""Field harmonics on the bore as the rotor sees them: order, and frequency in its frame.

Coefficients of the field at rotor positions over 60 electrical degrees repeat themselves up to a
phase afterwards (`symmetry.py`), so that a Fourier transform over the positions gives amplitudes of
exp(j n phi - j tau p theta), theta being the angle of the rotor: n - tau p cycles a turn against
the rotor, and one more p of them for a field that turns as exp(j p theta) besides.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.finite_element.model import FieldModel

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]


@dataclass(frozen=True)
class Harmonics:
    """Harmonics of a field at rotor positions over 60 electrical degrees.

    Attributes
    ----------
    orders : array (m,)
        Signed.
    first : array (m,)
        Each order's time dependence is exp(-j tau p angle) with tau = first - 6 i.
    speed : array (t, m)
        Angular speed against the rotor, rad/s; row i as in `numpy.fft.fftfreq`.
    angles : array (t,)
        Rotor positions, rad.
    pole_pairs : int
    real : bool
        Whether the field is real, so that its orders are positive and their conjugates go without
        saying.
    """

    orders: IntArray
    first: IntArray
    speed: FloatArray
    angles: FloatArray
    pole_pairs: int
    real: bool

    @classmethod
    def torque(cls, model: FieldModel, orders: IntArray, angles: FloatArray) -> Harmonics:
        """Harmonics of the torque field, a real field: positive orders suffice."""
        shift = int(model.symmetry.torque_shift[1])
        factor = int(model.symmetry.torque_sign[1]) * np.exp(-1j * orders * model.pitch * shift)
        return cls._of(model, orders, angles, factor, besides=0, real=True)

    @classmethod
    def suspension(cls, model: FieldModel, orders: IntArray, angles: FloatArray) -> Harmonics:
        """Harmonics of the complex suspension field: positive `orders`, then their negatives.

        The suspension currents turn as exp(j p angle) besides the field's coefficients. After a
        sixth the picture has turned by j slots, and the currents are C[s + j] = C[s] exp(j beta).
        """
        signed = np.concatenate([orders, -orders])
        shift = int(model.symmetry.shift[1])
        currents = model.task.winding.suspension_slot_mmf
        used = int(np.argmax(np.abs(currents)))
        beta = currents[(used + shift) % model.slots] / currents[used]
        factor = beta * np.exp(-1j * signed * model.pitch * shift)
        return cls._of(model, signed, angles, factor, besides=model.pole_pairs, real=False)

    @classmethod
    def _of(
        cls,
        model: FieldModel,
        orders: IntArray,
        angles: FloatArray,
        factor: ComplexArray,
        *,
        besides: int,
        real: bool,
    ) -> Harmonics:
        first = np.rint(-np.angle(factor) / (np.pi / 3.0)).astype(np.int64)
        step = np.fft.fftfreq(angles.size, 1.0 / angles.size).astype(np.int64)
        turns = orders - model.pole_pairs * (first - 6 * step[:, None]) + besides
        speed = turns * model.task.duty.speed
        return cls(orders, first, speed, angles, model.pole_pairs, real)

    def analyse(self, values: ComplexArray) -> ComplexArray:
        """Amplitudes (t, m, LANES) of coefficients over the positions (t, m, LANES)."""
        return np.asarray(np.fft.fft(values * self._still, axis=0) / self.angles.size)

    def synthesise(self, amplitudes: ComplexArray) -> ComplexArray:
        """Inverse of `analyse`."""
        return np.asarray(np.fft.ifft(amplitudes * self.angles.size, axis=0) * np.conj(self._still))

    @property
    def _still(self) -> ComplexArray:
        turned = np.outer(self.angles, self.first * self.pole_pairs)
        return np.asarray(np.exp(1j * turned)[:, :, None])
