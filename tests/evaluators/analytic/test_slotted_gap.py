"""The slotted gap against conformal maps, Ampere's law and the smooth limit."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from outside import OutsideChecks

from evaluators.analytic.gap import GapField, Iron, SlottedGap
from evaluators.analytic.rotor import MU_0, RotorRadii
from evaluators.analytic.slots import SlotMouth

FloatArray = NDArray[np.float64]

check = OutsideChecks("field")


def deep_slot(modes: int) -> SlotMouth:
    """A slot with radial walls and no bottom: a mode dies out as exp(-k pi/2 x)."""
    decay = 0.5 * np.pi * np.arange(1, modes + 1)
    zero = np.zeros(1)
    return SlotMouth(
        compliance=np.diag(1.0 / decay)[None],
        current_share=np.zeros((1, modes)),
        permeance=zero,
        tooth_permeance=zero,
        yoke_permeance=zero,
        wall=np.zeros((1, 4, modes)),
        wall_permeance=np.zeros((1, 4)),
    )


def smooth_rotor(core: float, bore: float) -> RotorRadii:
    """An iron rotor without magnets."""
    middle = 0.5 * (core + bore)
    return RotorRadii(np.array([core]), np.array([middle]), np.array([bore]), 1.0)


def coefficients(field: GapField) -> tuple[NDArray[np.int64], FloatArray, FloatArray]:
    """Orders of either sign with their rising and falling coefficients, first design, 1-D."""
    order = field.orders.ravel()
    kept = order != 0
    return order[kept], field.rising[0].ravel()[kept], field.falling[0].ravel()[kept]


def density(
    field: GapField, bore: float, radius: float, angle: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Radial and tangential flux density, T; the field is the coefficients plus conjugates."""
    order, rising, falling = coefficients(field)
    size = np.abs(order)
    ratio = (radius / bore) ** size
    wave = np.exp(1j * order[:, None] * angle)
    radial = 2.0 * np.real((1j * order * (rising * ratio + falling / ratio)) @ wave) / radius
    tangential = 2.0 * np.real(-(size * (rising * ratio - falling / ratio)) @ wave) / radius
    return radial, tangential


# -- Carter -----------------------------------------------------------------------------------

CARTER = [
    # pitch, gap, opening (any unit of length), k_C = pitch / (pitch - gamma gap) with
    # gamma = (4/pi) (x/2 atan(x/2) - ln sqrt(1 + (x/2)^2)), x = opening/gap.
    (10.0, 1.0, 3.0, 1.126969),
    (12.0, 0.5, 2.0, 1.080825),
    (20.0, 1.0, 2.0, 1.028739),
    (8.0, 2.5, 2.0, 1.032026),
]


def carter(pitch: float, gap: float, opening: float, modes: int, reach: int) -> float:
    """Loss of flux of a wave much longer than the slot pitch."""
    slots, bore = 240, 25e-3
    scale = 2.0 * np.pi / slots / pitch  # the map ln r turns the ring into a plane strip
    rotor = smooth_rotor(bore * np.exp(-gap * scale), bore)
    slotted = SlottedGap(
        rotor, np.array([opening * scale]), deep_slot(modes), slots, np.array([1]), reach
    )
    field = slotted.of_magnets(np.ones((1, 1), dtype=complex))
    order, rising, falling = coefficients(field)
    return float(1.0 / (rising + falling)[order == 1][0].real)


@pytest.mark.parametrize(("pitch", "gap", "opening", "expected"), CARTER)
def test_carter_coefficient(pitch: float, gap: float, opening: float, expected: float) -> None:
    for modes, reach, tolerance in ((5, 16, 2e-3), (16, 120, 6e-4)):
        check(
            f"Carter's coefficient with {modes} modes a slot",
            carter(pitch, gap, opening, modes, reach),
            expected,
            relative=tolerance,
            why="Galerkin's method at sharp corners converges with 1/modes: 0.05 % of the flux at "
            "16 modes, 0.2 % at the evaluator's 5",
            source="own evaluation of Carter, J. IEE 64, 1926",
        )


# -- complex permeance ------------------------------------------------------------------------

MAP = "own evaluation of the conformal map of Zarko, Ban, Lipo, IEEE Trans. Magn. 42(7), 2006"

# degrees from the slot centre: radial and tangential flux density at 24.5 mm over the radial one
# without slot, Rr = 20, Rs = 25 mm, opening 8 degrees, infinitely deep slot with radial walls.
# Tangential flux is positive towards growing angles where the radial flux points outwards.
PERMEANCE = {
    0: (0.6760129, 0.0),
    1: (0.6895847, 0.1028070),
    2: (0.7390009, 0.2104320),
    3: (0.8579836, 0.3092063),
    4: (1.056767, 0.2863790),
    5: (1.116701, 0.1365099),
    6: (1.086599, 0.0621076),
    8: (1.041854, 0.0194801),
    10: (1.022047, 0.0084034),
    15: (1.005517, 0.0017352),
}
ON_THE_ROTOR = {0: 0.9543815, 2: 0.9565871, 4: 0.9626192, 6: 0.9705355, 10: 0.9850900}


def relative_permeance(
    radius: float, degrees: FloatArray, core: float = 20e-3, opening: float = 8.0
) -> tuple[FloatArray, FloatArray]:
    """Two slots opposite each other, each under one half of a rotor of two magnetic potentials.

    The potentials change a quarter turn from the slots, seven gaps away, so each slot stands in a
    uniform field; only the part of the field that the slots make is summed, it converges fast.
    """
    bore = 25e-3
    gap, orders = np.log(bore / core), np.arange(1, 80, 2)
    potential = 4.0 / (np.pi * orders) / 2j  # of the rotor, mu0 U = 1: a square wave
    smooth = potential / (1j * np.sinh(orders * gap))
    slotted = SlottedGap(
        smooth_rotor(core, bore),
        np.array([np.radians(opening)]),
        deep_slot(12),
        2,
        orders,
        400,
    )
    whole = slotted.of_magnets(smooth[None])
    own = 0.5 * np.where(whole.orders == orders[:, None], smooth[:, None], 0.0)
    slots_alone = GapField(
        whole.classes,
        whole.orders,
        whole.rising - own,
        whole.falling - own,
        whole.slot,
        whole.tips,
    )
    angle = 0.5 * np.pi + np.radians(degrees)
    radial, tangential = density(slots_alone, bore, radius, angle)
    return 1.0 + radial * radius * gap, tangential * radius * gap


def test_permeance_half_a_millimetre_from_the_bore() -> None:
    degrees = np.array(list(PERMEANCE), dtype=np.float64)
    radial, tangential = relative_permeance(24.5e-3, degrees)
    expected = np.array(list(PERMEANCE.values()))
    found = np.stack([radial, tangential], axis=1)
    near = np.abs(degrees - 4.0) < 1.5
    for where, rows, tolerance, why in (
        ("beside the corner", near, 5e-3, "12 modes leave half a per cent beside the corner"),
        ("away from it", ~near, 1.2e-3, "12 modes leave a tenth of a per cent of the density"),
    ):
        check(
            f"relative permeance of a slot near the bore, {where}",
            found[rows],
            expected[rows],
            absolute=tolerance,
            why=why,
            source=MAP,
        )


def test_permeance_on_the_rotor() -> None:
    degrees = np.array(list(ON_THE_ROTOR), dtype=np.float64)
    radial, tangential = relative_permeance(20e-3, degrees)
    why = "12 modes leave 0.9 % of the deficit that the slot makes here"
    expected = list(ON_THE_ROTOR.values())
    what = "relative permeance of a slot on the rotor"
    check(what, radial, expected, absolute=4e-4, why=why, source=MAP)
    np.testing.assert_allclose(tangential, 0.0, atol=1e-8)  # 800 orders that cancel
    # Under the slot centre the map gives 1/sqrt(1 + (b/2g)^2) in the log plane.
    half = np.radians(4.0)
    assert radial[0] == pytest.approx(1.0 / np.hypot(1.0, half / np.log(1.25)), abs=4e-4)


def test_permeance_of_a_thin_gap() -> None:
    # Rr = 24, Rs = 25 mm, opening 6 degrees, mid-gap; same map.
    degrees = np.array([0.0, 1.0, 2.0, 3.0, 4.0, 6.0])
    radial, tangential = relative_permeance(24.5e-3, degrees, core=24e-3, opening=6.0)
    expected = (0.5696129, 0.6012262, 0.7115140, 0.9017435, 0.9903710, 1.000014)
    across = (0.0, 0.0777796, 0.1561940, 0.1542978, 0.0575361, 0.0040464)
    check(
        "relative permeance of a slot in a thin gap",
        [radial, tangential],
        [expected, across],
        absolute=4e-3,
        why="in mid-gap the orders cut off at 800 still count 0.3 % at the corner",
        source=MAP,
    )


# -- limits and laws --------------------------------------------------------------------------


def test_closing_slots_leave_the_smooth_bore() -> None:
    smooth = np.array([[0.02 + 0.01j]])
    rotor = smooth_rotor(20e-3, 25e-3)
    left = []
    for opening in (5e-2, 1.6e-2, 5e-3):
        gap = SlottedGap(rotor, np.array([opening]), deep_slot(5), 12, np.array([4]), 400)
        field = gap.of_magnets(smooth)
        order, rising, falling = coefficients(field)
        here = order == 4
        left.append(abs((rising + falling)[here][0] - smooth[0, 0]) / abs(smooth[0, 0]))
        assert abs((rising - falling)[here][0]) < left[0] * abs(smooth[0, 0])
    # Carter's deficit of narrow slots goes with the square of the opening; the tooth edges of the
    # narrowest are resolved to a quarter of the opening.
    assert left[0] < 5e-3
    assert left[1] / left[0] == pytest.approx(0.32**2, rel=0.05)
    assert left[2] / left[1] == pytest.approx(0.3125**2, rel=0.05)


@pytest.mark.parametrize("saturated", [False, True])
def test_ampere_law_around_every_slot(saturated: bool) -> None:
    """The line integral of H from tooth centre to tooth centre is minus the current between.

    With perfect iron; else the teeth and the yoke take the stated voltage of the flux they carry.
    """
    slots, bore, reach = 12, 25e-3, 60
    iron = Iron(*(np.array([x]) for x in (0.3, 0.7, np.inf, 0.0))) if saturated else None
    gap = SlottedGap(
        smooth_rotor(20e-3, bore), np.array([0.12]), deep_slot(8), slots, np.arange(12), reach, iron
    )
    rng = np.random.default_rng(4)
    current = rng.normal(size=slots)
    current -= current.mean()  # what enters the plane leaves it
    # Half, because a GapField stands for itself plus its conjugate.
    field = gap.of_currents(0.5 * np.fft.fft(current)[None] / slots)

    nodes, weights = np.polynomial.legendre.leggauss(400)
    found = []
    for j in range(slots):
        angle = 2.0 * np.pi / slots * (j + 0.5 + 0.5 * nodes)
        _, tangential = density(field, bore, bore, angle)
        found.append(np.sum(weights * tangential) * np.pi / slots * bore / MU_0)
    turn = np.exp(2j * np.pi * np.outer(np.arange(slots), np.arange(slots)) / slots)
    potential = 2.0 * np.real(turn @ field.slot[0])
    lost = np.zeros(slots)
    if saturated:
        tooth = potential - np.roll(potential, 1)  # tooth j lies before slot j
        lost = (0.3 * (tooth - np.roll(tooth, -1)) + 0.7 * potential) / MU_0
    iron_word = "saturated" if saturated else "perfect"
    check(
        f"line integral of H round every slot over the largest current, {iron_word} iron",
        np.array(found) / np.abs(current).max(),
        -(current - lost) / np.abs(current).max(),
        absolute=2e-3,
        why="Fourier series cut at the tooth centres, far from the corners: 1e-3",
        source="Ampère's law",
    )


def test_no_tangential_field_on_tooth_faces() -> None:
    gap = SlottedGap(
        smooth_rotor(20e-3, 25e-3), np.array([0.12]), deep_slot(12), 12, np.array([4]), 400
    )
    field = gap.of_magnets(np.ones((1, 1), dtype=complex))
    angle = 2.0 * np.pi / 12 * np.linspace(-0.35, 0.35, 51)  # the tooth reaches to 0.385 of a pitch
    radial, tangential = density(field, 25e-3, 25e-3, angle)
    # The series of a field that jumps at the tooth edge, cut at order 4800.
    assert np.abs(tangential).max() < 5e-3 * np.abs(radial).max()


def test_flux_of_slots_follows_from_the_gap() -> None:
    # The mean of A over the mouth from the harmonics by quadrature; a deep slot without current
    # share adds nothing on the way to the winding.
    gap = SlottedGap(
        smooth_rotor(20e-3, 25e-3), np.array([0.12]), deep_slot(5), 12, np.array([5]), 16
    )
    field = gap.of_magnets(np.array([[1.0 - 2.0j]]))
    order, rising, falling = coefficients(field)
    nodes, weights = np.polynomial.legendre.leggauss(40)
    for j in (0, 3, 7):
        angle = 2.0 * np.pi / 12 * (j + 0.5) + 0.06 * nodes
        mean = 0.5 * weights @ (np.exp(1j * angle[:, None] * order) @ (rising + falling))
        turned = field.slot[0, 0] * np.exp(2j * np.pi * 5 * j / 12)
        check(
            "flux of a slot from the harmonics over its mouth",
            turned,
            mean,
            relative=1e-9,
            why="quadrature of a smooth sum",
            source="mean of the potential by Gauss' rule",
        )
