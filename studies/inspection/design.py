"""One stored design in full: dimensions, winding, metrics, limits, losses, cautions."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from evaluators.machine.geometry.cross_sections import RADII, CrossSections, cross_sections
from evaluators.machine.geometry.variables import VARIABLES
from evaluators.machine.metrics import METRIC, METRICS
from evaluators.machine.task import description
from evaluators.machine.task.task import Task
from evaluators.machine.winding.winding import Winding
from studies.errors import ResultsError
from studies.stored.families import stored_family, stored_search
from studies.stored.layout import Results
from studies.stored.naming import design_id, split_design_id
from studies.stored.verified import VerifiedRow, all_verified, deviation
from studies.study_file.crosschecks import Limit

MILLI = 1e-3
PHASE_NAMES = description.PHASE_NAMES
GROUP_NAMES = description.GROUP_NAMES
LENGTHS = (
    *RADII,
    "tooth_width",
    "slot_opening",
    "yoke_thickness",
    "core_thickness",
    "magnetic_gap",
)

CAUTIONS = (
    "This is a calculation, not a released design: have it reviewed by licensed or otherwise "
    "qualified engineers, and follow the codes and laws of the place where it is built and run.",
    "A rotor that bursts at speed is lethal: spin-test every rotor at overspeed inside rated "
    "containment, with nobody near, before it runs in a machine.",
    "Magnets crush and cut: keep magnetised rotors apart from steel and each other, use "
    "fixtures for assembly, and keep people with pacemakers away.",
    "The DC link stays charged after switching off and a turning magnet rotor makes voltage: "
    "discharge, measure, and hold the shaft before touching terminals.",
    "If suspension or power fails at speed the rotor drops: size touchdown bearings and their "
    "housings for that event, and test it.",
)

SHORT_CAUTIONS = (
    "Rotors burst: spin-test under containment. Magnets crush. DC links kill after switch-off.",
    "Local codes apply; design and approval belong to licensed engineers.",
)
"""For drawings, which travel without the text beside them."""


@dataclass(frozen=True)
class Inspection:
    """Everything known of one evaluated design.

    Attributes
    ----------
    design, study : str
    row : mapping
        The stored row.
    winding : Winding
    lengths_mm : mapping of name to float
        Radii and widths of the cross-section; empty if the design has none.
    limits : tuple of Limit
    on_front : bool
    currency : str
    verified : tuple of VerifiedRow
        What other evaluators said of it.
    task : Task or None
        What its family was to do; None without a study.
    sections : CrossSections or None
        Of this one design; None if it has none.
    """

    design: str
    study: str
    row: Mapping[str, Any]
    winding: Winding
    lengths_mm: Mapping[str, float]
    limits: tuple[Limit, ...]
    on_front: bool
    currency: str
    verified: tuple[VerifiedRow, ...] = ()
    task: Task | None = None
    sections: CrossSections | None = None

    @property
    def evaluated(self) -> bool:
        """Whether the model could evaluate it."""
        return bool(self.row["status"] == "ok")


def inspect_design(results: Results, design: str) -> Inspection:
    """Look up one design.

    Raises
    ------
    ResultsError
        If the id is none, or no such evaluation is stored.
    """
    name, evaluation = split_design_id(design)
    stored = stored_search(results, name)
    family = stored.family
    numbers = stored.reader.table(["evaluation"])
    known = numbers["evaluation"].to_pylist() if numbers.num_rows else []
    if evaluation not in known:
        last = design_id(name, known[-1]) if known else "none"
        missing = " (a damaged part is missing)" if stored.reader.damaged else ""
        msg = (
            f"{results.folder}: design {design} is not stored{missing}; the last one of {name} "
            f"is {last}"
        )
        raise ResultsError(msg)
    row = stored.reader.row(evaluation)
    design = design_id(name, evaluation)
    winding = results.study.winding(family)
    designs = {item.name: np.array([float(row[item.name])]) for item in VARIABLES}
    sections, valid, _ = cross_sections(winding.family, designs, results.study.construction)
    return Inspection(
        design=design,
        study=results.study.name,
        row=row,
        winding=winding,
        lengths_mm=_lengths(sections) if valid.size else {},
        limits=results.study.limits,
        on_front=design in stored_family(results, family).front_ids,
        currency=results.study.prices.currency,
        verified=tuple(all_verified(stored.folder, evaluation)),
        task=results.study.task(family),
        sections=sections if valid.size else None,
    )


def _lengths(sections: CrossSections) -> dict[str, float]:
    lengths = {f"{name}_mm": float(getattr(sections, name)[0]) / MILLI for name in LENGTHS}
    lengths["slot_area_mm2"] = float(sections.slot_area[0]) / MILLI**2
    return lengths


def reserve(limit: Limit, row: Mapping[str, Any]) -> float:
    """Share of the limit kept in reserve; negative if it is broken."""
    value = row[f"margin:{limit.name}"]
    return math.nan if value is None else -float(value)


def inspection_json(found: Inspection) -> dict[str, Any]:
    """The inspection as values of JSON."""
    row, family = found.row, found.winding.family
    return {
        "design": found.design,
        "study": found.study,
        "status": row["status"],
        "reason": row["reason"],
        "feasible": row["feasible"],
        "on_front": found.on_front,
        "evaluator": row["evaluator"],
        "evaluator_version": row["evaluator_version"],
        "seed": row["seed"],
        "evaluation": row["evaluation"],
        "generation": row["generation"],
        "finished_at": str(row["finished_at"]),
        "variables": {item.name: row[item.name] for item in VARIABLES},
        "dimensions": dict(found.lengths_mm),
        "metrics": {item.name: row[item.name] for item in METRICS if item.name in row},
        "limits": [
            {
                "metric": limit.metric,
                limit.kind: limit.value,
                "value": row.get(limit.metric),
                "margin": row[f"margin:{limit.name}"],
                "source": METRIC[limit.metric].source,
            }
            for limit in found.limits
        ],
        "verified": [_verified_json(found, item) for item in found.verified],
        "winding": {
            "family": family.id,
            "coil_pitch": family.coil_pitch,
            "torque_winding_factor": float(found.winding.torque_winding_factor),
            "suspension_winding_factor": float(found.winding.suspension_winding_factor),
            "coil_sides": [
                {
                    "slot": side.slot + 1,
                    "layer": side.layer,
                    "coil": side.coil + 1,
                    "phase": PHASE_NAMES[side.phase],
                    "group": GROUP_NAMES[side.group],
                    "torque_direction": int(side.torque_direction),
                    "suspension_direction": int(side.suspension_direction),
                }
                for side in found.winding.coil_sides
            ],
        },
        "cautions": list(CAUTIONS),
    }


def _verified_json(found: Inspection, verified: VerifiedRow) -> dict[str, Any]:
    values = verified.values
    metrics = verified.metrics
    change = {
        name: deviation(value, float(found.row[name]))
        for name, value in metrics.items()
        if found.row.get(name) is not None
    }
    return {
        "evaluator": values["evaluator"],
        "evaluator_version": values["evaluator_version"],
        "settings": json.loads(values["settings"]),
        "status": values["status"],
        "reason": values["reason"],
        "feasible": verified.feasible,
        "metrics": metrics,
        "deviations": {name: value for name, value in change.items() if math.isfinite(value)},
        "finished_at": str(values["finished_at"]),
    }
