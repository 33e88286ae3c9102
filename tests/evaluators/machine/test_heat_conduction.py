"""Conduction: closed forms of cylinders, bars, ribs and strands in resin."""

from __future__ import annotations

import numpy as np
import pytest
from outside import OutsideChecks
from scipy.sparse import diags, identity, kron
from scipy.sparse.linalg import spsolve

from evaluators.machine.thermal.conduction import (
    cylinder_resistance,
    heated_bar_mean_rise,
    heated_bar_peak_rise,
    mixture_conductivity,
    rib_efficiency,
)

check = OutsideChecks("heat", "Fourier's law, closed form; own evaluation")
TORSION = "torsion of a square bar: Timoshenko, Goodier, Theory of Elasticity"


def test_closed_forms() -> None:
    check(
        "resistance of a hollow cylinder",
        cylinder_resistance(0.020, 0.024, 10.0, 0.05),
        0.05803475,
        absolute=5e-9,
        unit="K/W",
        why="printed digits",
    )
    check(
        "peak rise of a heated slab",
        heated_bar_peak_rise(5e5, 0.01, 1.0, 1.0),
        6.25,
        relative=1e-9,
        why="both faces cold, q b²/8k; the third dimension is a hundred times as far away",
    )
    check(
        "mean rise of a heated slab",
        heated_bar_mean_rise(5e5, 0.01, 1.0, 1.0),
        6.25 / 1.5,
        relative=0.0064,
        why="the factor of a bar of ratio 100 is 1 - 0.63/100",
    )
    check(
        "efficiency of a cooling rib",
        rib_efficiency(50.0, 200.0, 2e-3, 0.03, 0.05),
        0.9286692,
        absolute=5e-8,
        why="printed digits",
        source="Incropera et al., Fundamentals of Heat and Mass Transfer, tanh(mL)/(mL) (from "
        "memory); own evaluation",
    )


def test_rib_limits() -> None:
    """A long rib loses less at its ends, and a low one is as warm as its root."""
    assert rib_efficiency(50.0, 200.0, 2e-3, 0.03) > rib_efficiency(50.0, 200.0, 2e-3, 0.03, 0.05)
    assert rib_efficiency(50.0, 200.0, 2e-3, 1e-9) == pytest.approx(1.0, abs=1e-12)
    check(
        "heat through a high rib",
        rib_efficiency(50.0, 200.0, 2e-3, 2.0) * 2.0 * 50.0 * 2.0,
        np.sqrt(2.0 * 50.0 * 200.0 * 2e-3),
        relative=1e-12,
        why="rounding",
        source="sqrt(2 h k t), closed form of an endless rib",
    )


def test_square_bar() -> None:
    check(
        "peak rise of a heated square bar, of q a²/k",
        heated_bar_peak_rise(1.0, 1.0, 1.0, 1.0),
        0.07367,
        absolute=5e-6,
        why="four printed digits",
        source=TORSION,
    )
    check(
        "mean rise of a heated square bar, of q a²/k",
        heated_bar_mean_rise(1.0, 1.0, 1.0, 1.0),
        0.1406 / 4.0,
        absolute=1.3e-5,
        why="four printed digits of the torsion constant, over four",
        source=TORSION,
    )


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
    source = "Poisson's equation by five-point differences"
    why = "of order 1/60² for 60 cells"
    peak, mean = rise.max(), rise.sum() * x * y / (width * height)
    found = heated_bar_peak_rise(1.0, width, height, 1.0)
    check("peak rise of heated bars", found, peak, relative=1e-3, why=why, source=source)
    found = heated_bar_mean_rise(1.0, width, height, 1.0)
    check("mean rise of heated bars", found, mean, relative=2e-3, why=why, source=source)


def test_mixture_limits_and_bounds() -> None:
    fill = np.linspace(0.0, 1.0, 21)
    mixed = mixture_conductivity(fill, 394.0, 0.25)
    assert mixed[0] == pytest.approx(0.25, rel=1e-12)
    assert mixed[-1] == pytest.approx(394.0, rel=1e-12)
    assert np.all(np.diff(mixed) > 0.0)
    inner = fill[1:-1]
    across = 1.0 / (inner / 394.0 + (1.0 - inner) / 0.25)
    along = inner * 394.0 + (1.0 - inner) * 0.25
    check.within(
        "conductivity of wires in resin between the bounds of any mixture",
        (mixed[1:-1] - across) / (along - across),
        0.0,
        1.0,
        why="hard bounds",
        source="Wiener's bounds: layers across and along the flow of heat",
    )


def test_dilute_rods_by_maxwell() -> None:
    share = 1e-4
    check(
        "conductivity that few perfect rods add",
        mixture_conductivity(share, 1e9, 1.0) - 1.0,
        2.0 * share,
        relative=2e-4,
        why="the next order is the share itself, 1e-4",
        source="Maxwell: twice their share, dipole of a cylinder",
    )
