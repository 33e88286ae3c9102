"""What the field model hands over, computed again from its waves by plain sums over the turn."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from analytic_case import AnalyticCase
from numpy.typing import NDArray
from outside import OutsideChecks

from evaluators.analytic.gap import GapField
from evaluators.analytic.model import Resolution
from evaluators.analytic.rotor import MU_0
from evaluators.machine.winding.winding import Connection

FloatArray = NDArray[np.float64]
FINE = Resolution(slot_modes=4, reach=10, highest_order=96, positions=12)

check = OutsideChecks("force", "plain sums over the turn, position by position and slot by slot")


@pytest.fixture(scope="module", params=[(6, 2, 1), (12, 4, 5), (12, 5, 4), (12, 1, 2)], ids=str)
def case(request: pytest.FixtureRequest) -> AnalyticCase:
    """Ideal iron: one permeability tells all positions."""
    return AnalyticCase(request.param, FINE, ideal_iron=True, duty={"suspension_share": 0.25})


def test_excitation_fills_the_slot(case: AnalyticCase) -> None:
    sections, exciting = case.sections, case.exciting
    # Two coil sides with 42 % copper at 6 A/mm2 root-mean-square; a quarter for suspension.
    peak = np.sqrt(2.0) * 6e6 * 0.42 * sections.slot_area / 2.0
    np.testing.assert_allclose(exciting.torque + exciting.suspension, peak, rtol=1e-12)
    np.testing.assert_allclose(exciting.suspension, 0.25 * peak, rtol=1e-12)


def test_torque_and_ripple(case: AnalyticCase) -> None:
    field, motion = case.solve(), case.motion()
    assert field.torque[0] == pytest.approx(motion.torque[0].mean())
    swing = motion.torque[0].max() - motion.torque[0].min()
    assert field.torque_ripple[0] == pytest.approx(swing / motion.torque[0].mean())
    cogging = motion.cogging[0]
    assert field.cogging[0] == pytest.approx(cogging.max() - cogging.min())
    assert field.torque_ripple[0] > 0.0


def test_force_and_its_errors(case: AnalyticCase) -> None:
    """Position by position over the whole turn, commanded along x and along y."""
    exciting, field = case.exciting, case.solve()
    count = 12 * 6 * case.task.winding.family.pole_pairs
    turn = 2.0 * np.pi * np.arange(count) / count
    motion = case.motion(turn)
    size, worst_magnitude, worst_angle = [], 0.0, 0.0
    for direction in (0.0, 0.5 * np.pi):
        phasor = exciting.suspension[0] * motion.command(direction)[0]
        force = motion.rest[0] + phasor * motion.direct[0] + np.conj(phasor) * motion.mirrored[0]
        mean = np.mean(force)
        size.append(abs(mean))
        for value in force:
            worst_magnitude = max(worst_magnitude, abs(abs(value) / abs(mean) - 1.0))
            worst_angle = max(worst_angle, abs(np.angle(value / mean)))
    check(
        "mean force of the suspension",
        field.force[0],
        np.mean(size),
        relative=1e-9,
        why="the mean over a turn does not depend on the positions",
    )
    check(
        "largest errors of the force in magnitude and angle",
        [field.force_error_magnitude[0], field.force_error_angle[0]],
        [worst_magnitude, worst_angle],
        relative=1e-6,
        why="extremes are met by the same positions",
    )
    assert field.force_per_ampere_turn[0] * exciting.suspension[0] == pytest.approx(size[0])


@pytest.mark.parametrize("connection", ["torque", "suspension"])
def test_inductance_by_slots(case: AnalyticCase, connection: Connection) -> None:
    """Flux linkage of phase one summed over its coil sides, with the current in each slot."""
    waves, field = case.waves(), case.solve()
    winding = case.task.winding
    number = np.arange(winding.family.slots)
    wave = waves.current if connection == "torque" else waves.suspension
    current = complex(waves.phasor[0]) if connection == "torque" else 1.0 + 0j
    turned = np.exp(2j * np.pi * wave.classes[:, None] * number / number.size)

    def linkage(electrical: float) -> float:
        in_slot = np.real(current * winding.slot_mmf(connection) * np.exp(1j * electrical))
        potential = 2.0 * np.real(np.exp(-1j * electrical) * (wave.slot[0] @ turned))
        potential = potential + MU_0 * waves.slot.permeance[0] * in_slot
        return sum(
            (side.torque_direction if connection == "torque" else side.suspension_direction)
            * float(potential[side.slot])
            for side in winding.coil_sides
            if side.phase == 0
        )

    # Re(phasor exp(j t)) at t = 0 and a quarter of a period later.
    found = (linkage(0.0) - 1j * linkage(0.5 * np.pi)) / current
    expected = field.torque_inductance if connection == "torque" else field.suspension_inductance
    check(
        "inductance to torque and suspension current",
        expected[0],
        found.real,
        relative=1e-9,
        why="rounding",
        source="potentials at the coil sides of phase one, summed",
    )


def slot_potentials(
    field: GapField, exponents: NDArray[np.int64], slots: int, electrical: FloatArray
) -> FloatArray:
    """Potential of every slot at every electrical angle, (slots, angles) Wb/m."""
    turned = np.exp(2j * np.pi * field.classes[:, None] * np.arange(slots) / slots)
    moving = np.exp(-1j * exponents[:, None] * electrical)
    return 2.0 * np.real(np.einsum("c,cs,ct->st", field.slot[0], turned, moving))


def test_iron_flux_by_slots(case: AnalyticCase) -> None:
    """A tooth carries the difference of the slots beside it, the yoke the potential of its slot."""
    waves, linkage, rotation = case.waves(), case.model.linkage, case.model.rotation
    slots, pair = rotation.slots, rotation.pole_pairs
    electrical = 2.0 * np.pi * np.arange(96) / 96
    ones = np.ones_like(waves.current.classes)
    potential = slot_potentials(
        waves.magnets, rotation.magnet_orders // pair, slots, electrical
    ) + slot_potentials(waves.current, ones, slots, electrical)
    bare = replace(waves.slot, tooth_permeance=0.0, yoke_permeance=0.0)
    teeth, yoke = linkage.iron_flux(waves.magnets, waves.current, waves.phasor, bare, rotation)
    some = slots // 3
    scale = 1e-9 * np.abs(potential).max()
    np.testing.assert_allclose(yoke[0], potential[:some], atol=scale)
    np.testing.assert_allclose(teeth[0], (potential - np.roll(potential, 1, 0))[:some], atol=scale)
    # Every third of the slots sees the same in other phases, so these teeth tell all.
    every = np.abs(potential - np.roll(potential, 1, 0)).max()
    assert np.abs(teeth).max() == pytest.approx(every, rel=1e-3)

    # With its own leakage, the yoke behind a slot carries mu0 P I more, I being the slot's current.
    _, loaded = linkage.iron_flux(waves.magnets, waves.current, waves.phasor, waves.slot, rotation)
    current = np.real(
        waves.phasor[0] * case.task.winding.torque_slot_mmf[:some, None] * np.exp(1j * electrical)
    )
    expected = yoke[0] + MU_0 * np.asarray(waves.slot.yoke_permeance)[0] * current
    np.testing.assert_allclose(loaded[0], expected, atol=scale)

    tooth_peak, yoke_peak = linkage.suspension_flux(waves.suspension, bare, rotation)
    electrical = 2.0 * np.pi * np.arange(720) / 720
    ones = np.ones_like(waves.suspension.classes)
    control = slot_potentials(waves.suspension, ones, slots, electrical)
    found = np.abs(control - np.roll(control, 1, 0)).max(axis=1)[:some]
    np.testing.assert_allclose(tooth_peak[0], found, rtol=1e-4)  # sampled every half degree
    np.testing.assert_allclose(yoke_peak[0], np.abs(control).max(axis=1)[:some], rtol=1e-4)


def test_flux_linkage_and_iron_density_by_slots(case: AnalyticCase) -> None:
    model, sections, exciting, waves = case.model, case.sections, case.exciting, case.waves()
    field, winding, phasor = case.solve(), case.task.winding, complex(waves.phasor[0])
    slots, pair = winding.family.slots, winding.family.pole_pairs
    samples = 2 * 96
    electrical = 2.0 * np.pi * np.arange(samples) / samples
    magnets = slot_potentials(
        waves.magnets, model.rotation.magnet_orders // pair, slots, electrical
    )
    linkage = sum(
        side.torque_direction * magnets[side.slot] for side in winding.coil_sides if side.phase == 0
    )
    fundamental = 2.0 * np.mean(linkage * np.exp(-1j * electrical))
    check(
        "flux linkage of the magnets",
        field.flux_linkage[0],
        abs(fundamental),
        relative=1e-5,
        why="the sheets' permeability of ten million leaves 1e-6",
        source="potentials at the coil sides of phase one over a period",
    )
    # The torque current leads the linkage by a quarter period: in phase with the EMF.
    assert phasor / fundamental / 1j == pytest.approx(abs(phasor / fundamental), rel=1e-9)

    ones = np.ones_like(waves.current.classes)
    both = magnets + slot_potentials(waves.current, ones, slots, electrical)
    # The slots' own leakage flux comes on top, along the teeth and at the bottom.
    own = MU_0 * np.real(phasor * winding.torque_slot_mmf[:, None] * np.exp(1j * electrical))
    along = both + np.asarray(waves.slot.tooth_permeance)[0] * own
    bottom = both + np.asarray(waves.slot.yoke_permeance)[0] * own
    tooth = np.abs(along - np.roll(along, 1, axis=0)).max() / sections.tooth_width[0]
    yoke = np.abs(bottom).max() / sections.yoke_thickness[0]
    # On top comes the suspension's peak: at most all of it, somewhere some of it.
    turned = np.exp(2j * np.pi * waves.suspension.classes[:, None] * np.arange(slots) / slots)
    extra = 2.0 * exciting.suspension[0] * np.abs(waves.suspension.slot[0] @ turned).max()
    leakage = np.abs(winding.suspension_slot_mmf).max() * np.asarray(waves.slot.yoke_permeance)[0]
    extra += MU_0 * exciting.suspension[0] * leakage
    most = yoke + extra / sections.yoke_thickness[0]
    # Positions and instants need not meet the same peak: 0.5 %.
    assert yoke * 0.995 < field.yoke_flux_density[0] < most * 1.005
    most = tooth + 2.0 * extra / sections.tooth_width[0]
    assert tooth * 0.995 < field.tooth_flux_density[0] < most * 1.005
