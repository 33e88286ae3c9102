"""The winding as tables a winder can follow."""

from __future__ import annotations

from evaluators.machine.winding.winding import Winding
from studies.export.files import ExportedFile, text_file
from studies.inspection.design import GROUP_NAMES, PHASE_NAMES
from studies.tables import csv_text

SIDES = "coil_sides.csv"
CONNECTIONS = "coil_connections.csv"


def winding_files(winding: Winding, turns_per_coil: int) -> list[ExportedFile]:
    """Table of coil sides and list of connections; slots and coils counted from 1."""
    return [
        text_file(
            SIDES,
            _sides(winding),
            "every coil side by slot and layer (1 holds return sides, 2 go sides); direction 1 is "
            "current along +z, out of the drawing, at positive phase current",
        ),
        text_file(
            CONNECTIONS,
            _connections(winding, turns_per_coil),
            "the six strings of coils, coil by coil: a string begins at its terminal, enters each "
            "coil in slot_in, leaves it in slot_out; all ends at the -z end of the machine",
        ),
    ]


def _sides(winding: Winding) -> str:
    slots = winding.family.slots
    head = [
        "slot",
        "slot_axis_deg",
        "layer",
        "coil",
        "phase",
        "group",
        "torque_direction",
        "suspension_direction",
    ]
    rows = [
        [
            side.slot + 1,
            360.0 * (side.slot + 0.5) / slots,
            side.layer,
            side.coil + 1,
            PHASE_NAMES[side.phase],
            GROUP_NAMES[side.group],
            side.torque_direction,
            side.suspension_direction,
        ]
        for side in winding.coil_sides
    ]
    return csv_text(head, rows)


def _connections(winding: Winding, turns_per_coil: int) -> str:
    head = [
        "phase",
        "group",
        "position",
        "from",
        "coil",
        "slot_in",
        "slot_out",
        "turns",
        "to",
    ]
    rows: list[list[object]] = []
    for string in winding.connections:
        name = f"{PHASE_NAMES[string.phase]}{GROUP_NAMES[string.group]}"
        coils = [coil + 1 for coil in string.coils]
        before = [f"terminal {name} begin", *(f"coil {coil}" for coil in coils[:-1])]
        after = [*(f"coil {coil}" for coil in coils[1:]), f"terminal {name} end"]
        for position, coil in enumerate(coils):
            rows.append(
                [
                    PHASE_NAMES[string.phase],
                    GROUP_NAMES[string.group],
                    position + 1,
                    before[position],
                    coil,
                    string.starts[position] + 1,
                    string.finishes[position] + 1,
                    turns_per_coil,
                    after[position],
                ]
            )
    return csv_text(head, rows)
