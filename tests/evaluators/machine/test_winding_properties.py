"""Statements that hold for every combined winding, whatever its slots, pole pairs and pitch."""

from __future__ import annotations

import numpy as np
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from outside import OutsideChecks

from evaluators.machine.winding.families import WindingError, design_winding
from evaluators.machine.winding.winding import Winding

ROUNDING = 1e-11  # sums of up to 200 unit phasors

check = OutsideChecks("winding")
WORDS = {"absolute": ROUNDING, "why": "rounding of sums of up to 200 phasors"}


@st.composite
def windings(draw: st.DrawFn) -> Winding:
    slots = 6 * draw(st.integers(1, 14))
    pole_pairs = draw(st.integers(1, 25).filter(lambda p: p % 3))
    suspension = pole_pairs + 1 if pole_pairs % 3 == 1 else pole_pairs - 1
    pitch = draw(st.integers(1, slots // 2))
    try:
        return design_winding(slots, pole_pairs, suspension, pitch)
    except WindingError as error:
        # A pitch may null a field; anything else that fails for these numbers is a fault.
        assume(error.condition != "both fields made")
        raise


@given(winding=windings())
@settings(deadline=None, max_examples=60)
def test_parity_and_slot_harmonics(winding: Winding) -> None:
    """No crosstalk; slot harmonics have the factor of the main order."""
    family = winding.family
    orders = np.arange(0, 3 * family.slots)
    torque, suspension = winding.winding_factors(orders)
    odd = (orders - family.pole_pairs) % 2 == 1
    check(
        "torque factors at orders of other parity than p, suspension factors at those of the same",
        np.where(odd, torque, suspension),
        0.0,
        **WORDS,
        source="Severson et al., IEEE Trans. Ind. Appl. 53(5), 2017 (principle; from memory)",
    )
    assert winding.residual_voltage == 0.0
    for factors, main in (
        (winding.winding_factors, family.pole_pairs),
        (lambda n: winding.winding_factors(n)[::-1], family.suspension_pole_pairs),
    ):
        harmonics = [k * family.slots + sign * main for k in (1, 2, 3) for sign in (1, -1)]
        found = factors([main, *harmonics])[0]
        source = "orders kQ ± p have the factor of p (common practice)"
        check("factors of slot harmonics", found[1:], found[0], **WORDS, source=source)


@given(winding=windings())
@settings(deadline=None, max_examples=60)
def test_waves_turn_by_residue_of_three(winding: Winding) -> None:
    """Phases moved by 120 degrees: multiples of three vanish, residues 1 and 2 turn opposite."""
    orders = np.arange(1, 2 * winding.family.slots)
    mains = (winding.family.pole_pairs, winding.family.suspension_pole_pairs)
    for connection, main in zip(("torque", "suspension"), mains, strict=True):
        forward, backward = winding.rotating_factors(connection, orders)
        phase = winding.winding_factors(orders)[0 if connection == "torque" else 1]
        same = orders % 3 == main % 3
        opposite = (orders + main) % 3 == 0
        assert np.allclose(forward, np.where(same, phase, 0.0), atol=ROUNDING, rtol=0)
        assert np.allclose(backward, np.where(opposite, phase, 0.0), atol=ROUNDING, rtol=0)
    # Exactly one of p - 1 and p + 1 is excited by suspension current, and it is ps.
    p = winding.family.pole_pairs
    neighbours = [n for n in (p - 1, p + 1) if n > 0]
    waves = np.sum(winding.rotating_factors("suspension", neighbours), axis=0)
    assert [n for n, wave in zip(neighbours, waves, strict=True) if wave > 1e-9] == [mains[1]]


@given(winding=windings(), turn=st.integers(1, 83))
@settings(deadline=None, max_examples=40)
def test_turning_or_reversing_the_winding_changes_no_factor(winding: Winding, turn: int) -> None:
    turned = Winding(
        winding.family,
        np.roll(winding.phase, turn),
        np.roll(winding.group, turn),
        -np.roll(winding.sense, turn),
    )
    orders = np.arange(1, 60)
    for before, after in zip(
        winding.winding_factors(orders), turned.winding_factors(orders), strict=True
    ):
        assert np.allclose(before, after, atol=ROUNDING, rtol=0)
    for connection in ("torque", "suspension"):
        before = winding.differential_leakage(connection)
        after = turned.differential_leakage(connection)
        assert np.isclose(before, after, rtol=1e-6)  # factors as small as 1e-4 amplify rounding


@given(winding=windings())
@settings(deadline=None, max_examples=40)
def test_energy_of_all_waves_is_that_of_the_slot_currents(winding: Winding) -> None:
    """Parseval over one period of Q orders."""
    slots = winding.family.slots
    for connection in ("torque", "suspension"):
        orders = np.arange(1, slots)
        forward, _ = winding.rotating_factors(connection, orders)
        waves = np.sum((2 * slots * forward) ** 2)
        currents = slots * np.sum(np.abs(winding.slot_mmf(connection)) ** 2)
        assert np.isclose(waves, currents, rtol=1e-10)  # rounding


@given(winding=windings())
@settings(deadline=None, max_examples=40)
def test_slot_currents_sum_to_zero_and_layers_are_full(winding: Winding) -> None:
    assert abs(winding.torque_slot_mmf.sum()) < ROUNDING
    assert abs(winding.suspension_slot_mmf.sum()) < ROUNDING
    for side in (0, 1):
        assert sorted(winding.coil_slots[:, side]) == list(range(winding.family.slots))
