"""Winding factors and leakage against handbook tables, closed forms and plain phasor sums."""

from __future__ import annotations

import cmath
import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from outside import OutsideChecks

from evaluators.machine.winding.families import design_winding
from evaluators.machine.winding.spectrum import differential_leakage
from evaluators.machine.winding.star import WindingError, phase_belts
from evaluators.machine.winding.winding import Family, Winding

PRINTED = 6e-7  # half a unit of the sixth printed decimal, and a little for its rounding
ROUNDING = 1e-12  # sums of at most some hundred unit phasors

check = OutsideChecks("winding")
SIX = {"absolute": PRINTED, "why": "six printed decimals"}
EXACT = {"absolute": ROUNDING, "why": "rounding of sums of phasors"}
HANDBOOK = (
    "Pyrhonen, Jokinen, Hrabovcova, Design of Rotating Electrical Machines, 2nd ed. 2014, ch. 2 "
    "and 4; Richter, Elektrische Maschinen I, 1924 (first order and leakage from memory; other "
    "orders by the closed forms there)"
)
TOOTH_COILS = (
    "Cros, Viarouge, IEEE Trans. Energy Conv. 17(2), 2002; Magnussen, Sadarangani, IEMDC 2003; "
    "Skaar, Krovel, Nilssen, ICEM 2006 (three digits, from memory)"
)
COMBINED = (
    "computed from the definition; principle ps = p ± 1 in Chiba et al., Magnetic Bearings and "
    "Bearingless Drives, 2005, and Severson et al., IEEE Trans. Ind. Appl. 53(5), 2017"
)


def torque_winding(slots: int, pole_pairs: int, pitch: int) -> Winding:
    """All coils in group a: an ordinary winding, also where no combined winding exists."""
    phase, sense = phase_belts(slots, pole_pairs)
    family = Family(slots, pole_pairs, pole_pairs + 1, pitch)
    return Winding(family, phase, np.zeros(slots, dtype=np.int64), sense)


# Two-pole windings, factors of electrical orders 1, 3, 5, 7, 11, 13, then sigma_d.
INTEGRAL_SLOT = {
    (1, 3): (1.0, 1.0, 1.0, 1.0, 1.0, 1.0, 0.096623),
    (1, 2): (0.866025, 0.0, 0.866025, 0.866025, 0.866025, 0.866025, 0.096623),
    (2, 6): (0.965926, 0.707107, 0.258819, 0.258819, 0.965926, 0.965926, 0.028437),
    (2, 5): (0.933013, 0.500000, 0.066987, 0.066987, 0.933013, 0.933013, 0.023542),
    (2, 4): (0.836516, 0.0, 0.224144, 0.224144, 0.836516, 0.836516, 0.028437),
    (3, 9): (0.959795, 0.666667, 0.217568, 0.177363, 0.177363, 0.217568, 0.014061),
    (3, 8): (0.945214, 0.577350, 0.139850, 0.060662, 0.060662, 0.139850, 0.011495),
    (3, 7): (0.901912, 0.333333, 0.037780, 0.135868, 0.135868, 0.037780, 0.011090),
    (3, 6): (0.831207, 0.0, 0.188419, 0.153601, 0.153601, 0.188419, 0.014061),
    (4, 12): (0.957662, 0.653281, 0.205335, 0.157559, 0.126079, 0.126079, 0.008896),
    (4, 11): (0.949469, 0.603553, 0.162903, 0.095916, 0.016457, 0.016457, None),
    (4, 9): (0.884765, 0.250000, 0.078578, 0.145566, 0.048248, 0.048248, None),
    (4, 8): (0.829360, 0.0, 0.177825, 0.136450, 0.109187, 0.109187, None),
}

# k_w1, sigma_d, lcm and gcd of slots and poles. sigma_d of 3/2 is 4 pi^2/27 - 1.
TOOTH_COIL = {
    (3, 2): (0.866025, 0.462164, 6, 1),
    (6, 4): (0.866025, 0.462164, 12, 2),
    (6, 8): (0.866025, None, 24, 2),
    (9, 6): (0.866025, 0.462164, 18, 3),
    (12, 8): (0.866025, 0.462164, 24, 4),
    (12, 16): (0.866025, None, 48, 4),
    (9, 8): (0.945214, 1.182101, 72, 1),
    (9, 10): (0.945214, 2.409532, 90, 1),
    (12, 10): (0.933013, 0.968349, 60, 2),
    (12, 14): (0.933013, 2.857964, 84, 2),
    (15, 16): (0.951436, None, 240, 1),
    (18, 16): (0.945214, 1.182101, 144, 2),
    (18, 20): (0.945214, None, 180, 2),
    (24, 20): (0.933013, 0.968349, 120, 4),
    (24, 26): (0.949469, 2.212197, 312, 2),
    (24, 28): (0.933013, None, 168, 4),
    (36, 30): (0.933013, None, 180, 6),
}


@pytest.mark.parametrize(("q", "pitch"), INTEGRAL_SLOT)
def test_integral_slot_factors_match_the_handbook(q: int, pitch: int) -> None:
    *factors, leakage = INTEGRAL_SLOT[q, pitch]
    winding = torque_winding(6 * q, 1, pitch)
    found = winding.winding_factors([1, 3, 5, 7, 11, 13])[0]
    check("factors of integral-slot windings, orders 1 to 13", found, factors, **SIX,
          source=HANDBOOK)  # fmt: skip
    if leakage is not None:
        found = winding.differential_leakage("torque")
        check("differential leakage of integral-slot windings", found, leakage, **SIX,
              source=HANDBOOK)  # fmt: skip


@pytest.mark.parametrize(("slots", "poles"), TOOTH_COIL)
def test_tooth_coil_factors_match_published_tables(slots: int, poles: int) -> None:
    factor, leakage, cogging, force_order = TOOTH_COIL[slots, poles]
    winding = torque_winding(slots, poles // 2, 1)
    found = winding.torque_winding_factor
    check("factors of tooth coils", found, factor, **SIX, source=TOOTH_COILS)
    check.same(
        "periods of cogging and order of the no-load force",
        [winding.family.cogging_periods, winding.family.no_load_force_order],
        [cogging, force_order],
        source="lcm and gcd of slots and poles: Zhu, Howe, IEEE Trans. Energy Conv. 15(4), 2000",
    )
    if leakage is not None:
        found = winding.differential_leakage("torque")
        source = "Richter, Elektrische Maschinen I, 1924 (from memory; digits by its closed form)"
        check("differential leakage of tooth coils", found, leakage, **SIX, source=source)


def test_leakage_closed_forms() -> None:
    # q = 1: pi^2/9 - 1; a half slot per pole and phase: 4 pi^2/27 - 1.
    check(
        "differential leakage of one slot and of half a slot per pole and phase",
        [torque_winding(*case).differential_leakage("torque") for case in ((6, 1, 3), (3, 1, 1))],
        [math.pi**2 / 9 - 1, 4 * math.pi**2 / 27 - 1],
        relative=1e-12,
        why="rounding",
        source="closed forms of Richter, Elektrische Maschinen I, 1924 (from memory)",
    )


def test_leakage_is_the_sum_of_the_series() -> None:
    winding = design_winding(24, 5, 4)
    orders = np.arange(1, 60_001)
    forward, backward = winding.rotating_factors("suspension", orders)
    series = np.sum((forward / orders) ** 2 + (backward / orders) ** 2)
    main = (winding.suspension_winding_factor / 4) ** 2
    check(
        "differential leakage of a suspension winding",
        winding.differential_leakage("suspension"),
        series / main - 1,
        absolute=2 / 60_000 / main,
        why="the rest of the series is below 2/60000 of 1, over main = 0.035",
        source="series of 60,000 orders, by the definition",
    )


def test_leakage_refuses_a_wave_that_is_not_made() -> None:
    winding = design_winding(12, 4, 5)
    with pytest.raises(ValueError, match="order = 5"):
        differential_leakage(winding.torque_slot_mmf, 5)


def test_waves_of_twelve_slots_ten_poles() -> None:
    winding = design_winding(12, 5, 4)
    orders = np.arange(1, 20)
    forward, backward = winding.rotating_factors("torque", orders)
    expected = {1: 0.066987, 5: 0.933013, 7: 0.933013, 11: 0.066987, 13: 0.066987}
    expected |= {17: 0.933013, 19: 0.933013}  # 12 + 5, 12 + 7: slot harmonics
    check(
        "waves of twelve slots and ten poles",
        forward + backward,
        [expected.get(n, 0.0) for n in orders],
        **SIX,
        source="Cros, Viarouge 2002 (from memory)",
    )


@pytest.mark.parametrize(
    ("pitch", "torque", "suspension"),
    [
        (
            9,
            {1: 0.884765, 3: 0.25, 5: 0.078578, 7: 0.145566},
            {2: 0.591506, 4: 0.433013, 10: 0.158494},
        ),
        (8, {1: 0.829360, 3: 0.0}, {2: 0.724444, 3: 0.0, 4: 0.375, 8: 0.216506}),
    ],
)
def test_combined_two_pole_winding(
    pitch: int, torque: dict[int, float], suspension: dict[int, float]
) -> None:
    winding = design_winding(24, 1, 2, pitch)
    found = winding.winding_factors(list(torque))
    check("torque factors of a combined two-pole winding", found[0], list(torque.values()), **SIX,
          source=COMBINED)  # fmt: skip
    assert found[1] == pytest.approx(np.zeros(len(torque)), abs=ROUNDING)
    found = winding.winding_factors(list(suspension))[1]
    check("suspension factors of a combined two-pole winding", found, list(suspension.values()),
          **SIX, source=COMBINED)  # fmt: skip
    assert winding.winding_factors([2, 4, 6, 8, 10])[0] == pytest.approx(np.zeros(5), abs=ROUNDING)


def test_combined_tooth_coils_of_twelve_slots_eight_poles() -> None:
    winding = design_winding(12, 4, 5)
    assert [s.coils for s in winding.connections if s.phase == 0] == [(0, 3), (6, 9)]
    orders = np.arange(1, 12)
    torque = winding.rotating_factors("torque", orders)
    suspension = winding.rotating_factors("suspension", orders)
    # Order 4 one sense, 8 the other; 5 one sense, 7 the other, with 1 and 11 below.
    for waves, expected in (
        (torque, ({4: 0.866025}, {8: 0.866025})),
        (suspension, ({5: 0.683013, 11: 0.183013}, {7: 0.683013, 1: 0.183013})),
    ):
        for found, values in zip(waves, expected, strict=True):
            wanted = [values.get(n, 0.0) for n in orders]
            check("waves of combined tooth coils, 12 slots and 8 poles", found, wanted, **SIX,
                  source=COMBINED)  # fmt: skip


@given(q=st.integers(1, 5), p=st.integers(1, 4), n=st.integers(0, 20), data=st.data())
@settings(deadline=None, max_examples=60)
def test_integral_slot_closed_form(q: int, p: int, n: int, data: st.DataObject) -> None:
    n = 2 * n + 1
    pitch = data.draw(st.integers(1, 3 * q))
    below = q * math.sin(n * math.pi / (6 * q))
    distribution = math.sin(n * math.pi / 6) / below if abs(below) > 1e-9 else 1.0
    expected = abs(distribution * math.sin(n * math.pi * pitch / (6 * q)))
    winding = torque_winding(6 * p * q, p, pitch)
    check(
        "factors of any integral-slot winding, odd orders",
        winding.winding_factors(n * p)[0][0],
        expected,
        **EXACT,
        source="k_d and k_p of Pyrhonen et al., 2014, ch. 2 (from memory)",
    )


@pytest.mark.parametrize("numbers", [(6, 2, 1), (12, 4, 5), (18, 5, 4), (24, 1, 2), (30, 7, 8)])
def test_factors_are_plain_phasor_sums(numbers: tuple[int, int, int]) -> None:
    winding = design_winding(*numbers)
    slots, pitch = winding.family.slots, winding.family.coil_pitch
    orders = range(1, 2 * slots)
    torque, suspension = winding.winding_factors(list(orders))
    for n in orders:
        sums = [0j, 0j]
        for coil in range(slots):
            if winding.phase[coil] != 1:
                continue
            axis = cmath.exp(2j * cmath.pi * n * (coil + (pitch - 1) / 2) / slots)
            reach = math.sin(math.pi * n * pitch / slots) * int(winding.sense[coil])
            sums[0] += reach * axis
            sums[1] += reach * axis * (-1 if winding.group[coil] else 1)
        check(
            "torque and suspension factors of all orders, coil by coil",
            [torque[n - 1], suspension[n - 1]],
            [abs(total) / (slots / 3) for total in sums],
            absolute=ROUNDING * 10,
            why="rounding of sums of phasors",
            source="the definition, cf. Ouamara, Dubas, Acta Polytechnica 59(2), 2019",
        )


def test_star_that_does_not_divide_is_refused() -> None:
    # Bianchi and Dai Pre 2006 (from memory): symmetrical only if Q / gcd(Q, p) divides by m.
    for slots, pole_pairs in ((10, 4), (8, 3), (9, 9)):
        with pytest.raises(WindingError, match="3 phases"):
            phase_belts(slots, pole_pairs)
