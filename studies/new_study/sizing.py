"""First-order sizing of a machine from power, speed and DC link: where a search may start.

Every number here is a rule of thumb that only centres the bounds of a new study; the search and
the limits decide.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from math import pi

from evaluators.machine.winding.families import enumerate_families
from evaluators.machine.winding.winding import Winding

# Torque per rotor volume of surface-magnet machines without liquid in the winding: 5 to 20 kN m/m3
# (common practice). The suspension current takes part of the slot, hence the lower middle.
TORQUE_PER_VOLUME = 9e3  # N m/m3

# Surface speed that sleeved magnets survive with margin at overspeed (common practice: up to about
# 200 m/s at the duty with fibre or nickel sleeves).
TIP_SPEED = 180.0  # m/s

LENGTH_RATIO = 1.0  # stack over rotor diameter: short enough for a stiff rotor

# Frequency up to which 0.1 to 0.2 mm sheet and stranded wire keep their losses (common practice).
ELECTRICAL_FREQUENCY = 1700.0  # Hz

SLOTS = (6, 12, 18, 24)
POLE_PAIRS = (1, 2, 4, 5, 7, 8)
MOST_FAMILIES = 8

MAGNET_SHARE = 0.2  # magnet thickness over rotor radius
CLEARANCE_SHARE = 0.012  # mechanical clearance over rotor radius
SMALLEST_CLEARANCE = 0.3e-3  # m; touchdown bearings need half of it for themselves

MAGNET_DENSITY = 7600.0  # kg/m3, sintered NdFeB
FIBRE_DENSITY = 1600.0  # kg/m3
FIBRE_STRESS = 500e6  # Pa, hoop stress to aim at; half a wound fibre's strength
THINNEST_SLEEVE = 0.5e-3  # m


@dataclass(frozen=True)
class Sizing:
    """A machine in round figures, SI units."""

    torque: float
    rotor_radius: float
    stack_length: float
    tip_speed: float
    limited_by_tip_speed: bool
    clearance: float
    magnet_thickness: float
    sleeve_thickness: float
    families: tuple[str, ...]
    highest_frequency: float


def size(power: float, speed: float, overspeed_ratio: float) -> Sizing:
    """Size a machine.

    The rotor volume follows from the torque, the radius from a stack as long as the rotor is
    wide, held back by the tip speed. The sleeve is a thin ring that carries its own rotation and
    the magnets' at overspeed: stress = density v^2 + magnet density h v^2 / thickness.

    Parameters
    ----------
    power : float
        W.
    speed : float
        rad/s.
    overspeed_ratio : float
        Over `speed`.
    """
    torque = power / speed
    volume = torque / TORQUE_PER_VOLUME
    radius = (volume / (2.0 * pi * LENGTH_RATIO)) ** (1.0 / 3.0)
    limited = radius * speed > TIP_SPEED
    if limited:
        radius = TIP_SPEED / speed
    magnet = MAGNET_SHARE * radius
    fastest = radius * speed * overspeed_ratio
    spare = FIBRE_STRESS - FIBRE_DENSITY * fastest**2
    sleeve = max(THINNEST_SLEEVE, MAGNET_DENSITY * magnet * fastest**2 / spare)
    families, frequency = _families(speed)
    return Sizing(
        torque=torque,
        rotor_radius=radius,
        stack_length=volume / (pi * radius**2),
        tip_speed=radius * speed,
        limited_by_tip_speed=limited,
        clearance=max(SMALLEST_CLEARANCE, CLEARANCE_SHARE * radius),
        magnet_thickness=magnet,
        sleeve_thickness=sleeve,
        families=families,
        highest_frequency=frequency,
    )


def _families(speed: float) -> tuple[tuple[str, ...], float]:
    """Families whose electrical frequency stays moderate, fewest slots first; and the highest.

    Every pole number has its turn: few poles save iron loss, many save yoke and end turns, and
    which of them wins is what a search is for.
    """
    turns = speed / (2.0 * pi)
    pairs = [p for p in POLE_PAIRS if p * turns <= ELECTRICAL_FREQUENCY] or list(POLE_PAIRS[:2])
    found = [item for item in enumerate_families(SLOTS, pairs) if isinstance(item, Winding)]
    # Short coils first: their end turns are shorter and do not cross.
    found.sort(key=lambda item: (item.family.coil_pitch / item.family.slots, item.family.slots))
    met: Counter[int] = Counter()
    turn = []
    for item in found:
        turn.append(met[item.family.pole_pairs])
        met[item.family.pole_pairs] += 1
    order = sorted(range(len(found)), key=lambda index: (turn[index], index))
    kept = sorted(
        [found[index] for index in order[:MOST_FAMILIES]],
        key=lambda item: (item.family.slots, item.family.pole_pairs),
    )
    return (
        tuple(item.family.id for item in kept),
        max(item.family.pole_pairs for item in kept) * turns,
    )
