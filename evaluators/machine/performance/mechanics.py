"""Strength of the rotor: at rest and at overspeed, each cold and hot."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.geometry import CrossSections
from evaluators.machine.mechanics import tip_speed
from evaluators.machine.performance.operating import Operating, held
from evaluators.machine.quantity import FloatArray
from evaluators.machine.sleeve import (
    RotorSection,
    SleeveState,
    lift_off_speed,
    required_interference,
    sleeve_stress,
)
from evaluators.machine.task import Task

ASSEMBLY_TEMPERATURE = 20.0  # degC, at which interference is stated
RPM = 30.0 / np.pi
WINDOW_ROUNDS = 3  # of the secant; the stress is all but linear in the interference


@dataclass(frozen=True)
class Strength:
    """Rotor of n designs in four states: cold and hot (rows), at rest and at overspeed.

    Attributes
    ----------
    section : RotorSection
        With a leading axis of two temperatures, cold and hot.
    heating, strength : array (2, n) or (2, 1)
        Above assembly, K; of the sleeve, Pa.
    overspeed : float
        rad/s.
    isotropic : bool
        Whether the sleeve is a metal, judged by von Mises, or a fibre, judged along it.
    """

    section: RotorSection
    heating: FloatArray
    strength: FloatArray
    overspeed: float
    isotropic: bool

    @classmethod
    def of(cls, task: Task, sections: CrossSections, state: Operating) -> Strength:
        """Rotor with core and shaft as one solid, uniformly as warm as its sleeve."""
        parts, duty = task.materials, task.duty
        hot = held(state.temperature("sleeve"))
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
            overspeed=duty.speed * duty.overspeed_ratio,
            isotropic=parts.sleeve.isotropic,
        )

    def state(self, interference: FloatArray, speed: float) -> SleeveState:
        """Pressures and stresses, (2, n): cold and hot."""
        return sleeve_stress(self.section, interference, speed, self.heating)

    def sleeve_stress(self, state: SleeveState) -> FloatArray:
        """The stress that decides, Pa."""
        return state.equivalent_stress if self.isotropic else state.hoop_stress

    def least_interference(self, pressure: float) -> FloatArray:
        """Interference (n,) m that leaves `pressure` on the core at overspeed, cold and hot."""
        needed = required_interference(self.section, self.overspeed, self.heating, pressure)
        return np.asarray(np.maximum(needed.max(axis=0), 0.0))

    def utilisation(self, interference: FloatArray) -> FloatArray:
        """Largest sleeve stress over strength of the four states, (n,)."""
        use = [
            self.sleeve_stress(self.state(interference, speed)) / self.strength
            for speed in (0.0, self.overspeed)
        ]
        return np.asarray(np.max(use, axis=(0, 1)))

    def free_ring_utilisation(self) -> FloatArray:
        """Stress of the sleeve turning by itself at overspeed over its strength, (n,)."""
        ring = self.section.sleeve
        hoop = ring.stress(0.0, 0.0, self.overspeed, self.heating).hoop
        return np.asarray((hoop / self.strength).max(axis=0))

    def largest_interference(self, start: FloatArray) -> FloatArray:
        """Interference (n,) m at which the sleeve reaches its strength; negative if none does.

        By the secant from two interferences at and above `start`.
        """
        low, high = start, start + 1e-3 * self.section.sleeve.inner_radius
        use_low, use_high = self.utilisation(low), self.utilisation(high)
        for _ in range(WINDOW_ROUNDS):
            slope = (use_high - use_low) / np.where(high != low, high - low, 1.0)
            following = high + (1.0 - use_high) / np.where(slope > 0.0, slope, np.inf)
            low, use_low = high, use_high
            high, use_high = following, self.utilisation(following)
        return np.asarray(high)


def metrics(task: Task, sections: CrossSections, state: Operating) -> dict[str, FloatArray]:
    """Metrics of strength; the worst of the states they name."""
    rotor = Strength.of(task, sections, state)
    needed = rotor.least_interference(task.construction.contact_pressure)
    given = task.construction.sleeve_interference
    interference = needed if given is None else np.full_like(needed, given)
    rest, fast = rotor.state(interference, 0.0), rotor.state(interference, rotor.overspeed)
    both = (rest, fast)
    stress = np.max([rotor.sleeve_stress(item) for item in both], axis=(0, 1))
    use = np.max([rotor.sleeve_stress(item) / rotor.strength for item in both], axis=(0, 1))
    pressure = np.max([item.sleeve_pressure for item in both], axis=(0, 1))
    core = np.max([np.abs(item.core_hoop_stress) for item in both], axis=(0, 1))
    parts = task.materials
    lift_off = lift_off_speed(rotor.section, interference, rotor.heating).min(axis=0)
    hot = held(state.temperature("core"))
    return {
        "tip_speed_m_s": tip_speed(sections.rotor_radius, task.duty.speed),
        "sleeve_interference_um": 1e6 * interference,
        "interference_window_um": 1e6 * (rotor.largest_interference(needed) - needed),
        "sleeve_stress_MPa": 1e-6 * stress,
        "sleeve_stress_ratio": use,
        "sleeve_radial_tension_MPa": 1e-6
        * np.max([item.radial_tension for item in both], axis=(0, 1)),
        "contact_pressure_MPa": 1e-6 * fast.core_pressure.min(axis=0),
        # A speed that is never reached counts as ten times the overspeed.
        "lift_off_speed_ratio": np.minimum(lift_off / rotor.overspeed, 10.0),
        "magnet_pressure_MPa": 1e-6 * pressure,
        "magnet_stress_ratio": pressure / float(parts.magnet.compressive_strength.value),
        "core_stress_MPa": 1e-6 * core,
        "core_stress_ratio": core / parts.shaft.yield_strength.at(hot),
    }


def refusals(task: Task, sections: CrossSections, state: Operating) -> NDArray[np.str_]:
    """Why no interference can hold a rotor at all, (n,), empty where one might."""
    rotor = Strength.of(task, sections, state)
    use = rotor.free_ring_utilisation()
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
