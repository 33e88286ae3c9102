"""Strength of the rotor: at rest and at overspeed, each cold and hot."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.mechanics.rings import (
    pressure_stress,
    rotating_disc_stress,
    tip_speed,
)
from evaluators.machine.mechanics.sleeve import (
    RotorSection,
    SleeveState,
    lift_off_speed,
    required_interference,
    sleeve_stress,
)
from evaluators.machine.performance.operating import Operating, held
from evaluators.machine.quantity import FloatArray
from evaluators.machine.task.task import Task

ASSEMBLY_TEMPERATURE = 20.0  # degC, at which interference is stated
RPM = 30.0 / np.pi
WINDOW_ROUNDS = 2  # of the secant
FREE_RING = "free ring utilisation"
"""Key of the sleeve's own stress at overspeed over its strength: no metric, but a refusal."""


@dataclass(frozen=True)
class Strength:
    """Rotor of n designs in four states: at rest and at overspeed (first axis), cold and hot.

    Attributes
    ----------
    section : RotorSection
        With a leading axis of two temperatures, cold and hot.
    heating, strength : array (2, n)
        Above assembly, K; of the sleeve, Pa.
    speeds : array (2, 1, 1)
        Zero and the overspeed, rad/s.
    core_bore : array (n,)
        Radius of the hole in the core's sheets, m; `core_density` is theirs, kg/m3.
    isotropic : bool
        Whether the sleeve is a metal, judged by von Mises, or a fibre, judged along it.
    """

    section: RotorSection
    heating: FloatArray
    strength: FloatArray
    speeds: FloatArray
    isotropic: bool
    core_bore: FloatArray
    core_density: float

    @classmethod
    def of(cls, task: Task, sections: CrossSections, state: Operating) -> Strength:
        """Rotor uniformly as warm as its sleeve; core and shaft give way as one solid of steel."""
        return cls.at(task, sections, state.temperature("sleeve"))

    @classmethod
    def at(cls, task: Task, sections: CrossSections, temperature_C: FloatArray) -> Strength:
        """As `of`, at the temperatures (n,) of the sleeves in degC."""
        parts, duty = task.materials, task.duty
        hot = held(temperature_C)
        temperature = np.stack([np.full_like(hot, ASSEMBLY_TEMPERATURE), hot])
        section = RotorSection.from_materials(
            parts.shaft,
            parts.magnet,
            parts.sleeve,
            core_inner_radius=np.zeros_like(sections.core_radius),
            core_outer_radius=sections.core_radius,
            magnet_outer_radius=sections.magnet_radius,
            sleeve_outer_radius=sections.rotor_radius,
            temperature_C=temperature,
        )
        strength = parts.sleeve.yield_strength
        if not parts.sleeve.isotropic:
            strength = parts.sleeve.tensile_strength
        return cls(
            section=section,
            heating=temperature - ASSEMBLY_TEMPERATURE,
            strength=strength.at(temperature),
            speeds=np.array([0.0, duty.speed * duty.overspeed_ratio]).reshape(2, 1, 1),
            isotropic=parts.sleeve.isotropic,
            core_bore=sections.shaft_radius,
            core_density=float(parts.rotor_steel.density.value),
        )

    @property
    def overspeed(self) -> float:
        """rad/s."""
        return float(self.speeds[1, 0, 0])

    def states(self, interference: FloatArray) -> SleeveState:
        """Pressures and stresses of the four states, (2, 2, n)."""
        return sleeve_stress(self.section, interference, self.speeds, self.heating)

    def sleeve_stress(self, states: SleeveState) -> FloatArray:
        """The stress that decides, Pa."""
        return states.equivalent_stress if self.isotropic else states.hoop_stress

    def core_stress(self, states: SleeveState, speeds: FloatArray) -> FloatArray:
        """Hoop stress at the bore of the laminated core, Pa, in states at `speeds` (rad/s).

        A sheet is a disc with a hole, where it carries twice what a solid disc does however small
        the hole is (Timoshenko, *Strength of Materials*, part II). The shaft is left out: filling
        the hole it relieves the compression at rest, and its own fit adds tension.
        """
        bore, outer = self.core_bore, self.section.core_outer_radius
        turning = rotating_disc_stress(
            bore, bore, outer, self.core_density, self.section.core_poisson, speeds
        )
        pressed = pressure_stress(bore, bore, outer, 0.0, np.maximum(states.core_pressure, 0.0))
        return np.asarray(turning.hoop + pressed.hoop)

    def least_interference(self, pressure: float) -> FloatArray:
        """Interference (n,) m that leaves `pressure` on the core at overspeed, cold and hot."""
        needed = required_interference(self.section, self.overspeed, self.heating, pressure)
        return np.asarray(np.maximum(needed.max(axis=0), 0.0))

    def utilisation(self, interference: FloatArray) -> FloatArray:
        """Largest sleeve stress over strength of the four states, (n,)."""
        use = self.sleeve_stress(self.states(interference)) / self.strength
        return np.asarray(use.max(axis=(0, 1)))

    def free_ring_utilisation(self) -> FloatArray:
        """Stress of the sleeve turning by itself at overspeed over its strength, (n,)."""
        ring = self.section.sleeve
        hoop = ring.stress(0.0, 0.0, self.overspeed, self.heating).hoop
        return np.asarray((hoop / self.strength).max(axis=0))

    def largest_interference(self, least: FloatArray, use_at_least: FloatArray) -> FloatArray:
        """Interference (n,) m at which the sleeve reaches its strength; negative if none does.

        By secants: the stress of every single state is all but linear in the interference.
        """
        low, use_low = least, use_at_least
        high = least + 1e-3 * self.section.sleeve.inner_radius
        for _ in range(WINDOW_ROUNDS):
            use_high = self.utilisation(high)
            change, step = use_high - use_low, high - low
            able = change * step > 0.0
            following = high + (1.0 - use_high) * np.where(
                able, step / np.where(able, change, 1.0), 0.0
            )
            low, use_low, high = high, use_high, following
        return np.asarray(high)


def metrics(task: Task, sections: CrossSections, state: Operating) -> dict[str, FloatArray]:
    """Metrics of strength; the worst of the states they name."""
    rotor = Strength.of(task, sections, state)
    needed = rotor.least_interference(task.construction.contact_pressure)
    given = task.construction.sleeve_interference
    interference = needed if given is None else np.full_like(needed, given)
    states = rotor.states(interference)
    stress = rotor.sleeve_stress(states)
    use = (stress / rotor.strength).max(axis=(0, 1))
    pressure = states.sleeve_pressure.max(axis=(0, 1))
    core = np.abs(rotor.core_stress(states, rotor.speeds)).max(axis=(0, 1))
    use_at_least = use if given is None else rotor.utilisation(needed)
    window = rotor.largest_interference(needed, use_at_least) - needed
    parts = task.materials
    lift_off = lift_off_speed(rotor.section, interference, rotor.heating).min(axis=0)
    hot = held(state.temperature("core"))
    return {
        "tip_speed_m_s": tip_speed(sections.rotor_radius, task.duty.speed),
        "sleeve_interference_um": 1e6 * interference,
        "interference_window_um": 1e6 * window,
        "sleeve_stress_MPa": 1e-6 * stress.max(axis=(0, 1)),
        "sleeve_stress_ratio": use,
        "sleeve_radial_tension_MPa": 1e-6 * states.radial_tension.max(axis=(0, 1)),
        "contact_pressure_MPa": 1e-6 * states.core_pressure[1].min(axis=0),
        # A speed that is never reached counts as ten times the overspeed.
        "lift_off_speed_ratio": np.minimum(lift_off / rotor.overspeed, 10.0),
        "magnet_pressure_MPa": 1e-6 * pressure,
        "magnet_stress_ratio": pressure / float(parts.magnet.compressive_strength.value),
        "core_stress_MPa": 1e-6 * core,
        "core_stress_ratio": core / parts.rotor_steel.yield_strength.at(hot),
        FREE_RING: rotor.free_ring_utilisation(),
    }


def refusals(task: Task, use: FloatArray) -> NDArray[np.str_]:
    """Why no interference can hold a rotor at all, (n,), empty where one might.

    Parameters
    ----------
    task : Task
        For the name of the sleeve's material.
    use : array (n,)
        Entry `FREE_RING` of `metrics`.
    """
    text = np.full(use.shape, "", dtype=object)
    for row in np.flatnonzero(use > 1.0):
        text[row] = (
            f"the sleeve holds at no interference: turning by itself at overspeed it carries "
            f"{use[row]:.2f} times the strength of {task.materials.sleeve.name!r}"
        )
    return text.astype(np.str_)


def interference_verdict(least_um: float, window_um: float) -> str:
    """One sentence on the interferences that hold a rotor, for tables.

    Parameters
    ----------
    least_um : float
        Smallest interference that keeps the magnets pressed at overspeed, um.
    window_um : float
        Metric ``interference_window_um``.
    """
    largest = least_um + window_um
    if window_um < 0.0:
        return (
            f"no interference holds: pressing the magnets at overspeed takes {least_um:.0f} um, "
            f"but the sleeve reaches its strength at {max(largest, 0.0):.0f} um"
        )
    return (
        f"from {least_um:.0f} um (magnets pressed at overspeed) to {largest:.0f} um (strength of "
        "the sleeve) the interference holds, before any safety factor"
    )
