"""Torque and force over the turn of the designs shown, and force against suspension current."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import joblib
import numpy as np
from numpy.typing import NDArray
from threadpoolctl import threadpool_limits

from evaluators.interface import Capability, Evaluator, Waveform, build
from evaluators.machine.geometry.variables import VARIABLES
from evaluators.machine.task.task import Task

FloatArray = NDArray[np.float64]

ALONG = {
    "x": ("force along x, commanded along x", "force along y, commanded along x"),
    "y": ("force along x, commanded along y", "force along y, commanded along y"),
}
AT_REST = ("force along x, no suspension current", "force along y, no suspension current")
SHARES = np.linspace(0.1, 2.0, 20)
"""Suspension current over its value at the duty, for the curves against current."""
MOST_POINTS = 360
"""Of one curve; longer ones are thinned by a whole factor."""
BATCH = 25


@dataclass(frozen=True)
class TurnCurves:
    """Curves of one design for its whole stack.

    Attributes
    ----------
    angle : array (k,)
        Rotor angle over one turn, degrees.
    torque, cogging : array (k,)
        N m.
    force_x, force_y : array (k,), complex
        Force along x + j force along y while a constant force is commanded along x, and along
        y, N.
    current : array (c,)
        Peak suspension current of a phase, A; empty without force at rest.
    force : array (c,)
        Magnitude of the mean force at that current, N.
    error_magnitude, error_angle : array (c,)
        Largest errors over the turn, ratio and degrees, worse of both directions.
    """

    angle: FloatArray
    torque: FloatArray
    cogging: FloatArray
    force_x: NDArray[np.complex128]
    force_y: NDArray[np.complex128]
    current: FloatArray
    force: FloatArray
    error_magnitude: FloatArray
    error_angle: FloatArray


def turn_curves(
    waveforms: Sequence[Waveform], stack_length: float, suspension_current: float
) -> TurnCurves | None:
    """Curves of a design from its evaluator's waveforms; None where torque or force is missing.

    The force is taken as linear in the suspension current: with F at the duty and F0 without
    suspension current, it is F0 + s (F - F0) at s times the current.

    Parameters
    ----------
    waveforms : sequence of Waveform
        Per metre of stack.
    stack_length : float
        m.
    suspension_current : float
        Peak at the duty, A.
    """
    by_name = {item.name: item for item in waveforms}
    wanted = ("torque", *ALONG["x"])
    if any(name not in by_name for name in wanted):
        return None
    torque = by_name["torque"]

    def whole_stack(name: str) -> FloatArray:
        """A waveform at the rotor angles of the torque."""
        item = by_name[name]
        values = item.values
        if not np.array_equal(item.positions, torque.positions):
            values = np.interp(torque.positions, item.positions, values, period=2.0 * np.pi)
        return np.asarray(stack_length * values)

    def complex_force(names: tuple[str, str]) -> NDArray[np.complex128]:
        return np.asarray(whole_stack(names[0]) + 1j * whole_stack(names[1]))

    forces = [complex_force(ALONG["x"])]
    if all(name in by_name for name in ALONG["y"]):
        forces.append(complex_force(ALONG["y"]))
    step = -(-torque.positions.size // MOST_POINTS)
    current = magnitude = error = angle = np.zeros(0)
    if all(name in by_name for name in AT_REST):
        magnitude, error, angle = _against_current(forces, complex_force(AT_REST))
        current = suspension_current * SHARES
    nothing = np.zeros(0)
    return TurnCurves(
        angle=np.degrees(torque.positions[::step]),
        torque=whole_stack("torque")[::step],
        cogging=whole_stack("cogging torque")[::step] if "cogging torque" in by_name else nothing,
        force_x=forces[0][::step],
        force_y=forces[1][::step] if len(forces) > 1 else nothing.astype(np.complex128),
        current=current,
        force=magnitude,
        error_magnitude=error,
        error_angle=angle,
    )


def _against_current(
    forces: list[NDArray[np.complex128]], rest: NDArray[np.complex128]
) -> tuple[FloatArray, FloatArray, FloatArray]:
    force = np.stack(forces)[None]
    scaled = rest + SHARES[:, None, None] * (force - rest)
    mean = scaled.mean(axis=2, keepdims=True)
    error = np.abs(np.abs(scaled) - np.abs(mean)) / np.abs(mean)
    angle = np.degrees(np.abs(np.angle(scaled * np.conj(mean))))
    return (
        np.asarray(np.abs(mean[..., 0]).mean(axis=1)),
        np.asarray(error.max(axis=(1, 2))),
        np.asarray(angle.max(axis=(1, 2))),
    )


def design_curves(evaluator: Evaluator, row: Mapping[str, Any]) -> TurnCurves | None:
    """Curves of one stored row."""
    design = {item.name: float(row[item.name]) for item in VARIABLES}
    per_ampere = row.get("force_per_ampere_N_A")
    current = row["force_N"] / per_ampere if per_ampere and row.get("force_N") else 0.0
    length = 1e-3 * float(row.get("stack_length_mm") or 1e3)
    return turn_curves(evaluator.waveforms(design), length, float(current))


def all_curves(
    tasks: Sequence[tuple[Task, str, Mapping[str, Any], Sequence[Mapping[str, Any]]]], workers: int
) -> list[list[TurnCurves | None]]:
    """Curves of many designs.

    Parameters
    ----------
    tasks : sequence of (task, evaluator name, evaluator settings, rows)
        One for each family.
    workers : int
        Processes; the result does not depend on it.
    """
    jobs = [
        (position, task, name, dict(settings), list(rows[start : start + BATCH]))
        for position, (task, name, settings, rows) in enumerate(tasks)
        for start in range(0, len(rows), BATCH)
    ]
    parallel = joblib.Parallel(n_jobs=workers if len(jobs) > 2 else 1)
    done = parallel(joblib.delayed(_batch)(*job[1:]) for job in jobs)
    found: list[list[TurnCurves | None]] = [[] for _ in tasks]
    for job, curves in zip(jobs, done, strict=True):
        found[job[0]] += curves
    return found


def _batch(
    task: Task, name: str, settings: dict[str, Any], rows: list[Mapping[str, Any]]
) -> list[TurnCurves | None]:
    evaluator = build(name, task, settings)
    if Capability.WAVEFORMS not in evaluator.capabilities:
        return [None] * len(rows)
    with threadpool_limits(1):
        return [design_curves(evaluator, row) for row in rows]
