"""Armature reaction on the magnets and the current of a three-phase short circuit."""

from __future__ import annotations

import numpy as np
import pytest
from machines import FAMILIES, Numbers
from outside import OutsideChecks
from scipy.integrate import solve_ivp

from evaluators.machine.demagnetisation import ArmatureReaction, Fault, short_circuit_peak
from evaluators.machine.quantity import MU_0
from evaluators.machine.winding.families import design_winding

check = OutsideChecks("demagnetisation")


@pytest.mark.parametrize(("emf", "current", "resistance", "reactance"), [
    (100.0, 0.0, 0.02, 2.0),
    (100.0, 40.0, 0.3, 2.0),
    (50.0, 120.0, 1.0, 2.0),
    (80.0, 10.0, 3.0, 2.0),
])  # fmt: skip
def test_short_circuit_by_integration(
    emf: float, current: float, resistance: float, reactance: float
) -> None:
    """Both axis equations integrated over time in units of 1/w; the largest -i_d."""

    def slope(_: float, i: np.ndarray) -> list[float]:
        d, q = i
        return [
            (-resistance * d + reactance * q) / reactance,
            (-resistance * q - reactance * d - emf) / reactance,
        ]

    time = np.linspace(0.0, 4.0 * np.pi, 40_001)
    run = solve_ivp(slope, (0.0, time[-1]), [0.0, current], t_eval=time, rtol=1e-10, atol=1e-10)
    check(
        "largest demagnetising current of a three-phase short circuit",
        short_circuit_peak(emf, current, resistance, reactance),
        -run.y[0].min(),
        relative=1e-6,
        why="the peak is found to the square of the time step, 1e-7",
        source="axis equations of the machine integrated over time (scipy solve_ivp)",
    )


def test_short_circuit_limits() -> None:
    """Without resistance the current swings to twice psi/L; with much of it, to the steady one."""
    check(
        "short-circuit peak without resistance",
        short_circuit_peak(100.0, 0.0, 1e-9, 2.0),
        100.0,
        relative=1e-6,
        why="rounding, and a resistance of 1e-9 of the reactance",
        source="constant flux linkage: twice psi/L (common practice)",
    )
    check(
        "short-circuit peak with much resistance",
        short_circuit_peak(100.0, 0.0, 50.0, 2.0),
        100.0 * 2.0 / (50.0**2 + 2.0**2),
        relative=1e-3,
        why="the swing has died out to exp(-25 pi/2) where it would top the steady current; "
        "reactance over resistance squared remains",
        source="steady phasor diagram (common practice)",
    )


def by_single_slots(
    numbers: Numbers, core: float, magnet: float, bore: float, opening: float, turns: int
) -> float:
    """Opposing density by summing the field of single slots at the instants, order by order.

    Slot currents in time from the phase currents; the phase of the current is found by trial, as
    the one whose fundamental stands most against the magnets.
    """
    winding = design_winding(*numbers)
    family = winding.family
    p, slots = family.pole_pairs, family.slots
    orders = np.arange(1, 2 * slots + 1)
    place = 2.0 * np.pi * (np.arange(slots) + 0.5) / slots
    theta = np.linspace(0.0, 2.0 * np.pi, 1440, endpoint=False)
    share = (core / bore) ** (2 * orders)
    radial = (
        (bore / magnet)
        * ((magnet / bore) ** orders + share * (bore / magnet) ** orders)
        / (1.0 - share)
    )
    width = np.sinc(orders * opening / (2.0 * np.pi))
    # Sheet of one slot: K = I / (pi R) sum width cos n(theta - place); B_r of cos is -sin.
    one = -MU_0 / (np.pi * bore) * np.sin(orders[:, None, None] * (theta - place[:, None]))
    one = np.tensordot(radial * width, one, axes=1)  # (slots, theta)
    mmf = winding.slot_mmf("torque")

    def opposing(phase: float, angle: float) -> np.ndarray:
        slot_current = np.real(mmf * np.exp(1j * (p * angle + phase)))
        return -(slot_current @ one)

    phases = np.linspace(0.0, 2.0 * np.pi, 720, endpoint=False)
    main = [np.mean(opposing(phase, 0.0) * np.cos(p * theta)) for phase in phases]
    phase = phases[int(np.argmax(main))]
    worst = 0.0
    for angle in np.pi / (3.0 * p) * np.arange(turns) / turns:
        turned = np.where(np.cos(p * (theta - angle)) >= 0.0, 1.0, -1.0)
        worst = max(worst, float(np.max(opposing(phase, angle) * turned)))
    return worst


@pytest.mark.parametrize("numbers", FAMILIES, ids=str)
def test_reaction_by_single_slots(numbers: Numbers) -> None:
    core, magnet, bore, opening = 15.4e-3, 18.4e-3, 20.6e-3, 0.08
    found = ArmatureReaction.of(design_winding(*numbers)).per_ampere_turn(
        np.array([core]), np.array([magnet]), np.array([bore]), np.array([opening])
    )[0]
    check(
        "largest density of the armature against the magnets",
        found,
        by_single_slots(numbers, core, magnet, bore, opening, 6),
        relative=0.04,
        why="twelve points a pole and six positions against 1440 points: a peak may be missed a "
        "little",
        source="fields of single slots summed at the instants, order by order",
    )


def test_two_pole_winding_without_harmonics() -> None:
    """The fundamental alone, by Ampere's law across an even, thin gap: mu0 F / gap.

    24 slots, one pole pair: F = (3/2)(4/pi) N k_w/(2p) with N = 8 coils of one turn in series.
    """
    winding = design_winding(24, 1, 2)
    gap, bore = 0.2e-3, 0.5
    reaction = ArmatureReaction.of(winding)
    kept = reaction.orders == 1.0
    fundamental = ArmatureReaction(reaction.orders[kept], reaction.pattern[kept])
    found = fundamental.per_ampere_turn(
        np.array([bore - gap]), np.array([bore - 0.5 * gap]), np.array([bore]), np.array([1e-3])
    )[0]
    mmf = 1.5 * 4.0 / np.pi * 8.0 * winding.torque_winding_factor / 2.0
    check(
        "density of a two-pole armature in a thin even gap",
        found,
        MU_0 * mmf / gap,
        relative=0.012,
        why="curvature is gap over radius; the nearest point is 7.5° off the axis: 0.9 %",
        source="Ampere's law, mu0 F/gap with F = (3/2)(4/pi) N k_w/(2p)",
    )


def test_larger_gap_and_wider_slots_weaken_it() -> None:
    reaction = ArmatureReaction.of(design_winding(12, 4, 5))
    core, magnet = np.array([15e-3, 12e-3, 15e-3]), np.full(3, 18e-3)
    found = reaction.per_ampere_turn(core, magnet, np.full(3, 20e-3), np.array([0.05, 0.05, 0.3]))
    assert found[1] < found[0]
    assert found[2] < found[0]


def test_bad_faults_are_refused() -> None:
    with pytest.raises(ValueError, match="kind = 'earth' must be short circuit or current"):
        Fault(kind="earth")  # type: ignore[arg-type]
    with pytest.raises(ValueError, match="current_ratio = -1 must lie between 0 and 20"):
        Fault(kind="current", current_ratio=-1.0)
