"""What the suspension controller needs: force per ampere over the turn, phases, stiffness.

The currents are those of the two-axis command: ``i_x`` and ``i_y`` are peak phase amperes that
command a mean force along x and along y, and phase k of the suspension terminals carries

    i_k(theta) = i_x cos(p theta + angle_x - s 2 pi k / 3)
               + i_y cos(p theta + angle_y - s 2 pi k / 3)

with rotor angle theta, pole pairs p, sequence s = +1 or -1 and k = 0, 1, 2. The force is then
F(theta) = K(theta) (i_x, i_y) + F_0(theta); at small currents K does not depend on them.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from studies.errors import StudiesError
from studies.export.files import ExportedFile, json_file, text_file
from studies.inspection.chosen import Chosen
from studies.tables import csv_text

FloatArray = NDArray[np.float64]

FORMAT = "hovergap suspension"
FORMAT_VERSION = 1
TABLE = "suspension.csv"
SUMMARY = "suspension.json"

FORCE = "force along {along}, commanded along {command}"
REST = "force along {along}, no suspension current"
CURRENT = "suspension current of phase one, commanded along {command}"
NEEDED = (
    *(FORCE.format(along=a, command=c) for a in "xy" for c in "xy"),
    *(REST.format(along=a) for a in "xy"),
    *(CURRENT.format(command=c) for c in "xy"),
)


@dataclass(frozen=True)
class SuspensionData:
    """Force of one machine against rotor angle.

    Attributes
    ----------
    angle : array (k,)
        Rotor angle over one turn, rad.
    per_ampere : array (k, 2, 2)
        K: force along x and y (first axis) per peak ampere commanded along x and y (second), N/A.
    rest : array (k, 2)
        Force without suspension current, N.
    current_angle : array (2,)
        Phases angle_x and angle_y of phase one, electrical rad.
    current : float
        Peak amperes at the duty's share of slot current.
    scale : float
        What K of the waveforms was multiplied by so that its mean is the stored metric.
    """

    angle: FloatArray
    per_ampere: FloatArray
    rest: FloatArray
    current_angle: FloatArray
    current: float
    scale: float

    @property
    def direction_error(self) -> FloatArray:
        """Angle from the commanded direction to the force per ampere, (k, 2) for x and y, rad."""
        force = self.per_ampere[:, 0] + 1j * self.per_ampere[:, 1]
        return np.asarray(np.angle(force * np.array([1.0, -1.0j])))


def suspension_known(chosen: Chosen) -> bool:
    """Whether the evaluator gives all waveforms that are needed."""
    return set(NEEDED) <= set(chosen.waveforms)


def suspension_data(chosen: Chosen) -> SuspensionData:
    """Gather it from the evaluator's waveforms and the stored length and turns.

    Waveforms hold at the magnet temperature the study states, metrics at the one the machine
    takes; K is scaled from one to the other by the stored mean force per ampere.

    Raises
    ------
    StudiesError
        If the evaluator does not give these waveforms.
    """
    found = chosen.waveforms
    missing = [name for name in NEEDED if name not in found]
    if missing:
        msg = (
            f"the evaluator {chosen.problem.evaluator_name!r} gives no waveform {missing[0]!r}, "
            "which the suspension data need; export with --evaluator analytic"
        )
        raise StudiesError(msg)
    length = 1e-3 * chosen.metric("stack_length_mm")
    turns = chosen.metric("turns_per_coil")
    angle = found[NEEDED[0]].positions
    rest = length * np.stack([found[REST.format(along=a)].values for a in "xy"], axis=1)
    phasors = []
    pole_pairs = chosen.task.winding.family.pole_pairs
    for command in "xy":
        values = found[CURRENT.format(command=command)].values / turns
        # Only the fundamental is there: exp(j p theta) picks its phasor.
        phasors.append(2.0 * np.mean(values * np.exp(-1j * pole_pairs * angle)))
    amperes = np.abs(np.array(phasors))
    per_ampere = np.empty((len(angle), 2, 2))
    for row, along in enumerate("xy"):
        for column, command in enumerate("xy"):
            force = length * found[FORCE.format(along=along, command=command)].values
            per_ampere[:, row, column] = (force - rest[:, row]) / amperes[column]
    mean = per_ampere.mean(axis=0)
    scale = chosen.metric("force_per_ampere_N_A") / (0.5 * float(np.trace(mean)))
    return SuspensionData(
        angle=angle,
        per_ampere=scale * per_ampere,
        rest=rest,
        current_angle=np.angle(np.array(phasors)),
        current=float(amperes[0]),
        scale=scale,
    )


def suspension_files(chosen: Chosen) -> list[ExportedFile]:
    """The table over one turn, and the constants."""
    data = suspension_data(chosen)
    return [
        text_file(
            TABLE,
            _table(data),
            "force per peak ampere of both axes against rotor angle, force without current, and "
            "by how much the force's direction is off",
        ),
        json_file(
            SUMMARY,
            _summary(chosen, data),
            "constants of the suspension: mean force per ampere, current phases, stiffness, "
            "inductances",
        ),
    ]


def _table(data: SuspensionData) -> str:
    head = [
        "rotor_angle_deg",
        "force_x_per_current_x_N_A",
        "force_y_per_current_x_N_A",
        "force_x_per_current_y_N_A",
        "force_y_per_current_y_N_A",
        "force_x_no_current_N",
        "force_y_no_current_N",
        "direction_error_x_deg",
        "direction_error_y_deg",
    ]
    columns = np.column_stack(
        [
            np.degrees(data.angle),
            data.per_ampere[:, :, 0],
            data.per_ampere[:, :, 1],
            data.rest,
            np.degrees(data.direction_error),
        ]
    )
    return csv_text(head, columns.tolist())


def _summary(chosen: Chosen, data: SuspensionData) -> dict[str, Any]:
    winding = chosen.task.winding
    mean = data.per_ampere.mean(axis=0)
    return {
        "format": FORMAT,
        "format_version": FORMAT_VERSION,
        "design": chosen.design,
        "evaluator": chosen.problem.evaluator_name,
        "evaluator_version": chosen.problem.evaluator.version,
        "frame": "x along the axis of tooth 1 (the first), counter-clockwise positive, force on "
        "the rotor; rotor angle 0 has a north magnet on x",
        "phase_current": "i_k = i_x cos(p theta + angle_x - s 2 pi k/3) + i_y cos(p theta + "
        "angle_y - s 2 pi k/3), k = 0, 1, 2; i_x and i_y in peak amperes",
        "group_currents": "group a carries torque plus suspension current, group b torque minus "
        "suspension current",
        "pole_pairs": winding.family.pole_pairs,
        "suspension_pole_pairs": winding.family.suspension_pole_pairs,
        "sequence": winding.suspension_sequence,
        "angle_x_electrical_deg": float(np.degrees(data.current_angle[0])),
        "angle_y_electrical_deg": float(np.degrees(data.current_angle[1])),
        "mean_force_per_ampere_N_A": mean.tolist(),
        "mean_force_per_ampere_rows": "force along x, along y; columns: current x, current y",
        "scaled_by": data.scale,
        "scaled_because": "waveforms hold at the study's magnet temperature, the mean force per "
        "ampere at the one the machine takes; forces without suspension current are not scaled",
        "largest_direction_error_deg": float(np.degrees(np.abs(data.direction_error).max())),
        "current_at_duty_share_A": data.current,
        "displacement_stiffness_N_mm": chosen.metric("displacement_stiffness_N_mm"),
        "displacement_stiffness_sign": "the pull grows with the displacement and along it: "
        "negative stiffness",
        "suspension_inductance_mH": chosen.metric("suspension_inductance_mH"),
        "torque_inductance_mH": chosen.metric("torque_inductance_mH"),
        "rotor_weight_N": chosen.metric("rotor_weight_N"),
        "turns_per_coil": chosen.metric("turns_per_coil"),
        "validity": "two-dimensional field at the duty's torque current; leave margin for end "
        "effects, saturation at larger currents and assembly scatter, and measure before closing "
        "the loop at speed",
    }
