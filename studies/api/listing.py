"""What a study can name."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict

import pyarrow as pa

from evaluators.machine.geometry.variables import VARIABLES
from evaluators.machine.materials.library import available, load
from evaluators.machine.metrics import METRICS
from evaluators.machine.winding.families import enumerate_families
from evaluators.machine.winding.winding import Winding
from studies.api.tables import table_of
from studies.study_file.convert import MATERIAL_KINDS, RPM


def metrics() -> pa.Table:
    """Every metric: name, unit, group, definition, source, which way is better."""
    return table_of([asdict(item) for item in METRICS])


def variables() -> pa.Table:
    """Every design variable: name, unit, widest range, definition."""
    return table_of([asdict(item) for item in VARIABLES])


def materials() -> pa.Table:
    """Every material that is shipped: kind, name, description."""
    kinds = dict.fromkeys(MATERIAL_KINDS.values())
    return table_of(
        [
            {"kind": kind, "name": name, "description": load(kind, name).description}
            for kind in kinds
            for name in available(kind)
        ]
    )


def families(
    slots: Sequence[int], pole_pairs: Sequence[int], speed_rpm: float | None = None
) -> pa.Table:
    """Families that can be wound: pitch, winding factors, force and cogging orders.

    With a speed, the electrical frequency besides.
    """
    rows = []
    for winding in enumerate_families(slots, pole_pairs):
        if not isinstance(winding, Winding):
            continue
        family = winding.family
        row = {
            "family": family.id,
            **asdict(family),
            "torque_winding_factor": winding.torque_winding_factor,
            "suspension_winding_factor": winding.suspension_winding_factor,
            "residual_voltage": winding.residual_voltage,
            "cogging_periods": family.cogging_periods,
            "no_load_force_order": family.no_load_force_order,
        }
        if speed_rpm is not None:
            row["electrical_frequency_Hz"] = family.electrical_frequency(speed_rpm * RPM)
        rows.append(row)
    return table_of(rows, ["family"])
