"""Retaining sleeve against closed forms and against direct integration of the elastic equations."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from outside import OutsideChecks
from scipy.integrate import solve_bvp, solve_ivp

from evaluators.machine.materials import library as materials
from evaluators.machine.materials.library import Magnet, ShaftSteel, SleeveMaterial
from evaluators.machine.mechanics.rings import pressure_stress, rotating_disc_stress
from evaluators.machine.mechanics.sleeve import (
    Ring,
    RotorSection,
    lift_off_speed,
    required_interference,
    sleeve_stress,
)
from evaluators.machine.quantity import floats

W = 60_000 * math.pi / 30.0

check = OutsideChecks("mechanics")
LAME = "Lamé and rotating discs superposed, own evaluation"


def ring(young_radial: float = 205e9, expansion_radial: float = 0.0) -> Ring:
    values = (0.020, 0.024, 8200.0, 205e9, young_radial, 0.29, 0.0, expansion_radial)
    return Ring(*map(floats, values))


FIBRE = Ring(*map(floats, (0.020, 0.0235, 1580.0, 140e9, 9e9, 0.3, 0.2e-6, 32e-6)))


def section(sleeve: Ring, magnet_thickness: float = 0.0, **changes: float) -> RotorSection:
    core = float(sleeve.inner_radius) - magnet_thickness
    values = {
        "core_inner_radius": 0.0, "core_outer_radius": core, "core_density": 7500.0,
        "core_young": 160e9, "core_poisson": 0.24, "core_expansion": 0.0,
        "magnet_density": 7500.0, "magnet_young": 160e9, "magnet_expansion": 0.0, **changes,
    }  # fmt: skip
    return RotorSection(**{k: floats(v) for k, v in values.items()}, sleeve=sleeve)


@pytest.mark.parametrize("position", [0.0, 0.3, 1.0])
def test_isotropic_ring_is_lame_plus_disc(position: float) -> None:
    r = 0.020 + position * 0.004
    found = ring().stress(position, 50e6, W, 0.0)
    lame = pressure_stress(r, 0.020, 0.024, 50e6, 0.0)
    spin = rotating_disc_stress(r, 0.020, 0.024, 8200.0, 0.29, W)
    why = "rounding of a pressure of 50 MPa"
    expected = float(lame.hoop + spin.hoop)
    check("hoop stress of an isotropic sleeve", found.hoop, expected, relative=1e-9, why=why,
          source=LAME)  # fmt: skip
    expected = float(lame.radial + spin.radial)
    check("radial stress of an isotropic sleeve", found.radial, expected, absolute=1.0,
          unit="Pa", why=why, source=LAME)  # fmt: skip


@pytest.mark.parametrize("stiffness", [140.0 / 9.0, 9.0, 2.0])
def test_fibre_ring_by_integration(stiffness: float) -> None:
    """Equilibrium and Hooke's law as they stand, solved numerically; k = 3 (ratio 9) included."""
    sleeve = replace(FIBRE, young_radial=FIBRE.young_hoop / stiffness)
    pressure, w, heating = 60e6, W, 100.0
    a, b = float(sleeve.inner_radius), float(sleeve.outer_radius)
    e_hoop, e_radial = float(sleeve.young_hoop), float(sleeve.young_radial)
    nu, rho = float(sleeve.poisson), float(sleeve.density)

    def hoop(r: np.ndarray, u: np.ndarray, radial: np.ndarray) -> np.ndarray:
        return e_hoop * (u / r - 0.2e-6 * heating) + nu * radial

    def slope(r: np.ndarray, y: np.ndarray) -> np.ndarray:  # y: displacement in um, stress in MPa
        u, radial = y[0] * 1e-6, y[1] * 1e6
        h = hoop(r, u, radial)
        strain = radial / e_radial - nu / e_hoop * h + 32e-6 * heating
        return np.vstack([strain * 1e6, ((h - radial) / r - rho * w * w * r) * 1e-6])

    def ends(low: np.ndarray, high: np.ndarray) -> np.ndarray:
        return np.array([low[1] + pressure * 1e-6, high[1]])

    r = np.linspace(a, b, 41)
    solution = solve_bvp(slope, ends, r, np.zeros((2, r.size)), tol=1e-8)
    assert solution.success
    u, radial = solution.sol(r)[0] * 1e-6, solution.sol(r)[1] * 1e6
    found = sleeve.stress((r - a) / (b - a), pressure, w, heating)
    why = "tolerance of the integration, and 1e-5 for stepping aside from k = 3"
    source = "equilibrium and Hooke's law integrated (scipy solve_bvp)"
    expected = hoop(r, u, radial)
    check("hoop stress of a fibre sleeve", found.hoop, expected, relative=1e-5, why=why,
          source=source)  # fmt: skip
    check("radial stress of a fibre sleeve", found.radial, radial, relative=1e-5, absolute=1e3,
          unit="Pa", why=why, source=source)  # fmt: skip
    growth = sleeve.growth(pressure, w, heating)
    check("growth of a fibre sleeve", growth, u[0], relative=1e-5, why=why, source=source)


def test_sleeve_on_a_solid_rotor() -> None:
    """Worked case of test_mechanics with magnets of no thickness."""
    w = np.array([0.0, 0.5, 1.0]) * W
    state = sleeve_stress(section(ring()), 40e-6, w)
    lift = lift_off_speed(section(ring()), 40e-6)
    for what, found, expected in (
        ("contact pressure", state.core_pressure, [60.21261e6, 54.79642e6, 38.54785e6]),
        ("hoop stress", state.hoop_stress, [333.9063e6, 347.9589e6, 390.1167e6]),
        ("lift-off speed", lift * 30.0 / math.pi, 100_027.2),
    ):
        what = f"{what} of a sleeve on a solid rotor"
        check(what, found, expected, relative=1e-6, why="printed digits", source=LAME)


@pytest.mark.parametrize("sleeve", [ring(), FIBRE], ids=["metal", "fibre"])
def test_section_by_integration(sleeve: Ring) -> None:
    """Core, segments and sleeve integrated outwards through the two contacts.

    The segments are a layer that carries no hoop stress.
    """
    heating, interference, hole = 80.0, 60e-6, 0.004
    rotor = section(
        sleeve, 0.004, core_inner_radius=hole, core_expansion=11.5e-6, magnet_expansion=5e-6
    )
    contact, outer = 0.016, float(sleeve.inner_radius)

    def core(r: float, y: np.ndarray) -> list[float]:
        hoop = 160e9 * (y[0] / r - 11.5e-6 * heating) + 0.24 * y[1]
        strain = (y[1] - 0.24 * hoop) / 160e9 + 11.5e-6 * heating
        return [strain, (hoop - y[1]) / r - 7500.0 * W * W * r]

    def magnets(r: float, y: np.ndarray) -> list[float]:
        return [y[1] / 160e9 + 5e-6 * heating, -y[1] / r - 7500.0 * W * W * r]

    def outwards(bore_growth: float) -> tuple[float, float, float]:
        options = {"rtol": 1e-10, "atol": 1e-16}
        first = solve_ivp(core, (hole, contact), [bore_growth, 0.0], **options).y[:, -1]
        second = solve_ivp(magnets, (contact, outer), first, **options).y[:, -1]
        misfit = second[0] + interference - sleeve.growth(-second[1], W, heating)
        return float(misfit), -float(first[1]), -float(second[1])

    at_zero, at_one = outwards(0.0), outwards(1e-5)
    growth = -1e-5 * at_zero[0] / (at_one[0] - at_zero[0])  # the problem is linear
    _, core_pressure, sleeve_pressure = outwards(growth)
    state = sleeve_stress(rotor, interference, W, heating)
    assert state.core_pressure > 0.0
    why = (
        "the linear mean of the segments' pressure errs by (thickness/radius)² of their "
        "compression, 1 % here; the core sees the difference"
    )
    source = "core, segments and sleeve integrated through both contacts (scipy solve_ivp)"
    check("pressure on the sleeve of a rotor with segments", state.sleeve_pressure,
          sleeve_pressure, relative=0.01, why=why, source=source)  # fmt: skip
    check("pressure on the core of a rotor with segments", state.core_pressure,
          core_pressure, relative=0.02, why=why, source=source)  # fmt: skip


def test_interference_for_a_contact_pressure() -> None:
    rotor = section(FIBRE, 0.004)
    wanted = required_interference(rotor, W, 60.0, 7e6)
    state = sleeve_stress(rotor, wanted, W, 60.0)
    assert state.core_pressure == pytest.approx(7e6, rel=1e-9)  # linear problem
    edge = required_interference(rotor, W, 60.0)
    assert lift_off_speed(rotor, edge, 60.0) == pytest.approx(W, rel=1e-9)


def test_lifted_magnets_weigh_on_the_sleeve_alone() -> None:
    rotor = section(FIBRE, 0.004)
    state = sleeve_stress(rotor, -1e-3, W)
    check(
        "pressure of loose magnets on the sleeve",
        state.sleeve_pressure,
        7500.0 * W**2 * (0.020**3 - 0.016**3) / (3.0 * 0.020),
        relative=1e-12,
        why="rounding",
        source="rho w² (R³ - r³)/(3 R), centrifugal load over the bore, by hand",
    )
    assert state.core_pressure < 0.0
    check(
        "pressure of loose, thin magnets on the sleeve",
        sleeve_stress(section(FIBRE, 1e-5), -1e-3, W).sleeve_pressure,
        7500.0 * W**2 * 0.020 * 1e-5,
        relative=1e-3,
        why="thickness over radius is 5e-4",
        source="rho w² R h",
    )
    assert lift_off_speed(rotor, -1e-3) == 0.0


def test_pressed_sleeve_has_no_radial_tension_at_all() -> None:
    """Where the wall is pressed throughout, the free face must not lend its rounding error."""
    state = sleeve_stress(section(FIBRE, 0.003), np.linspace(60e-6, 90e-6, 200), 0.5 * W, 20.0)
    assert np.all(state.radial_tension == 0.0)


def test_thin_sleeve_is_a_thin_ring_under_its_load() -> None:
    thin = replace(ring(), outer_radius=floats(0.0201))
    state = sleeve_stress(section(thin, 0.004), -1e-3, W)
    pressure = float(state.sleeve_pressure)
    check(
        "hoop stress of a thin sleeve under loose magnets",
        state.hoop_stress,
        pressure * 0.020 / 1e-4 + 8200.0 * (W * 0.02005) ** 2,
        relative=0.005,
        why="thickness over radius",
        source="thin wall, (p R + rho w² R² t)/t: common practice for a first estimate",
    )


def test_heat_loosens_what_expands_more() -> None:
    hot_sleeve = replace(ring(), expansion_hoop=floats(16e-6), expansion_radial=floats(16e-6))
    rotor = section(hot_sleeve, 0.004, core_expansion=11.5e-6)
    cold, hot = (sleeve_stress(rotor, 60e-6, W, rise).core_pressure for rise in (0.0, 100.0))
    assert hot < cold
    fibre = section(FIBRE, 0.004, core_expansion=11.5e-6)
    cold, hot = (sleeve_stress(fibre, 60e-6, W, rise).core_pressure for rise in (0.0, 100.0))
    assert hot > cold


def test_shipped_materials_make_a_batch() -> None:
    core = materials.load(ShaftSteel, "42CrMo4")
    magnet = materials.load(Magnet, "REFeB 300/160")
    for name in materials.available("sleeve"):
        rotor = RotorSection.from_materials(
            core, magnet, materials.load(SleeveMaterial, name), core_inner_radius=0.0,
            core_outer_radius=np.linspace(0.014, 0.017, 5), magnet_outer_radius=0.020,
            sleeve_outer_radius=0.0225, temperature_C=100.0,
        )  # fmt: skip
        state = sleeve_stress(rotor, 40e-6, W, 80.0)
        assert all(value.shape == (5,) for value in state)
        # Less magnet, less load: at the same interference the contact holds better.
        assert np.all(np.diff(state.core_pressure) > 0.0)


def test_impossible_sections_are_refused() -> None:
    with pytest.raises(ValueError, match="wall thickness of the sleeve"):
        replace(ring(), outer_radius=floats(0.020))
    with pytest.raises(ValueError, match="magnet thickness"):
        section(ring(), -1e-3)
    with pytest.raises(ValueError, match="wall thickness of the core"):
        section(ring(), core_inner_radius=0.02)
