"""Conduction: closed forms of cylinders, bars, ribs and strands in resin."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.sparse import diags, identity, kron
from scipy.sparse.linalg import spsolve

from evaluators.machine.thermal.conduction import (
    cylinder_resistance,
    heated_bar_mean_rise,
    heated_bar_peak_rise,
    heated_cylinder_rise,
    mixture_conductivity,
    rib_efficiency,
)


def test_closed_forms() -> None:
    """Recomputed from Fourier's law; the digits printed are the tolerance."""
    assert heated_cylinder_rise(1e6, 0.025, 9.0) == pytest.approx(17.36111, abs=5e-6)
    assert cylinder_resistance(0.020, 0.024, 10.0, 0.05) == pytest.approx(0.05803475, abs=5e-9)
    # A slab of 10 mm with both faces cold: q b²/8k; the third dimension is far away.
    assert heated_bar_peak_rise(5e5, 0.01, 1.0, 1.0) == pytest.approx(6.25, rel=1e-9)
    # The factor of a bar of ratio 100 is 1 - 0.63/100.
    assert heated_bar_mean_rise(5e5, 0.01, 1.0, 1.0) == pytest.approx(6.25 / 1.5, rel=0.0064)
    # A rib of 2 mm x 50 mm, 30 mm high.
    efficiency = rib_efficiency(50.0, 200.0, 2e-3, 0.03, 0.05)
    assert efficiency == pytest.approx(0.9286692, abs=5e-8)


def test_rib_limits() -> None:
    """A long rib loses less at its ends, and a low one is as warm as its root."""
    assert rib_efficiency(50.0, 200.0, 2e-3, 0.03) > rib_efficiency(50.0, 200.0, 2e-3, 0.03, 0.05)
    assert rib_efficiency(50.0, 200.0, 2e-3, 1e-9) == pytest.approx(1.0, abs=1e-12)
    # A high rib carries sqrt(2 h k t) and no more: tanh(mL)/(mL) times 2 h L.
    high = rib_efficiency(50.0, 200.0, 2e-3, 2.0) * 2.0 * 50.0 * 2.0
    assert high == pytest.approx(np.sqrt(2.0 * 50.0 * 200.0 * 2e-3), rel=1e-12)


def test_square_bar() -> None:
    """Torsion of a square bar: middle 0.0737 and mean 0.0351 of q a²/k (Timoshenko, Goodier)."""
    assert heated_bar_peak_rise(1.0, 1.0, 1.0, 1.0) == pytest.approx(0.07367, abs=5e-6)
    # The torsion constant 0.1406 over four.
    assert heated_bar_mean_rise(1.0, 1.0, 1.0, 1.0) == pytest.approx(0.1406 / 4.0, abs=1.3e-5)


@pytest.mark.parametrize(("width", "height"), [(1.0, 2.5), (2.0, 0.7)])
def test_bar_by_finite_differences(width: float, height: float) -> None:
    """Poisson's equation by five-point differences, whose error falls with the square of h."""
    cells = 60
    x, y = width / cells, height / cells
    inside = cells - 1

    def second(step: float) -> object:
        return diags([1.0, -2.0, 1.0], [-1, 0, 1], shape=(inside, inside)) / step**2

    laplace = kron(second(x), identity(inside)) + kron(identity(inside), second(y))
    rise = spsolve(-laplace.tocsc(), np.ones(inside * inside))
    # Of order 1/cells² each.
    assert heated_bar_peak_rise(1.0, width, height, 1.0) == pytest.approx(rise.max(), rel=1e-3)
    mean = rise.sum() * x * y / (width * height)
    assert heated_bar_mean_rise(1.0, width, height, 1.0) == pytest.approx(mean, rel=2e-3)


def test_mixture_limits_and_bounds() -> None:
    fill = np.linspace(0.0, 1.0, 21)
    mixed = mixture_conductivity(fill, 394.0, 0.25)
    assert mixed[0] == pytest.approx(0.25, rel=1e-12)
    assert mixed[-1] == pytest.approx(394.0, rel=1e-12)
    assert np.all(np.diff(mixed) > 0.0)
    # Wiener's bounds of any mixture: layers across and along the flow of heat.
    inner = fill[1:-1]
    across = 1.0 / (inner / 394.0 + (1.0 - inner) / 0.25)
    along = inner * 394.0 + (1.0 - inner) * 0.25
    assert np.all(mixed[1:-1] > across)
    assert np.all(mixed[1:-1] < along)


def test_dilute_rods_by_maxwell() -> None:
    """Few perfect rods raise the conductivity by twice their share (dipole of a cylinder)."""
    share = 1e-4
    rise = mixture_conductivity(share, 1e9, 1.0) - 1.0
    assert rise == pytest.approx(2.0 * share, rel=2e-4)  # next order is the share itself
