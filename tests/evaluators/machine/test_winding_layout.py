"""Conventions of the winding: sides, directions, rotation of fields, tables, self-checks."""

from __future__ import annotations

import pickle

import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.machine.winding.families import design_winding
from evaluators.machine.winding.winding import Connection, Family, Winding

FAMILIES = [(6, 2, 1), (12, 4, 5), (12, 5, 4), (18, 4, 5), (24, 1, 2), (24, 2, 1), (36, 7, 8)]
ROUNDING = 1e-12  # sums of some dozens of unit phasors

check = OutsideChecks("winding")


def slot_currents(winding: Winding, connection: Connection, angle: float) -> np.ndarray:
    """Currents of all slots at electrical angle omega t, from the table of coil sides alone."""
    sequences = {"torque": winding.torque_sequence, "suspension": winding.suspension_sequence}
    sequence = sequences[connection]
    current = np.zeros(winding.family.slots)
    for side in winding.coil_sides:
        direction = side.torque_direction
        if connection == "suspension":
            direction = side.suspension_direction
        current[side.slot] += direction * np.cos(angle - sequence * 2 * np.pi * side.phase / 3)
    return current


@pytest.mark.parametrize("numbers", FAMILIES)
@pytest.mark.parametrize("connection", ["torque", "suspension"])
def test_main_field_turns_counter_clockwise(
    numbers: tuple[int, int, int], connection: Connection
) -> None:
    winding = design_winding(*numbers)
    order = numbers[1] if connection == "torque" else numbers[2]
    theta = 2 * np.pi * (np.arange(numbers[0]) + 0.5) / numbers[0]
    angles = np.linspace(0, 2 * np.pi, 13)
    waves = np.array(
        [np.sum(slot_currents(winding, connection, a) * np.exp(1j * order * theta)) for a in angles]
    )
    # A wave cos(omega t - n theta) has its crest at n theta = omega t.
    assert np.abs(waves) == pytest.approx(np.full(13, np.abs(waves[0])), rel=1e-10)
    assert np.abs(waves[0]) > 1.0
    assert waves / waves[0] == pytest.approx(np.exp(1j * angles), abs=1e-10)


@pytest.mark.parametrize("numbers", FAMILIES)
@pytest.mark.parametrize("connection", ["torque", "suspension"])
def test_slot_mmf_is_the_phasor_of_the_slot_currents(
    numbers: tuple[int, int, int], connection: Connection
) -> None:
    winding = design_winding(*numbers)
    for angle in (0.0, 0.4, 2.0):
        expected = slot_currents(winding, connection, angle)
        found = (winding.slot_mmf(connection) * np.exp(1j * angle)).real
        assert found == pytest.approx(expected, abs=ROUNDING)


@pytest.mark.parametrize("numbers", FAMILIES)
def test_suspension_force_stands_still(numbers: tuple[int, int, int]) -> None:
    """Thin gap, magnet field of order p turning with the rotor: the force vector is constant.

    Maxwell stress of the product of both fields, the part of F = R L / (2 mu0) int B^2 e^(j theta)
    that is linear in the current, integrated numerically over the staircase of magnetomotive force.
    """
    winding = design_winding(*numbers)
    slots, p, _ = numbers
    points = 64 * slots
    theta = 2 * np.pi * (np.arange(points) + 0.5) / points
    forces = {"torque": [], "suspension": []}
    for angle in np.linspace(0, 2 * np.pi, 12, endpoint=False):
        magnet = np.cos(p * theta - angle)
        for connection, values in forces.items():
            steps = -np.cumsum(slot_currents(winding, connection, angle))
            step_of = np.floor(theta * slots / (2 * np.pi) - 0.5).astype(int) % slots
            mmf = steps[step_of] - steps.mean()
            values.append(np.mean(magnet * mmf * np.exp(1j * theta)))
    suspension = np.array(forces["suspension"])
    assert np.abs(suspension[0]) > 0.05
    words = {
        "absolute": 1e-9,
        "why": "samples lie evenly within each step and keep the symmetries: rounding",
        "source": "Maxwell's stress of the staircase of magnetomotive force, integrated",
    }
    check("force of the suspension winding over a turn", suspension, suspension[0], **words)
    check("force of the torque winding over a turn", np.array(forces["torque"]), 0.0, **words)


@pytest.mark.parametrize("numbers", FAMILIES)
@pytest.mark.parametrize("connection", ["torque", "suspension"])
def test_mmf_spectrum_is_that_of_the_staircase(
    numbers: tuple[int, int, int], connection: Connection
) -> None:
    winding = design_winding(*numbers)
    slots = numbers[0]
    spectrum = winding.mmf_spectrum(connection, 2 * slots)
    angle = 0.7
    coefficients = spectrum.forward * np.exp(1j * angle) + np.conj(
        spectrum.backward * np.exp(1j * angle)
    )
    steps = -np.cumsum(slot_currents(winding, connection, angle))
    edges = 2 * np.pi * (np.arange(slots + 1) + 0.5) / slots
    for n, found in zip(spectrum.orders, coefficients, strict=True):
        # (1/pi) int f exp(j n theta), exact on each flat step between two slots.
        pieces = steps * (np.exp(1j * n * edges[1:]) - np.exp(1j * n * edges[:-1])) / (1j * n)
        check(
            "spectrum of the magnetomotive force",
            found,
            np.sum(pieces) / np.pi,
            absolute=1e-11,
            unit="A",
            why="rounding",
            source="Fourier integral of the staircase of slot currents, step by step",
        )


@pytest.mark.parametrize("numbers", FAMILIES)
def test_phase_phasors_give_the_flux_linkage(numbers: tuple[int, int, int]) -> None:
    """A_z = cos(n theta - a) at the slot centres, A(go) - A(return) summed over a phase's coils."""
    winding = design_winding(*numbers)
    slots, order, lead = numbers[0], numbers[1], 0.3
    potential = np.cos(order * 2 * np.pi * (np.arange(slots) + 0.5) / slots - lead)
    linkage = potential[winding.coil_slots[:, 1]] - potential[winding.coil_slots[:, 0]]
    phasors = winding.phase_phasors("torque", order)[:, 0] * np.exp(-1j * lead)
    for k in range(3):
        check(
            "flux linkage of a phase by its phasor",
            2 * slots / 3 * phasors[k].real,
            np.sum((linkage * winding.sense)[winding.phase == k]),
            absolute=ROUNDING * 10,
            unit="of the potential",
            why="rounding",
            source="potential at go less potential at return, summed over coils",
        )


def test_main_mmf_is_the_textbook_one() -> None:
    # N turns in series per phase.
    winding = design_winding(24, 5, 4)
    turns = 24 / 3
    spectrum = winding.mmf_spectrum("torque", 5)
    check(
        "main magnetomotive force per ampere",
        np.abs(spectrum.forward[4]),
        1.5 * 4 / np.pi * turns * winding.torque_winding_factor / (2 * 5),
        relative=1e-12,
        why="rounding",
        source="(m/2)(4/pi) N k_w/(2p), Pyrhonen et al., 2014, ch. 2 (from memory)",
    )
    assert np.abs(spectrum.backward[4]) < ROUNDING


def test_mmf_spectrum_refuses_no_orders() -> None:
    with pytest.raises(ValueError, match="max_order = 0"):
        design_winding(12, 4, 5).mmf_spectrum("torque", 0)


def test_tooth_coil_embraces_its_tooth() -> None:
    winding = design_winding(12, 4, 5)
    assert winding.coil_slots[0].tolist() == [11, 0]
    assert winding.coil_axes == pytest.approx(2 * np.pi * np.arange(12) / 12)
    assert (winding.phase[0], winding.group[0], winding.sense[0]) == (0, 0, 1)


def test_positive_coil_current_drives_flux_outwards() -> None:
    """Magnetomotive force is positive on the axis of coil 0 when its phase current peaks."""
    for numbers in FAMILIES:
        winding = design_winding(*numbers)
        spectrum = winding.mmf_spectrum("torque", numbers[1])
        wave = spectrum.forward[-1] * np.exp(-1j * numbers[1] * winding.coil_axes[0])
        assert wave.real > 0.5 * abs(wave)


@pytest.mark.parametrize("numbers", FAMILIES)
def test_tables_agree_with_each_other(numbers: tuple[int, int, int]) -> None:
    winding = design_winding(*numbers)
    slots = numbers[0]
    sides = winding.coil_sides
    assert [(s.slot, s.layer) for s in sides] == [(i, k) for i in range(slots) for k in (1, 2)]
    for coil in range(slots):
        first, second = sorted((s for s in sides if s.coil == coil), key=lambda s: s.layer)
        assert [first.slot, second.slot] == winding.coil_slots[coil].tolist()
        assert (second.slot - first.slot) % slots == winding.family.coil_pitch
        assert first.torque_direction == -second.torque_direction == -winding.sense[coil]
    directions = {(s.slot, s.coil): s.torque_direction for s in sides}
    wound = []
    for string in winding.connections:
        assert len(string.coils) == slots // 6
        wound.extend(string.coils)
        for coil, start, finish in zip(string.coils, string.starts, string.finishes, strict=True):
            assert (winding.phase[coil], winding.group[coil]) == (string.phase, string.group)
            assert directions[start, coil] == 1
            assert directions[finish, coil] == -1
    assert sorted(wound) == list(range(slots))


def test_strings_leave_the_widest_gap_open() -> None:
    strings = {(s.phase, s.group): s.coils for s in design_winding(12, 4, 5).connections}
    assert strings[1, 1] == (10, 1)


def test_arrays_are_read_only_also_after_pickling() -> None:
    winding = pickle.loads(pickle.dumps(design_winding(12, 4, 5)))  # noqa: S301 - our own bytes
    for name in ("phase", "sense", "group", "coil_slots", "coil_axes", "torque_slot_mmf"):
        with pytest.raises(ValueError, match="read-only"):
            getattr(winding, name)[0] = 0


def test_winding_rejects_malformed_arrays() -> None:
    good = design_winding(6, 2, 1)
    with pytest.raises(ValueError, match=r"phase has shape \(5,\)"):
        Winding(good.family, good.phase[:5], good.group, good.sense)
    with pytest.raises(ValueError, match="sense = "):
        Winding(good.family, good.phase, good.group, good.sense * 2)


@pytest.mark.parametrize(
    ("numbers", "message"),
    [
        ((0, 1, 2, 1), "slots = 0"),
        ((12, 4, 5, 1.0), "coil_pitch = 1.0"),
        ((12, 4, 6, 1), "suspension_pole_pairs = 6"),
        ((12, 1, 0, 1), "suspension_pole_pairs = 0"),
        ((12, 4, 5, 7), "coil_pitch = 7"),
    ],
)
def test_family_checks_itself(numbers: tuple[int, int, int, int], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        Family(*numbers)


def test_family_numbers() -> None:
    family = Family(12, 4, 5, 1)
    assert family.id == "Q12p4s5"
    assert family.cogging_periods == 24
    # 48,000 turns a minute are 800 a second; four pole pairs make 3,200 Hz of them.
    assert family.electrical_frequency(800 * 2 * np.pi) == pytest.approx(3200)
