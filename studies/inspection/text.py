"""One design as a page of plain text."""

from __future__ import annotations

import math
from textwrap import fill

from evaluators.machine.geometry.variables import VARIABLES
from evaluators.machine.metrics import METRIC, METRICS
from studies.inspection.design import (
    CAUTIONS,
    GROUP_NAMES,
    PHASE_NAMES,
    Inspection,
    reserve,
)
from studies.inspection.engineering import engineering_text, sourced_table
from studies.stored.verified import VerifiedRow, deviation
from studies.tables import number, percent, text_table

DIRECTION = {1: "+", -1: "-"}
IRON_PLACES = ("loss_teeth_W", "loss_yoke_W")
IRON_MECHANISMS = ("loss_iron_hysteresis_W", "loss_iron_eddy_W", "loss_iron_excess_W")
LOSSES = {
    "loss_copper_W": (),
    "loss_iron_W": (*IRON_PLACES, *IRON_MECHANISMS),
    "loss_magnet_W": (),
    "loss_sleeve_W": (),
    "loss_air_friction_W": (),
    "loss_total_W": (),
}
"""Losses in the order of the table, each with what it consists of: iron by place, then once more
by mechanism."""


def inspection_text(found: Inspection) -> str:
    """Everything, section by section."""
    sections = [_head(found), _variables(found)]
    if found.evaluated:
        sections += [_limits(found), _losses(found), *engineering_text(found), _metrics(found)]
        sections += [_verified(found, item) for item in found.verified]
    sections += [_winding(found), _cautions()]
    return "\n\n".join(section for section in sections if section)


def _head(found: Inspection) -> str:
    row = found.row
    if not found.evaluated:
        verdict = f"could not be evaluated ({row['status']}): {row['reason']}"
    elif not row["feasible"]:
        verdict = "breaks at least one limit"
    elif found.on_front:
        verdict = "meets all limits; no other design of its family beats it in every objective"
    else:
        verdict = "meets all limits; another design of its family beats it in every objective"
    said = f"{found.design} of study {found.study}: {verdict}."
    return (
        f"{fill(said, 100)}\n"
        f"Evaluated by {row['evaluator']} {row['evaluator_version']}, seed {row['seed']}, "
        f"generation {row['generation']}."
    )


def _variables(found: Inspection) -> str:
    rows = [[item.name, number(float(found.row[item.name]), 5)] for item in VARIABLES]
    lines = [text_table(["variable", "value"], rows)]
    if found.lengths_mm:
        derived = [[name, number(value, 5)] for name, value in found.lengths_mm.items()]
        lines.append(text_table(["dimension", "value"], derived))
    return "\n\n".join(lines)


def _limits(found: Inspection) -> str:
    if not found.limits:
        return "No limits."
    rows = []
    for limit in found.limits:
        left = reserve(limit, found.row)
        side = limit.text().removeprefix(f"{limit.metric} ")
        verdict = "met" if left >= 0.0 else "BROKEN"
        spare = percent(left) if limit.value else number(left)  # of zero there is no share
        source = METRIC[limit.metric].source
        value = number(found.row[limit.metric])
        rows.append([limit.metric, value, side, spare, verdict, source])
    return sourced_table(["limit on", "value", "limit", "reserve", "", "source"], rows)


def _losses(found: Inspection) -> str:
    total = found.row.get("loss_total_W")
    rows = [
        [label, number(found.row[name]), percent(found.row[name] / total) if total else "-"]
        for loss, parts in LOSSES.items()
        for label, name in [(loss, loss), *((f"  {part}", part) for part in parts)]
        if found.row.get(name) is not None
    ]
    return text_table(["loss", "W", "share"], rows) if rows else ""


def _metrics(found: Inspection) -> str:
    rows = []
    for metric in METRICS:
        value = found.row.get(metric.name)
        if value is not None:
            unit = {"1": "", "money": found.currency}.get(metric.unit, metric.unit)
            rows.append([metric.group, metric.name, number(value), unit, metric.source])
    return sourced_table(["group", "metric", "value", "unit", "source"], rows, left=2)


def _verified(found: Inspection, verified: VerifiedRow) -> str:
    """Stored and verified values side by side, and the limits that the verified ones break."""
    values = verified.values
    settings = "" if values["settings"] == "{}" else f" with settings {values['settings']}"
    head = f"Verified by {verified.evaluator}{settings}"
    if not verified.ok:
        return f"{head}: could not be evaluated ({values['status']}): {values['reason']}"
    broken = [
        f"{limit.text()}, is {number(verified.number(limit.metric))}"
        for limit in found.limits
        if verified.number(f"margin:{limit.name}") > 0.0
    ]
    verdict = f"BREAKS {'; '.join(broken)}" if broken else "meets all limits"
    rows = []
    for metric in METRICS:
        new, old = verified.number(metric.name), found.row.get(metric.name)
        if old is None or not math.isfinite(new) or new == old:
            continue
        unit = {"1": "", "money": found.currency}.get(metric.unit, metric.unit)
        share = "" if metric.signed else percent(deviation(new, old))
        rows.append([metric.name, unit, number(old), number(new), share])
    table = text_table(["metric", "unit", "stored", "verified", "deviation"], rows, left=2)
    return f"{head}: {verdict}. Metrics that differ:\n{table}"


def _winding(found: Inspection) -> str:
    family, winding = found.winding.family, found.winding
    text = (
        f"Winding of {family.id}: coil pitch {family.coil_pitch}, torque factor "
        f"{winding.torque_winding_factor:.3f}, suspension factor "
        f"{winding.suspension_winding_factor:.3f}.\n"
        "Slots and coils are counted from 1, counter-clockwise; + is current out of the page at "
        "positive phase current."
    )
    rows = [
        [
            str(side.slot + 1),
            str(side.layer),
            str(side.coil + 1),
            PHASE_NAMES[side.phase],
            GROUP_NAMES[side.group],
            DIRECTION[int(side.torque_direction)],
            DIRECTION[int(side.suspension_direction)],
        ]
        for side in winding.coil_sides
    ]
    head = ["slot", "layer", "coil", "phase", "group", "torque", "suspension"]
    return f"{text}\n{text_table(head, rows, left=0)}"


def _cautions() -> str:
    lines = [fill(item, 96, initial_indent="- ", subsequent_indent="  ") for item in CAUTIONS]
    return "Before anything is built\n" + "\n".join(lines)
