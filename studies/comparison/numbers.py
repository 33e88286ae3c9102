"""Families held against each other by their fronts; numbers here, words in `comparison_text`."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import permutations
from typing import Any

import numpy as np

from evaluators.machine.metrics import METRIC
from optimizer.fronts import additive_epsilon, coverage, hypervolume, non_dominated, normalise
from studies.errors import ResultsError
from studies.stored.families import FloatArray, StoredFamily, stored_families
from studies.stored.layout import Results
from studies.stored.verified import VerifiedFamily
from studies.stored.violations import least_violating
from studies.study_file.crosschecks import Objective

REFERENCE = 1.1  # in every objective, once the joint fronts span 0 to 1
BINDING = 0.01  # a limit binds a design that keeps less than this share of it in reserve
KEY_METRICS = (
    "efficiency",
    "torque_ripple",
    "force_error_magnitude",
    "force_error_angle_deg",
    "lift_off_ratio",
    "tip_speed_m_s",
    "outer_diameter_mm",
    "stack_length_mm",
    "mass_kg",
    "cost",
)
LOSSES = (
    "loss_copper_W",
    "loss_teeth_W",
    "loss_yoke_W",
    "loss_magnet_W",
    "loss_sleeve_W",
    "loss_air_friction_W",
    "loss_total_W",
)


@dataclass(frozen=True)
class Member:
    """One family in a comparison."""

    label: str
    results: Results
    stored: StoredFamily
    limits: tuple[str, ...]
    hypervolume: float
    joint_share: float
    joint_count: int
    compromise: int | None
    binding: dict[str, float]
    currency: str


@dataclass(frozen=True)
class Comparison:
    """Families compared on one scale.

    Attributes
    ----------
    members : tuple of Member
        In the order given.
    objectives : tuple of Objective
    ideal, nadir : array (m,)
        Smallest and largest minimised value over all fronts: where the scale is 0 and 1.
    coverage, epsilon : mapping of (label, label)
        Of the first over the second; epsilon on the common scale.
    dominated : tuple of (label, label)
        The first is dominated by the second.
    """

    members: tuple[Member, ...]
    objectives: tuple[Objective, ...]
    ideal: FloatArray
    nadir: FloatArray
    coverage: dict[tuple[str, str], float]
    epsilon: dict[tuple[str, str], float]
    dominated: tuple[tuple[str, str], ...]


def compare_families(
    opened: Sequence[Results], verified_by: str = "", *, verified_only: bool = False
) -> Comparison:
    """Compare all families stored in one or several studies.

    The scale is common: 0 is the smallest and 1 the largest value of each objective over all
    fronts together. Hypervolume is the share of the box from 0 to `REFERENCE` in every objective
    that a front dominates.

    Parameters
    ----------
    opened : sequence of Results
    verified_by : str
        Evaluator whose verified values count where there are any; see `VerifiedFamily`.
    verified_only : bool
        Leave out designs that were not verified by it.

    Raises
    ------
    ResultsError
        If the studies have different objectives, or nothing is stored.
    """
    first = opened[0].study
    for results in opened[1:]:
        if results.study.objectives != first.objectives:
            names = [
                ", ".join(f"{'-' if g.maximise else ''}{g.name}" for g in study.objectives)
                for study in (first, results.study)
            ]
            msg = (
                f"{opened[0].folder} and {results.folder} have different objectives ({names[0]}; "
                f"{names[1]}), so their fronts cannot be held against each other"
            )
            raise ResultsError(msg)
    several = len(opened) > 1

    def counted(stored: StoredFamily) -> StoredFamily:
        if not verified_by:
            return stored
        return VerifiedFamily(stored.searches, verified_by, verified_only)

    # Folder names serve as labels where two studies carry one name.
    found = [
        (
            f"{results.folder.name}/{stored.family}" if several else stored.family,
            results,
            counted(stored),
        )
        for results in opened
        for stored in stored_families(results)
    ]
    labels = [label for label, _, _ in found]
    if len(set(labels)) < len(labels):
        found = [(f"{r.folder}/{s.family}", r, s) for _, r, s in found]
    if not found:
        msg = f"{opened[0].folder}: nothing is stored yet; `hovergap resume` searches it"
        raise ResultsError(msg)
    fronts = [stored.front_objectives for _, _, stored in found]
    joint = np.concatenate(fronts)
    if len(joint):
        ideal, nadir = joint.min(axis=0), joint.max(axis=0)
    else:
        ideal = nadir = np.full(len(first.objectives), np.nan)
    scaled = [normalise(front, ideal, nadir) if len(front) else front for front in fronts]
    owner = np.repeat(np.arange(len(fronts)), [len(front) for front in fronts])
    on_joint = non_dominated(joint) if len(joint) else np.zeros(0, dtype=np.bool_)
    box = REFERENCE ** len(first.objectives)
    corner = np.full(len(first.objectives), REFERENCE)
    members = []
    for position, (label, results, stored) in enumerate(found):
        points = scaled[position]
        limits = tuple(limit.name for limit in results.study.limits)
        own = int(np.count_nonzero(on_joint & (owner == position)))
        members.append(
            Member(
                label=label,
                results=results,
                stored=stored,
                limits=limits,
                hypervolume=hypervolume(points, corner) / box if len(points) else 0.0,
                joint_count=own,
                joint_share=own / max(1, int(np.count_nonzero(on_joint))),
                compromise=int(np.argmin((points**2).sum(axis=1))) if len(points) else None,
                binding=_binding(stored, limits),
                currency=results.study.prices.currency,
            )
        )
    by_label = {member.label: scaled[i] for i, member in enumerate(members)}
    pairs = list(permutations(by_label, 2))
    covered = {(a, b): coverage(by_label[a], by_label[b]) for a, b in pairs}
    epsilon = {(a, b): additive_epsilon(by_label[a], by_label[b]) for a, b in pairs}
    dominated = tuple((b, a) for a, b in pairs if covered[a, b] == 1.0 and covered[b, a] != 1.0)
    return Comparison(tuple(members), first.objectives, ideal, nadir, covered, epsilon, dominated)


def _binding(stored: StoredFamily, limits: tuple[str, ...]) -> dict[str, float]:
    """Share of the front that each limit binds, only those that bind at all."""
    if not stored.front.num_rows:
        return {}
    shares = {
        name: float(np.mean(stored.front[f"margin:{name}"].to_numpy() >= -BINDING))
        for name in limits
    }
    return {name: share for name, share in shares.items() if share > 0.0}


def extremes(comparison: Comparison, member: Member) -> dict[str, tuple[float, str]]:
    """Best value of each objective on the member's front, with the design that has it."""
    points = member.stored.front_objectives
    if not len(points):
        return {}
    best = {}
    for column, goal in enumerate(comparison.objectives):
        row = int(np.argmin(points[:, column]))
        best[goal.name] = (goal.sign * float(points[row, column]), member.stored.front_ids[row])
    return best


def as_json(comparison: Comparison) -> dict[str, Any]:
    """The comparison as values of JSON."""
    goals = comparison.objectives
    any_front = any(len(member.stored.front_ids) for member in comparison.members)
    return {
        "objectives": [
            {
                "name": goal.name,
                "sense": "maximise" if goal.maximise else "minimise",
                "terms": dict(goal.terms),
                "scale_0": goal.sign * float(comparison.ideal[column]) if any_front else None,
                "scale_1": goal.sign * float(comparison.nadir[column]) if any_front else None,
            }
            for column, goal in enumerate(goals)
        ],
        "hypervolume_reference": REFERENCE,
        "families": [_member_json(comparison, member) for member in comparison.members],
        "coverage": _pairs(comparison.coverage),
        "additive_epsilon": _pairs(comparison.epsilon),
        "dominated": [{"family": a, "by": b} for a, b in comparison.dominated],
    }


def _member_json(comparison: Comparison, member: Member) -> dict[str, Any]:
    evaluations, feasible, failed = member.stored.counts
    entry: dict[str, Any] = {
        "family": member.stored.family,
        "label": member.label,
        "study": member.stored.study,
        "evaluations": evaluations,
        "feasible": feasible,
        "feasible_share": feasible / evaluations if evaluations else None,
        "failed": failed,
        "searches": len(member.stored.searches),
        "front_size": len(member.stored.front_ids),
        "verified": _verified_json(member.stored),
        "hypervolume": member.hypervolume,
        "joint_front_share": member.joint_share,
        "binding_limits": member.binding,
        "extremes": {
            name: {"value": value, "design": design}
            for name, (value, design) in extremes(comparison, member).items()
        },
        "compromise": None,
        "nearest_to_feasible": None,
    }
    if member.compromise is not None:
        row = member.stored.front_row(member.compromise)
        entry["compromise"] = {
            "design": member.stored.front_ids[member.compromise],
            "objectives": {
                goal.name: goal.sign * row[f"objective:{goal.name}"]
                for goal in comparison.objectives
            },
            "metrics": {name: row[name] for name in METRIC if name in row},
            "losses": {name: row[name] for name in LOSSES if name in row},
        }
    elif not feasible:
        nearest = least_violating(member.stored, list(member.limits), 1)
        if nearest:
            entry["nearest_to_feasible"] = {
                "design": nearest[0].design,
                "violated": {k: v for k, v in nearest[0].margins.items() if v > 0.0},
            }
    return entry


def _verified_json(stored: StoredFamily) -> dict[str, Any] | None:
    if not isinstance(stored, VerifiedFamily):
        return None
    counts = stored.verified_counts
    return {
        "evaluator": counts.evaluator,
        "only": stored.only,
        "searched_front": counts.front,
        "verified": counts.verified,
        "broke_limit": counts.broke_limit,
        "failed": counts.failed,
    }


def _pairs(values: dict[tuple[str, str], float]) -> dict[str, dict[str, float | None]]:
    nested: dict[str, dict[str, float | None]] = {}
    for (a, b), value in values.items():
        nested.setdefault(a, {})[b] = value if np.isfinite(value) else None
    return nested
