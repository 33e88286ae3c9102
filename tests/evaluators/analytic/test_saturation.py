"""Saturation: describing functions by hand, and what iron must do to a machine."""

from __future__ import annotations

import machines
import numpy as np
import pytest
from analytic_case import AnalyticCase
from outside import OutsideChecks

from evaluators.analytic.gap import Iron
from evaluators.analytic.model import AnalyticModel, Resolution
from evaluators.analytic.rotor import MU_0
from evaluators.analytic.saturation import mean_differential_reluctivity, secant_reluctivity
from evaluators.machine.field import FieldSolution, excitation
from evaluators.machine.materials import library as materials
from evaluators.machine.materials.library import ElectricalSteel
from evaluators.machine.materials.magnetization import MagnetizationCurve

COARSE = Resolution(slot_modes=4, reach=12, highest_order=96, positions=8)

check = OutsideChecks("field")


def cubic(linear: float, third: float, reach: float) -> MagnetizationCurve:
    """H = linear B + third B^3 up to `reach`."""
    slope = linear + 3.0 * third * reach**2
    return MagnetizationCurve(
        [0.0, linear * reach + third * reach**3], [0.0, reach], np.array([linear, slope])
    )


def test_describing_function_of_a_cubic() -> None:
    # sin^3 = (3 sin - sin 3)/4, so the fundamental of H over B is a + 3/4 c B^2; the mean of
    # dH/dB = a + 3 c B^2 sin^2 is a + 3/2 c B^2. Gauss points are exact for both.
    linear, third = 100.0, 70.0
    curve = cubic(linear, third, 2.0)
    peak = np.array([0.1, 0.9, 1.7])
    np.testing.assert_allclose(curve.field(peak), linear * peak + third * peak**3, rtol=1e-12)
    check(
        "describing functions of a cubic curve: secant and mean slope",
        [secant_reluctivity(curve, peak), mean_differential_reluctivity(curve, peak)],
        [linear + 0.75 * third * peak**2, linear + 1.5 * third * peak**2],
        relative=1e-8,
        why="Gauss points are exact for both",
        source="sin³ = (3 sin - sin 3)/4, by hand",
    )


@pytest.mark.parametrize("peak", [0.3, 1.2, 1.6, 2.0])
def test_describing_function_of_a_sheet(peak: float) -> None:
    curve = materials.load(ElectricalSteel, "NO20-1200").magnetization
    angle = 2.0 * np.pi * np.arange(20_000) / 20_000
    field = curve.field(peak * np.sin(angle))
    fundamental = 2.0 * np.mean(field * np.sin(angle)) / peak
    words = {
        "why": "eight points over the knee of a measured curve",
        "source": "Fourier integral with 20,000 points",
    }
    found = secant_reluctivity(curve, np.array([peak]))[0]
    check("secant reluctivity of a sheet", found, fundamental, relative=0.02, **words)
    slope = np.mean(curve.differential_reluctivity(peak * np.sin(angle)))
    found = mean_differential_reluctivity(curve, np.array([peak]))[0]
    check("mean differential reluctivity of a sheet", found, slope, relative=0.05, **words)


def solve(
    numbers: machines.Numbers,
    *,
    ideal_iron: bool = False,
    shaft: str = "42CrMo4",
    **changes: float,
) -> FieldSolution:
    of = machines.task(*numbers, ideal_iron=ideal_iron, shaft=shaft)
    batch = machines.designs(**changes)
    sections = machines.sections(of, batch)
    exciting = excitation(sections, batch["current_density_A_mm2"] * 1e6, of.duty, of.construction)
    return AnalyticModel(of, COARSE).solve(sections, exciting)


@pytest.mark.parametrize("numbers", [(12, 4, 5), (6, 4, 5), (12, 1, 2)], ids=str)
def test_good_iron_changes_little_and_bad_iron_much(numbers: machines.Numbers) -> None:
    ideal = solve(numbers, ideal_iron=True)
    ample = solve(numbers, tooth_width_ratio=0.6, yoke_ratio=2.0)
    ample_ideal = solve(numbers, ideal_iron=True, tooth_width_ratio=0.6, yoke_ratio=2.0)
    check.within(
        "torque with ample iron over that with perfect iron",
        ample.torque[0] / ample_ideal.torque[0],
        0.97,
        1.0,
        why="below the knee iron of mu_r about 5000 takes about 1 % of the voltage of a 5 mm gap",
        source="magnetic circuit (common practice)",
    )
    thin_yoke = solve(numbers, yoke_ratio=0.4)
    assert thin_yoke.torque[0] < 0.8 * ideal.torque[0]
    assert thin_yoke.yoke_flux_density[0] < 2.4  # the flux gives way
    thin_teeth = solve(numbers, tooth_width_ratio=0.15, yoke_ratio=4.0)
    thin_ideal = solve(numbers, ideal_iron=True, tooth_width_ratio=0.15, yoke_ratio=4.0)
    assert thin_teeth.flux_linkage[0] < thin_ideal.flux_linkage[0]
    if numbers != (6, 4, 5):  # the teeth of a pole pitch of 4/3 slots carry little flux
        assert thin_ideal.tooth_flux_density[0] > 2.5
        assert thin_teeth.flux_linkage[0] < 0.8 * thin_ideal.flux_linkage[0]


@pytest.mark.parametrize("name", ["yoke_ratio", "tooth_width_ratio", "core_ratio"])
def test_less_iron_gives_less_flux(name: str) -> None:
    values = np.array([0.3, 0.4, 0.5, 0.7])
    flux = np.array([solve((12, 2, 1), **{name: value}).flux_linkage[0] for value in values])
    if name == "core_ratio":  # the shaft is magnetic here and carries flux as the core does
        np.testing.assert_allclose(flux, flux[0], rtol=1e-9)
    elif name == "yoke_ratio":
        assert (np.diff(flux) > 0.0).all()
    else:
        # Against the same slots with perfect iron, as the slots shrink with growing teeth.
        ideal = [
            solve((12, 2, 1), ideal_iron=True, **{name: value}).flux_linkage[0] for value in values
        ]
        assert (np.diff(flux / ideal) > 0.0).all()


def test_more_current_saturates_more() -> None:
    density = np.array([1.0, 10.0, 30.0, 60.0])
    found = [solve((12, 2, 1), current_density_A_mm2=value) for value in density]
    torque = np.array([field.torque[0] for field in found]) / density
    assert (np.diff(torque) < 0.0).all()
    for name in ("torque_inductance", "suspension_inductance", "force_per_ampere_turn"):
        values = np.array([getattr(field, name)[0] for field in found])
        assert (np.diff(values) < 0.0).all(), name


def test_small_signal_iron_is_worse_than_the_secant() -> None:
    # Past the knee the slope of B over H falls before the secant does.
    curve = materials.load(ElectricalSteel, "NO20-1200").magnetization
    peak = np.array([1.5, 1.8, 2.0])
    assert (mean_differential_reluctivity(curve, peak) > secant_reluctivity(curve, peak)).all()


def test_core_between_a_hole_and_the_magnets() -> None:
    """A ~ sinh(n ln(r/Ri)): admittance mu_r/mu_core r A'/(n A) at the outside, by differences."""
    iron = Iron(np.zeros(2), np.zeros(2), np.array([500.0, 40.0]), np.array([0.6, 0.9]))
    orders = np.array([1, 4, -4])
    found = iron.core_admittance(1.07, orders)
    for row, (permeability, hole) in enumerate(((500.0, 0.6), (40.0, 0.9))):
        for column, n in enumerate(np.abs(orders)):
            step = 1e-6
            potential = np.sinh(n * np.log(np.array([1.0 - step, 1.0, 1.0 + step]) / hole))
            slope = (potential[2] - potential[0]) / (2.0 * step)
            expected = 1.07 / permeability * slope / (n * potential[1])
            check(
                "admittance of a core with a hole",
                found[row, column],
                expected,
                relative=1e-8,
                why="central differences of step 1e-6: rounding of 1e-10 over 1e-6",
                source="A ~ sinh(n ln(r/Ri)), by differences",
            )
    assert (Iron.perfect(1).core_admittance(1.07, orders) == 0.0).all()


def test_hole_of_a_shaft_without_magnetism_saturates_the_core() -> None:
    thin, thick = (
        solve((12, 2, 1), shaft="X5CrNi18-10", core_ratio=ratio) for ratio in (0.95, 0.3)
    )
    assert thin.core_flux_density[0] > 1.5 * thick.core_flux_density[0]
    assert thin.flux_linkage[0] < 0.9 * thick.flux_linkage[0]


@pytest.mark.parametrize("numbers", [(12, 4, 5), (12, 2, 1), (6, 4, 5)], ids=str)
@pytest.mark.parametrize("changes", [{"yoke_ratio": 0.4}, {"tooth_width_ratio": 0.2}], ids=str)
def test_iron_fits_the_flux_it_lets_through(
    numbers: machines.Numbers, changes: dict[str, float]
) -> None:
    case = AnalyticCase(numbers, COARSE, **changes)
    perfect = AnalyticCase(numbers, COARSE, ideal_iron=True, **changes)
    state = case.model.waves(case.sections, case.exciting)[2]

    def fundamental(of: AnalyticCase) -> float:
        waves = of.waves()
        main = waves.current.classes == numbers[1] % numbers[0]
        return abs(waves.magnets.slot[0, 0] + waves.current.slot[0, main][0])

    share = fundamental(case) / fundamental(perfect)
    check(
        "share of the main flux that saturated iron lets through",
        state.share[0],
        share,
        absolute=2e-3,
        why="the search for the iron treats the core as that of a smooth gap: 0.2 % of the flux",
        source="field of the slotted gap with that iron over that with perfect iron, this "
        "project's own route",
    )
    assert share < 0.97

    # Reluctances of one tooth and of one slot pitch of yoke, mu0 nu l / (width), by the geometry;
    # behind a tooth the yoke is thicker by 1/(2 pi) of the tooth's width.
    sections, slots = case.sections, numbers[0]
    waves = perfect.waves()
    teeth, yoke = perfect.model.linkage.iron_flux(
        waves.magnets, waves.current, waves.phasor, waves.slot, perfect.model.rotation
    )
    width, thickness = float(sections.tooth_width[0]), float(sections.yoke_thickness[0])
    radius = 0.5 * float(sections.slot_radius[0] + sections.outer_radius[0])
    height = float(sections.slot_radius[0] - sections.bore_radius[0])
    behind_slot = radius * float(sections.slot_angle(sections.slot_radius)[0])
    deep = thickness + 0.5 / np.pi * width
    behind_tooth = 2.0 * np.pi * radius / slots - behind_slot
    for flux, paths, found in (
        (teeth, [(width, height)], state.main.tooth),
        (yoke, [(thickness, behind_slot), (deep, behind_tooth)], state.main.yoke),
    ):
        expected = 0.0
        for across, along in paths:
            peak = state.share * np.abs(flux).max() / across
            reluctivity = secant_reluctivity(case.model.steels.stator, peak)
            expected += MU_0 * reluctivity[0] * along / across
        check(
            "reluctances of a tooth and of a piece of yoke",
            found[0],
            expected,
            relative=1e-3,
            why="the flux is sampled over the period",
            source="mu0 nu l/w by the geometry",
        )
