"""Which families are found, why others are refused, and that no better split exists."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.machine.winding.families import (
    SUSPENSION_FACTOR_MINIMUM,
    TORQUE_FACTOR_MINIMUM,
    Refusal,
    WindingError,
    check_winding,
    design_winding,
    enumerate_families,
)
from evaluators.machine.winding.winding import Winding

SLOTS = (6, 9, 12, 15, 18, 24, 30, 36)

check = OutsideChecks("winding")
SEARCH = {"absolute": 1e-9, "why": "rounding of sums of phasors"}


def feasible(slots: tuple[int, ...], pole_pairs: range) -> list[Winding]:
    return [w for w in enumerate_families(slots, pole_pairs) if isinstance(w, Winding)]


@pytest.mark.parametrize(("numbers"), [(6, 2, 1), (12, 4, 5)])
def test_known_tooth_coil_families(numbers: tuple[int, int, int]) -> None:
    winding = design_winding(*numbers)
    assert winding.residual_voltage == 0.0
    source = "common practice: tooth coils of k_w = sin 60°"
    check.same(
        "coil pitch of three slots for two poles", winding.family.coil_pitch, 1, source=source
    )
    check(
        "torque factor of the tooth coils found",
        winding.torque_winding_factor,
        np.sqrt(3) / 2,
        absolute=1e-12,
        why="rounding",
        source=source,
    )


def test_enumeration_finds_what_the_conditions_leave() -> None:
    found = feasible(SLOTS, range(1, 9))
    # By hand: Q a multiple of six, p no multiple of three, and of p - 1, p, p + 1 one is a
    # multiple of three, which leaves one ps for each p: six slot numbers by six pole pairs.
    expected = [
        f"Q{q}p{p}s{p + 1 if p % 3 == 1 else p - 1}"
        for q in (6, 12, 18, 24, 30, 36)
        for p in (1, 2, 4, 5, 7, 8)
    ]
    check.same(
        "families found up to 36 slots and 8 pole pairs",
        [w.family.id for w in found],
        expected,
        source="counted by hand: 6 divides Q, 3 does not divide p, ps = p ± 1 not divided by 3",
    )
    assert len(found) == 36
    for winding in found:
        check_winding(winding)
        assert winding.torque_winding_factor >= TORQUE_FACTOR_MINIMUM
        assert winding.suspension_winding_factor >= SUSPENSION_FACTOR_MINIMUM
        assert winding.residual_voltage == 0.0


def test_enumeration_returns_refusals_with_reasons() -> None:
    results = enumerate_families([9, 10], [1, 3])
    assert [r.id for r in results] == [
        *("Q9p1s2", "Q9p3s2", "Q9p3s4"),
        *("Q10p1s2", "Q10p3s2", "Q10p3s4"),
    ]
    refusals = [r for r in results if isinstance(r, Refusal)]
    assert len(refusals) == 6
    assert all(r.reason.startswith(f"{r.id} cannot be wound: ") for r in refusals)


@pytest.mark.parametrize(
    ("numbers", "condition", "words"),
    [
        ((12, 3, 4), "pole pairs no multiple of three", "3 pole pairs"),
        ((12, 2, 3), "suspension pole pairs no multiple of three", "3 suspension pole pairs"),
        ((10, 4, 5), "equal division among phases", "10 slots"),
        ((9, 4, 5), "equal division among groups", "3 coils of a phase"),
        ((15, 7, 8), "equal division among groups", "5 coils of a phase"),
        ((12, 4, 6), "suspension pole pairs", "differ"),
        ((12, 4, 5, 7), "coil pitch", "half the slots"),
        ((12, 4, 5, 3), "both fields made", "no torque field of order 4"),
        ((0, 1, 2), "whole numbers", "slots = 0"),
    ],
)
def test_refusals_name_the_failed_condition(
    numbers: tuple[int, ...], condition: str, words: str
) -> None:
    with pytest.raises(WindingError, match=words) as caught:
        design_winding(*numbers)
    assert caught.value.condition == condition


def test_limits_of_the_factors(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("evaluators.machine.winding.families.TORQUE_FACTOR_MINIMUM", 0.87)
    with pytest.raises(WindingError, match=r"pitch 1, gives 0\.866") as caught:
        design_winding(12, 4, 5)
    assert caught.value.condition == "torque winding factor"
    monkeypatch.setattr("evaluators.machine.winding.families.TORQUE_FACTOR_MINIMUM", 0.866)
    monkeypatch.setattr("evaluators.machine.winding.families.SUSPENSION_FACTOR_MINIMUM", 0.7)
    with pytest.raises(WindingError, match=r"pitch 1, gives 0\.683") as caught:
        design_winding(12, 4, 5)
    assert caught.value.condition == "suspension winding factor"


def test_pitch_has_the_best_suspension_factor_unless_tooth_coils_serve() -> None:
    for winding in feasible((12, 18, 24, 36), range(1, 12)):
        family = winding.family
        rivals = []
        for pitch in range(1, family.slots // 2 + 1):
            try:
                rival = design_winding(*_numbers(winding), pitch)
            except WindingError:
                continue  # a pitch that makes one of the fields vanish
            if rival.torque_winding_factor >= TORQUE_FACTOR_MINIMUM:
                rivals.append((pitch, rival.suspension_winding_factor))
        useful = dict(r for r in rivals if r[1] >= SUSPENSION_FACTOR_MINIMUM)
        if 1 in useful:
            assert family.coil_pitch == 1
        else:
            best = max(useful.values())
            assert useful[family.coil_pitch] == pytest.approx(best, abs=1e-9)
            assert family.coil_pitch == min(y for y, k in useful.items() if k > best - 1e-9)


def test_stated_pitch_overrides_the_limits() -> None:
    winding = design_winding(24, 1, 2, 8)
    assert winding.family.coil_pitch == 8
    assert winding.torque_winding_factor < TORQUE_FACTOR_MINIMUM


@pytest.mark.parametrize("slots", [6, 12, 18, 24, 30])
@pytest.mark.parametrize("pole_pairs", [1, 2, 4, 5, 7, 8, 11])
def test_no_split_of_a_phase_beats_the_star(slots: int, pole_pairs: int) -> None:
    """All splits of phase 0 into equal halves whose torque EMFs are equal, one by one."""
    ps = pole_pairs + 1 if pole_pairs % 3 == 1 else pole_pairs - 1
    winding = design_winding(slots, pole_pairs, ps)
    coils = np.flatnonzero(winding.phase == 0)
    rest = np.array(list(itertools.product((1, -1), repeat=coils.size - 1)))
    splits = np.hstack([np.ones((rest.shape[0], 1), dtype=int), rest])
    splits = splits[splits.sum(axis=1) == 0] * winding.sense[coils]
    at_p = splits @ np.exp(2j * np.pi * pole_pairs * coils / slots)
    at_ps = np.abs(splits @ np.exp(2j * np.pi * ps * coils / slots))
    best = at_ps[np.abs(at_p) < 1e-9].max() / coils.size
    best *= abs(np.sin(np.pi * ps * winding.family.coil_pitch / slots))
    check(
        "suspension factor against every split of the phases",
        winding.suspension_winding_factor,
        best,
        **SEARCH,
        source="brute force over all equal halves of equal torque EMF",
    )


def symmetrical_windings(numbers: tuple[int, int, int]) -> tuple[np.ndarray, np.ndarray]:
    """Distribution factors of all symmetrical three-phase windings, brute force.

    Phase 0 takes one coil of each three that lie 120 degrees apart, with either sense. Returns
    the torque factor and the best suspension factor of a split into equal halves whose torque
    EMFs are equal, both before the pitch factor.
    """
    slots, p, ps = numbers
    third = slots // 3
    signs = np.array(list(itertools.product((1, -1), repeat=third)))
    halves = signs[signs.sum(axis=1) == 0]
    torque, suspension = [], []
    for turns in itertools.product(range(3), repeat=third - 1):
        coils = np.arange(third) + third * np.array((0, *turns))
        at_p = signs * np.exp(2j * np.pi * p * coils / slots)
        at_ps = signs * np.exp(2j * np.pi * ps * coils / slots)
        equal = np.abs(at_p @ halves.T) < 1e-9
        torque.append(np.abs(at_p.sum(axis=1)) / third)
        suspension.append(np.where(equal, np.abs(at_ps @ halves.T), 0.0).max(axis=1) / third)
    return np.concatenate(torque), np.concatenate(suspension)


def reach(order: int, winding: Winding) -> float:
    """Pitch factor."""
    family = winding.family
    return float(abs(np.sin(np.pi * order * family.coil_pitch / family.slots)))


@pytest.mark.parametrize("numbers", [(6, 2, 1), (12, 1, 2), (12, 2, 1), (12, 4, 5), (12, 5, 4)])
def test_no_assignment_of_equal_torque_beats_the_star(numbers: tuple[int, int, int]) -> None:
    winding = design_winding(*numbers)
    torque, suspension = symmetrical_windings(numbers)
    at_p, at_ps = reach(numbers[1], winding), reach(numbers[2], winding)
    best = suspension[torque > torque.max() - 1e-9].max()
    check(
        "both factors against every symmetrical winding",
        [winding.torque_winding_factor, winding.suspension_winding_factor],
        [torque.max() * at_p, best * at_ps],
        **SEARCH,
        source="brute force over all assignments of coils to phases and groups",
    )


@pytest.mark.parametrize(
    ("numbers", "better"),
    [((12, 1, 2), None), ((12, 4, 5), None), ((12, 5, 4), None), ((12, 2, 1), 0.683013)],
)
def test_what_less_torque_would_buy(numbers: tuple[int, int, int], better: float | None) -> None:
    """Giving up torque factor down to the limit helps in the one case that is documented."""
    winding = design_winding(*numbers)
    torque, suspension = symmetrical_windings(numbers)
    best = 0.0
    for pitch in range(1, 7):
        at_p, at_ps = (abs(np.sin(np.pi * n * pitch / 12)) for n in numbers[1:])
        enough = torque * at_p >= TORQUE_FACTOR_MINIMUM
        best = max(best, float(at_ps * suspension[enough].max(initial=0.0)))
    expected = winding.suspension_winding_factor if better is None else better
    check(
        "suspension factor that less torque would buy",
        best,
        expected,
        absolute=6e-7,
        why="six printed decimals",
        source="brute force over all assignments and pitches",
    )


def test_checks_catch_broken_layouts() -> None:
    good = design_winding(18, 4, 5)

    def broken(**changes: np.ndarray) -> Winding:
        arrays = {"phase": good.phase, "group": good.group, "sense": good.sense} | changes
        return Winding(good.family, **arrays)

    phase = good.phase.copy()
    phase[0] = (phase[0] + 1) % 3
    _expect(broken(phase=phase), "equal division")

    sense = good.sense.copy()
    sense[0] = -sense[0]
    _expect(broken(sense=sense), "phases balanced")

    # Exchange between the groups two coils that do not face each other, alike in every phase.
    a = np.flatnonzero((good.phase == 0) & (good.group == 0))
    b = np.flatnonzero((good.phase == 0) & (good.group == 1))
    first, second = next((i, k) for i in a for k in b if (k - i) % 18 != 9)
    group = good.group.copy()
    for turn in (0, 6, 12):
        group[(first + turn) % 18], group[(second + turn) % 18] = 1, 0
    bad = broken(group=group)
    # Still equal and balanced, but the suspension terminals now see torque voltage.
    _expect(bad, "equal torque EMF of groups")
    assert bad.residual_voltage > 0.1


def test_residual_voltage_by_hand() -> None:
    """Groups of facing coils, 12 slots and 10 poles: teeth 0 and 6 against 5 and 11.

    At p, teeth 0 and 6 lie together once their senses are counted, and so do 5 and 11, 30 degrees
    further on: difference over sum is |1 - exp(j 30 deg)| / |1 + exp(j 30 deg)|.
    """
    good = design_winding(12, 5, 4)
    group = np.zeros(12, dtype=int)
    for k in range(3):
        members = np.flatnonzero(good.phase == k)
        firm = {members[0], (members[0] + 6) % 12}
        group[[i for i in members if i not in firm]] = 1
    bad = Winding(good.family, good.phase, group, good.sense)
    ratio = abs(1 - np.exp(1j * np.pi / 6)) / abs(1 + np.exp(1j * np.pi / 6))  # tan 15 degrees
    difference = np.abs(bad.phase_phasors("suspension", 5)).max()
    assert difference / bad.torque_winding_factor == pytest.approx(ratio, rel=1e-9)
    # Order 3p differs by 1 - exp(j 90 deg), times the pitch factors' ratio, over 3.
    third = np.sqrt(2) / abs(1 + np.exp(1j * np.pi / 6)) / 3 * abs(np.sin(15 * np.pi / 12))
    third /= abs(np.sin(5 * np.pi / 12))
    check(
        "residual voltage of facing groups, 12 slots and 10 poles",
        bad.residual_voltage,
        max(ratio, third),
        relative=1e-9,
        why="rounding",
        source="phasors of two coils by hand",
    )


def test_residual_voltage_looks_at_all_magnet_orders() -> None:
    """Coils 0 and 13 exchanged between the groups of a two-pole winding of span 4/12.

    The groups then differ by two steps of 15 n degrees at order n, 4 sin(7.5 n degrees), over a
    sum of eight coils; pitch factors are sin 30 degrees at order 1 and 1 at order 3, which rules.
    """
    good = design_winding(24, 1, 2, 4)
    group = good.group.copy()
    group[[0, 13]] = group[[13, 0]]
    bad = Winding(good.family, good.phase, group, good.sense)
    distribution = 0.957662  # q = 4
    check(
        "residual voltage of two coils exchanged, third magnet order",
        bad.residual_voltage,
        4 * np.sin(np.radians(22.5)) / 3 / (8 * distribution * 0.5),
        relative=1e-6,
        why="digits of the handbook",
        source="by hand, with the factor of q = 4 of Pyrhonen et al., 2014, ch. 2 (from memory)",
    )


def test_large_windings_are_designed_quickly_and_alike() -> None:
    first, second = design_winding(144, 20, 19), design_winding(144, 20, 19)
    assert first.family == second.family
    assert np.array_equal(first.group, second.group)


def _numbers(winding: Winding) -> tuple[int, int, int]:
    family = winding.family
    return family.slots, family.pole_pairs, family.suspension_pole_pairs


def _expect(winding: Winding, condition: str) -> None:
    with pytest.raises(WindingError) as caught:
        check_winding(winding)
    assert caught.value.condition == condition
