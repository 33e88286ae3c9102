"""The state at the duty: temperatures, remanence, stack length and losses that fit each other."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.drive.wire import Strands
from evaluators.machine.field import Excitation, FieldSolution
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.losses.copper import slot_loss, strand_factor
from evaluators.machine.losses.friction import disc_power, gap_power
from evaluators.machine.materials.gas import gas_state
from evaluators.machine.performance.remanence import at_remanence
from evaluators.machine.quantity import FloatArray
from evaluators.machine.task.task import Task
from evaluators.machine.thermal.machine import NODES, Conduction, conduction_of, machine_network

CEILING = 300.0
"""Temperature in degC beyond which properties are held: no winding lives there, and with losses
that stop growing every machine has a steady state, however far beyond its limits."""

SETTLED = 0.02  # K between two rounds; a hundredth of what any correlation here is worth
MOST_ROUNDS = 40
DAMPED_FROM = 12  # rounds after which steps are halved, should they not have died out
NODE = {name: column for column, name in enumerate(NODES)}


@dataclass(frozen=True)
class Operating:
    """State of n machines at the duty; arrays (n,) unless stated otherwise, SI units.

    Attributes
    ----------
    temperatures : array (n, nodes)
        Of the nodes of `evaluators.machine.thermal.machine`, degC.
    field : FieldSolution
        At the remanence of the magnets' temperature.
    length : array
        Stack length, m; one metre where `net_torque` is not positive.
    net_torque : array
        Torque per metre less the drag of losses in iron and rotor and of friction in the gap,
        N m/m.
    copper_slots, copper_ends : array
        Loss of both currents, W; `copper_eddy` of it comes from eddy currents in strands.
    friction_gap, friction_faces : array
        W.
    settled, change, rounds
        Whether and how far the temperatures still moved in the last round (K), and its number.
    solids : Conduction or None
        Of the heat network; None where the study fixed the temperatures.
    """

    temperatures: FloatArray
    field: FieldSolution
    length: FloatArray
    net_torque: FloatArray
    copper_slots: FloatArray
    copper_ends: FloatArray
    copper_eddy: FloatArray
    friction_gap: FloatArray
    friction_faces: FloatArray
    settled: NDArray[np.bool_]
    change: FloatArray
    rounds: int
    solids: Conduction | None

    def temperature(self, node: str) -> FloatArray:
        """Temperature of a node in degC, (n,)."""
        return np.asarray(self.temperatures[:, NODE[node]])

    @property
    def friction(self) -> FloatArray:
        """All friction in the gas, W."""
        return self.friction_gap + self.friction_faces


def held(temperature: FloatArray) -> FloatArray:
    """Temperature at which properties are taken, degC: never above `CEILING`."""
    return np.minimum(temperature, CEILING)


def study_temperatures(task: Task, rows: int) -> FloatArray:
    """Temperatures of all nodes that the study's conditions state, (n, nodes), degC.

    Stator iron is put half-way between winding and surroundings, the core at the magnets'.
    """
    given = task.conditions
    iron = 0.5 * (given.winding_temperature + given.ambient_temperature)
    values = {
        "winding": given.winding_temperature,
        "end_turns": given.winding_temperature,
        "teeth": iron,
        "yoke": iron,
        "frame": given.ambient_temperature,
        "gap": given.gas_temperature,
        "sleeve": given.sleeve_temperature,
        "magnets": given.magnet_temperature,
        "core": given.magnet_temperature,
        "end_space": given.gas_temperature,
    }
    return np.tile([values[name] for name in NODES], (rows, 1))


def settle(
    task: Task,
    sections: CrossSections,
    exciting: Excitation,
    field: FieldSolution,
    strands: Strands,
    start: FloatArray,
    tolerance: float = SETTLED,
) -> Operating:
    """State in which losses and temperatures agree.

    Every round builds losses and network at the last temperatures and solves for new ones with
    the growth of the copper loss in the matrix (Newton's method for its strongest feedback).
    A design whose copper loss outruns its cooling ends on the plateau above `CEILING`.

    Parameters
    ----------
    task, sections, exciting, field
        Of n designs; the field as solved.
    strands : Strands
        Wires of the coils.
    start : array (n, nodes)
        First guess of the temperatures, degC; the answer where the study fixed them.
    tolerance : float
        Change of the temperatures from one round to the next at which a design has settled, K.
    """
    if task.cooling.temperatures == "fixed":
        return _state(task, sections, exciting, field, strands, start)[0]
    fill = 2.0 * strands.copper_area / sections.slot_area
    solids = conduction_of(task, sections, fill)
    inlet = task.cooling.gap_flow_temperature
    coldest = min(
        task.cooling.coolant_temperature,
        task.conditions.ambient_temperature if inlet is None else inlet,
    )
    temperatures, change, number = start, np.full(len(sections), np.inf), 0
    for number in range(1, MOST_ROUNDS + 1):
        now, slopes = _state(task, sections, exciting, field, strands, temperatures)
        gas = gas_state(
            task.materials.gas, held(now.temperature("gap")), task.conditions.gas_pressure
        )
        net = machine_network(
            task, sections, solids, now.length, gas, held(now.temperature("end_space"))
        )
        updated = net.solve(_sources(now) - slopes * temperatures, slopes)
        # Colder than any coolant: the growth of the copper loss outruns the cooling. From the
        # ceiling on, losses grow no more.
        outrun = np.any(updated < coldest - 1.0, axis=1)
        updated = np.where(outrun[:, None], CEILING, updated)
        step = updated - temperatures
        if number > DAMPED_FROM:
            step = 0.5 * step
        # A row that has settled stays, so that no row depends on the others of its batch.
        step = np.where((change <= tolerance)[:, None], 0.0, step)
        temperatures = temperatures + step
        change = np.where(change <= tolerance, change, np.abs(step).max(axis=1))
        if np.all(change <= tolerance):
            break
    last, _ = _state(task, sections, exciting, field, strands, temperatures)
    return replace(last, settled=change <= tolerance, change=change, rounds=number, solids=solids)


def _sources(state: Operating) -> FloatArray:
    """Heat of every node, (n, nodes), W."""
    length, field = state.length, state.field
    heat = np.zeros_like(state.temperatures)
    for name, value in (
        ("winding", state.copper_slots),
        ("end_turns", state.copper_ends),
        ("teeth", field.loss_teeth * length),
        ("yoke", field.loss_yoke * length),
        ("magnets", field.loss_magnet * length),
        ("sleeve", field.loss_sleeve * length),
        ("gap", state.friction_gap),
        ("end_space", state.friction_faces),
    ):
        heat[:, NODE[name]] = value
    return heat


def _state(
    task: Task,
    sections: CrossSections,
    exciting: Excitation,
    solved: FieldSolution,
    strands: Strands,
    temperatures: FloatArray,
) -> tuple[Operating, FloatArray]:
    """State at given temperatures, and the growth of each source with its own temperature, W/K."""
    at = {name: held(temperatures[:, column]) for name, column in NODE.items()}
    magnet = task.materials.magnet.remanence
    ratio = magnet.at(at["magnets"]) / float(magnet.at(task.conditions.magnet_temperature))
    field = at_remanence(solved, ratio)
    net_torque, length, gap, faces = _length_and_drag(
        task, sections, field, at["gap"], at["end_space"]
    )
    slots, ends, eddy, slopes = _copper(
        task, sections, exciting, strands, length, at["winding"], at["end_turns"]
    )
    growth = np.zeros_like(temperatures)
    for name, slope in zip(("winding", "end_turns"), slopes, strict=True):
        growth[:, NODE[name]] = np.where(temperatures[:, NODE[name]] < CEILING, slope, 0.0)
    rows = len(sections)
    state = Operating(
        temperatures=temperatures,
        field=field,
        length=length,
        net_torque=net_torque,
        copper_slots=slots,
        copper_ends=ends,
        copper_eddy=eddy,
        friction_gap=gap,
        friction_faces=faces,
        settled=np.ones(rows, dtype=np.bool_),
        change=np.zeros(rows),
        rounds=0,
        solids=None,
    )
    return state, growth


def _length_and_drag(
    task: Task,
    sections: CrossSections,
    field: FieldSolution,
    gap_temperature: FloatArray,
    end_temperature: FloatArray,
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Net torque per metre, stack length for the shaft's power, friction of gap and faces.

    Losses in iron and rotor come from fields that move against the part, so the shaft feeds them.
    A little of them is fed by the currents: counted as drag it lengthens the stack, on the safe
    side. (Common practice: iron and rotor losses of a magnet machine are taken off its shaft.)
    The rotor's loss by the suspension field, some hundredths of the other, is no exact drag:
    see `evaluators/NEGLECTED.md`.
    They and the friction of the gap grow with the length, the friction of the end faces does not,
    so the balance torque' L = (P + faces + losses' L + gap' (L + overhang)) / speed is linear in
    the length L.
    """
    speed, pressure = task.duty.speed, task.conditions.gas_pressure
    gas = gas_state(task.materials.gas, gap_temperature, pressure)
    end_gas = gas_state(task.materials.gas, end_temperature, pressure)
    clearance = sections.bore_radius - sections.rotor_radius
    per_length = gap_power(sections.rotor_radius, clearance, 1.0, speed, gas.density, gas.viscosity)
    faces = disc_power(
        sections.rotor_radius,
        task.construction.end_clearance,
        speed,
        end_gas.density,
        end_gas.viscosity,
        sections.shaft_radius,
    )
    overhang = task.construction.rotor_overhang * per_length
    lost = field.loss_teeth + field.loss_yoke
    if field.force_angle_bias is None:
        lost = lost + field.loss_magnet + field.loss_sleeve
    net = np.asarray(field.torque - (per_length + lost) / speed)
    able = net > 0.0
    length = (task.duty.power + faces + overhang) / speed / np.where(able, net, 1.0)
    length = np.where(able, length, 1.0)
    return net, length, np.asarray(per_length * length + overhang), faces


def _copper(
    task: Task,
    sections: CrossSections,
    exciting: Excitation,
    strands: Strands,
    length: FloatArray,
    slot_temperature: FloatArray,
    end_temperature: FloatArray,
) -> tuple[FloatArray, FloatArray, FloatArray, tuple[FloatArray, FloatArray]]:
    """Loss in the slots and in the end turns, its eddy part, and the slopes of both in W/K."""
    construction, conductor = task.construction, task.materials.conductor.resistivity
    in_slot, at_end = conductor.at(slot_temperature), conductor.at(end_temperature)
    copper_area = strands.copper_area
    depth = sections.slot_radius - sections.wedge_radius
    factor = strand_factor(
        strands.diameter,
        2.0 * copper_area / (0.25 * np.pi * strands.diameter**2),
        sections.slot_area / depth,
        depth,
        task.electrical_frequency,
        in_slot,
    )
    # Both groups of a phase together: the mixed term of the two currents cancels.
    effective = np.sqrt(0.5 * (exciting.torque**2 + exciting.suspension**2))
    coils = task.winding.family.slots
    direct = coils * slot_loss(effective, 2.0 * length, copper_area, in_slot)
    ends = coils * slot_loss(
        effective, 2.0 * sections.end_turn_length(construction), copper_area, at_end
    )
    slots = factor * direct
    per_kelvin = 1e-2 * (conductor.at(100.0) - conductor.at(0.0))
    # Eddy currents fall as the direct loss grows, so the true slope is below that of the latter.
    return slots, ends, slots - direct, (direct * per_kelvin / in_slot, ends * per_kelvin / at_end)
