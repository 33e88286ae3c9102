"""Magnetization curve of a soft magnetic material as a smooth monotone function H(B)."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike
from scipy.interpolate import CubicHermiteSpline, PchipInterpolator

from evaluators.machine.quantity import MU_0, FloatArray, floats


class MagnetizationCurve:
    """Single-valued isotropic curve through a table of points.

    Between the points H(B) is the monotone cubic of Fritsch and Carlson, "Monotone piecewise cubic
    interpolation", *SIAM J. Numer. Anal.* 17(2), 1980, with the slopes of Fritsch and Butland. In
    the first interval the cubic is odd, so that reluctivity is smooth at zero; beyond the last
    point the slope is that of vacuum. The curve stays continuously differentiable there if the
    table reaches a differential relative permeability of 3 or less; otherwise it has a kink.

    Parameters
    ----------
    field
        Field strength H of the points in A/m, increasing, starting at zero.
    flux_density
        Flux density B of the points in T, increasing, starting at zero.
    slopes
        dH/dB at the points in m/H; left out, they are found as described above.

    Raises
    ------
    ValueError
        If the points do not start at the origin, do not increase, or rise less steeply than
        vacuum (a relative permeability below one).
    """

    def __init__(
        self,
        field: Sequence[float] | FloatArray,
        flux_density: Sequence[float] | FloatArray,
        slopes: FloatArray | None = None,
    ) -> None:
        h = floats(field)
        b = floats(flux_density)
        _check_points(h, b)
        if slopes is None:
            slopes = _monotone_slopes(h, b)
        slopes = slopes.copy()
        # Odd first piece H = a B + c B³ with given value and slope at the first point; a stays
        # positive while that slope is below three secants, which the pchip slopes guarantee.
        slopes[0] = 0.5 * (3.0 * h[1] / b[1] - slopes[1])
        self.field_points = h
        self.flux_density_points = b
        self.slopes = slopes
        pieces = CubicHermiteSpline(b, h, slopes).c
        beyond = np.array([[0.0], [0.0], [1.0 / MU_0], [h[-1]]])
        # Column k holds the cubic valid from point k on; the last one is the vacuum line.
        self._cubic = np.ascontiguousarray(np.hstack([pieces, beyond]))
        self._cubic[1, 0] = 0.0
        self._knots = b

    def field(self, flux_density: ArrayLike) -> FloatArray:
        """Return H in A/m for B in T (any sign, any shape)."""
        b = floats(flux_density)
        c3, c2, c1, c0, t = self._piece(np.abs(b))
        return np.asarray(np.copysign(((c3 * t + c2) * t + c1) * t + c0, b))

    def differential_reluctivity(self, flux_density: ArrayLike) -> FloatArray:
        """Return dH/dB in m/H for B in T (any sign, any shape)."""
        c3, c2, c1, _, t = self._piece(np.abs(floats(flux_density)))
        return np.asarray((3.0 * c3 * t + 2.0 * c2) * t + c1)

    def reluctivity(self, flux_density_squared: ArrayLike) -> tuple[FloatArray, FloatArray]:
        """Return nu = H/B and its derivative with respect to B², both at B² in T².

        Returns
        -------
        nu, derivative
            In m/H and m/(H T²), of the shape of the argument; both are continuous.
        """
        b2 = floats(flux_density_squared)
        b = np.sqrt(b2)
        c3, c2, c1, c0, t = self._piece(b)
        first = b < self._knots[1]
        safe = np.where(first, 1.0, b)
        h = ((c3 * t + c2) * t + c1) * t + c0
        slope = (3.0 * c3 * t + 2.0 * c2) * t + c1
        nu = np.where(first, c1 + c3 * b2, h / safe)
        derivative = np.where(first, c3, (slope - nu) / (2.0 * safe * safe))
        return np.asarray(nu), np.asarray(derivative)

    def flux_density(self, field: ArrayLike) -> FloatArray:
        """Return B in T for H in A/m (any sign, any shape), the inverse of `field`."""
        h = floats(field)
        magnitude = np.abs(h)
        last_h, last_b = self.field_points[-1], self._knots[-1]
        low = self._knots[np.searchsorted(self.field_points, magnitude, side="right") - 1]
        high = np.append(self._knots[1:], np.inf)[
            np.searchsorted(self.field_points, magnitude, side="right") - 1
        ]
        beyond = last_b + MU_0 * (magnitude - last_h)
        high = np.where(np.isfinite(high), high, np.maximum(beyond, last_b))
        b = np.interp(magnitude, self.field_points, self._knots)
        for _ in range(60):
            error = self.field(b) - magnitude
            high = np.where(error > 0.0, b, high)
            low = np.where(error > 0.0, low, b)
            newton = b - error / self.differential_reluctivity(b)
            inside = (newton >= low) & (newton <= high)
            b_next = np.where(inside, newton, 0.5 * (low + high))
            if np.all(np.abs(b_next - b) <= 4e-16 * (1.0 + b)):
                break
            b = b_next
        return np.asarray(np.copysign(np.where(magnitude > last_h, beyond, b), h))

    def laminated(self, stacking_factor: float) -> MagnetizationCurve:
        """Return the curve of a stack of sheets, as seen in the plane of the sheets.

        Iron and insulation lie in parallel: B = k B_iron + (1 - k) mu0 H.

        Raises
        ------
        ValueError
            If `stacking_factor` is not within 0 to 1.
        """
        if not 0.0 < stacking_factor <= 1.0:
            msg = f"stacking_factor = {stacking_factor} is outside the range 0 to 1"
            raise ValueError(msg)
        k = stacking_factor
        b = k * self._knots + (1.0 - k) * MU_0 * self.field_points
        slopes = 1.0 / (k / self.slopes + (1.0 - k) * MU_0)
        return MagnetizationCurve(self.field_points, b, slopes)

    def _piece(self, magnitude: FloatArray) -> tuple[FloatArray, ...]:
        index = np.searchsorted(self._knots, magnitude, side="right") - 1
        c3, c2, c1, c0 = (row[index] for row in self._cubic)
        return c3, c2, c1, c0, magnitude - self._knots[index]


def _check_points(h: FloatArray, b: FloatArray) -> None:
    if h.ndim != 1 or h.shape != b.shape or h.size < 2:
        msg = f"a curve needs two equally long lists of at least 2 points, got {h.shape}, {b.shape}"
        raise ValueError(msg)
    if h[0] != 0.0 or b[0] != 0.0:
        msg = f"the first point must be the origin, got H = {h[0]} A/m, B = {b[0]} T"
        raise ValueError(msg)
    rise_h, rise_b = np.diff(h), np.diff(b)
    if not (np.all(rise_h > 0.0) and np.all(rise_b > 0.0)):
        worst = int(np.argmax((rise_h <= 0.0) | (rise_b <= 0.0))) + 1
        msg = (
            f"H and B must both increase; point {worst + 1} (H = {h[worst]}, B = {b[worst]}) fails"
        )
        raise ValueError(msg)
    permeability = rise_b / rise_h / MU_0
    if np.any(permeability < 1.0 - 1e-3):
        worst = int(np.argmin(permeability)) + 1
        msg = (
            f"relative permeability {permeability[worst - 1]:.3f} up to point {worst + 1}"
            f" (H = {h[worst]}, B = {b[worst]}) is below 1"
        )
        raise ValueError(msg)


def _monotone_slopes(h: FloatArray, b: FloatArray) -> FloatArray:
    """Slopes of the monotone cubic, ending with that of vacuum where the table allows it."""
    slopes = np.asarray(PchipInterpolator(b, h).derivative()(b), dtype=np.float64)
    last = (h[-1] - h[-2]) / (b[-1] - b[-2])
    # Three secants is the limit of monotonicity; two points share one piece with the odd start.
    slopes[-1] = min(1.0 / MU_0, (3.0 if h.size > 2 else 2.0) * last)
    return slopes
