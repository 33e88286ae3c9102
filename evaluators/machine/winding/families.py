"""Which families exist: the conditions a winding must meet, the coil pitch, the enumeration."""

from __future__ import annotations

import operator
from collections.abc import Iterable
from dataclasses import dataclass, replace

import numpy as np

from evaluators.machine.winding.star import (
    BALANCE_TOLERANCE,
    PHASES,
    WindingError,
    phase_belts,
    phase_sequence,
    split_groups,
)
from evaluators.machine.winding.winding import Family, Winding

__all__ = [
    "SUSPENSION_FACTOR_MINIMUM",
    "TORQUE_FACTOR_MINIMUM",
    "Family",
    "Refusal",
    "WindingError",
    "check_winding",
    "design_winding",
    "enumerate_families",
]

TORQUE_FACTOR_MINIMUM = 0.866
"""Smallest torque winding factor (common practice: above about 0.87; tooth coils reach 0.866)."""

SUSPENSION_FACTOR_MINIMUM = 0.4
"""Smallest useful suspension winding factor.

The copper loss of a given force grows with the inverse square of the factor: at 0.4 it is about
six times that of an ideal winding, and nearly five times that of a factor as good as the least
torque factor. Suspension takes a small share of the slot current, so less than that would still
levitate, but at such a price that another pitch or family is the better answer.
"""


@dataclass(frozen=True)
class Refusal:
    """A family that cannot be wound: `condition` names what failed, `reason` is the sentence."""

    slots: int
    pole_pairs: int
    suspension_pole_pairs: int
    condition: str
    reason: str

    @property
    def id(self) -> str:
        """Short name of slots and pole pairs, as of a feasible family."""
        return f"Q{self.slots}p{self.pole_pairs}s{self.suspension_pole_pairs}"


def design_winding(
    slots: int, pole_pairs: int, suspension_pole_pairs: int, coil_pitch: int | None = None
) -> Winding:
    """Design the combined winding of one family.

    Star of slots at p for phases and senses, star at ps for the groups, then the coil pitch.
    Without `coil_pitch`, of all pitches up to half the slots whose torque factor is at least
    `TORQUE_FACTOR_MINIMUM` and whose suspension factor is at least `SUSPENSION_FACTOR_MINIMUM`,
    tooth coils (pitch 1) are taken if they are among them, because their end turns do not cross;
    else the pitch with the largest suspension factor, of equals the shortest. A stated
    `coil_pitch` may fall below both limits but must make both fields.

    The star puts torque first: no other symmetrical winding of as large a torque factor has a
    better split. Giving up torque factor for suspension factor down to the limit is not tried; of
    the families with up to 18 slots and 8 pole pairs it would help Q12p2s1 alone (0.683 for 0.612).

    Parameters
    ----------
    slots, pole_pairs, suspension_pole_pairs : int
        Q, p and ps = p +- 1.
    coil_pitch : int, optional
        Coil span in slots, 1 to Q // 2.

    Raises
    ------
    WindingError
        Naming the condition that fails.
    """
    # The pitch plays no part in the layout, so any serves until the layout is known.
    family = Family(
        slots, pole_pairs, suspension_pole_pairs, 1 if coil_pitch is None else coil_pitch
    )
    _require_divisible(family)
    phase, sense = phase_belts(slots, pole_pairs)
    group = split_groups(slots, suspension_pole_pairs, phase, sense)
    winding = Winding(family, phase, group, sense)
    if coil_pitch is None:
        pitch = _choose_pitch(winding)
        winding = replace(winding, family=replace(family, coil_pitch=pitch))
    check_winding(winding)
    return winding


def check_winding(winding: Winding) -> None:
    """Check every condition of a combined winding on the finished layout, however it was made.

    Equal division of coils among phases and groups; both fields made at all; phases balanced at
    p and ps; torque EMF of group a equal to that of group b, in every phase.

    Raises
    ------
    WindingError
        Naming the first condition that fails.
    """
    family = winding.family
    counts = np.bincount(winding.phase * 2 + winding.group, minlength=2 * PHASES)
    if np.ptp(counts):
        raise _refuse(
            family, "equal division", f"its phases and groups hold {counts.tolist()} coils"
        )
    torque = winding.phase_phasors("torque", family.pole_pairs)[:, 0]
    suspension = winding.phase_phasors("suspension", family.suspension_pole_pairs)[:, 0]
    for name, phasors, order in (
        ("torque", torque, family.pole_pairs),
        ("suspension", suspension, family.suspension_pole_pairs),
    ):
        if float(np.abs(phasors).max()) < BALANCE_TOLERANCE:
            problem = (
                f"with coil pitch {family.coil_pitch} it makes no {name} field of order {order}"
            )
            raise _refuse(family, "both fields made", problem)
        try:
            phase_sequence(phasors)
        except WindingError as error:
            problem = f"at order {order} ({name}) {error}"
            raise _refuse(family, error.condition, problem) from None
    # The suspension connection is a - b, so its phasor at p is the difference of the groups.
    difference = np.abs(winding.phase_phasors("suspension", family.pole_pairs)).max()
    if difference > BALANCE_TOLERANCE * np.abs(torque).max():
        problem = (
            f"the torque EMF of groups a and b differs by {difference / np.abs(torque).max():.3g} "
            "of their sum, so that the suspension terminals see torque voltage"
        )
        raise _refuse(family, "equal torque EMF of groups", problem)


def enumerate_families(slots: Iterable[int], pole_pairs: Iterable[int]) -> list[Winding | Refusal]:
    """Try every combination of slots and pole pairs with both ps = p - 1 and ps = p + 1.

    Returns
    -------
    list of Winding or Refusal
        In the order given, slots outermost; a refusal says which condition failed.
    """
    pairs = [operator.index(p) for p in pole_pairs]
    results: list[Winding | Refusal] = []
    for q in map(operator.index, slots):
        for p in pairs:
            for ps in (p - 1, p + 1):
                if ps == 0:
                    continue
                try:
                    results.append(design_winding(q, p, ps))
                except WindingError as error:
                    results.append(Refusal(q, p, ps, error.condition, str(error)))
    return results


def _refuse(family: Family, condition: str, problem: str) -> WindingError:
    return WindingError(f"{family.id} cannot be wound: {problem}", condition)


def _require_divisible(family: Family) -> None:
    for name, value in (
        ("pole pairs", family.pole_pairs),
        ("suspension pole pairs", family.suspension_pole_pairs),
    ):
        if value % PHASES == 0:
            problem = (
                f"{value} {name} are a multiple of {PHASES}, so three phases make no such field"
            )
            raise _refuse(family, f"{name} no multiple of three", problem)
    if family.slots % PHASES:
        problem = f"{family.slots} slots do not divide among {PHASES} phases"
        raise _refuse(family, "equal division among phases", problem)
    if family.slots % (2 * PHASES):
        problem = (
            f"the {family.slots // PHASES} coils of a phase do not divide into two equal groups"
        )
        raise _refuse(family, "equal division among groups", problem)


def _choose_pitch(winding: Winding) -> int:
    family = winding.family
    factors = []
    for pitch in range(1, family.slots // 2 + 1):
        trial = replace(winding, family=replace(family, coil_pitch=pitch))
        factors.append((pitch, trial.torque_winding_factor, trial.suspension_winding_factor))
    enough = [item for item in factors if item[1] >= TORQUE_FACTOR_MINIMUM]
    if not enough:
        best = max(factors, key=lambda item: item[1])
        problem = (
            f"no coil pitch gives a torque winding factor of at least {TORQUE_FACTOR_MINIMUM}; "
            f"the best, pitch {best[0]}, gives {best[1]:.3f}"
        )
        raise _refuse(family, "torque winding factor", problem)
    useful = [item for item in enough if item[2] >= SUSPENSION_FACTOR_MINIMUM]
    if not useful:
        best = max(enough, key=lambda item: item[2])
        problem = (
            f"no coil pitch with enough torque factor gives a suspension winding factor of at "
            f"least {SUSPENSION_FACTOR_MINIMUM}; the best, pitch {best[0]}, gives {best[2]:.3f}"
        )
        raise _refuse(family, "suspension winding factor", problem)
    if useful[0][0] == 1:
        return 1
    top = max(item[2] for item in useful)
    return next(item[0] for item in useful if item[2] >= top - BALANCE_TOLERANCE)
