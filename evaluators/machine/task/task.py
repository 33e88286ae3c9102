"""What is to be built: everything about a machine that the search does not vary."""

from __future__ import annotations

from dataclasses import dataclass, field
from math import pi
from typing import Literal

from evaluators.machine.checks import require as _require
from evaluators.machine.checks import require_choice
from evaluators.machine.cost import Prices
from evaluators.machine.demagnetisation import Fault
from evaluators.machine.materials.library import (
    Conductor,
    ElectricalSteel,
    Gas,
    Magnet,
    Material,
    ShaftSteel,
    SleeveMaterial,
    load,
)
from evaluators.machine.task.cooling import Cooling
from evaluators.machine.task.rotor_layout import RotorLayout
from evaluators.machine.winding.winding import Winding

STANDARD_GRAVITY = 9.80665  # m/s^2, exact by definition (3rd CGPM, 1901)


@dataclass(frozen=True)
class Duty:
    """What the drive must deliver, in SI units.

    Attributes
    ----------
    power : float
        Shaft power, W.
    speed : float
        Angular speed, rad/s (mechanical).
    overspeed_ratio : float
        Overspeed the rotor must survive, over `speed`.
    dc_link_voltage : float
        V.
    voltage_reserve : float
        Share of the largest phase voltage kept back for control.
    suspension_share : float
        Share of the peak slot current that the suspension current takes; the rest makes torque.
    orientation : str
        Of the shaft: ``horizontal`` (weight carried by the suspension) or ``vertical``.
    balance_grade : float
        Residual unbalance grade G of ISO 21940-11 in m/s (G 2.5 is 2.5e-3).
    rated_suspension_share : float
        Share of the peak slot current at the duty that the suspension inverter can make for
        lift-off and shocks.
    process_force : float
        Steady radial force of the driven process on the rotor, N.
    lowest_speed_ratio, highest_speed_ratio : float
        Range of continuous speeds over `speed`, for the margin to bending speeds.
    """

    power: float
    speed: float
    overspeed_ratio: float = 1.2
    dc_link_voltage: float = 560.0
    voltage_reserve: float = 0.1
    suspension_share: float = 0.1
    orientation: Literal["horizontal", "vertical"] = "horizontal"
    balance_grade: float = 2.5e-3
    rated_suspension_share: float = 1.0
    process_force: float = 0.0
    lowest_speed_ratio: float = 1.0
    highest_speed_ratio: float = 1.0

    def __post_init__(self) -> None:
        _require("duty", "power (W)", self.power, 1.0, 1e8)
        _require("duty", "speed (rad/s)", self.speed, 1.0, 1e5)
        _require("duty", "overspeed_ratio", self.overspeed_ratio, 1.0, 2.0)
        _require("duty", "dc_link_voltage (V)", self.dc_link_voltage, 5.0, 1e4)
        _require("duty", "voltage_reserve", self.voltage_reserve, 0.0, 0.9)
        _require("duty", "suspension_share", self.suspension_share, 0.001, 0.9)
        _require("duty", "balance_grade (m/s)", self.balance_grade, 1e-5, 1.0)
        _require("duty", "rated_suspension_share", self.rated_suspension_share, 0.001, 3.0)
        _require("duty", "process_force (N)", self.process_force, 0.0, 1e7)
        _require("duty", "lowest_speed_ratio", self.lowest_speed_ratio, 0.0, 1.0)
        _require("duty", "highest_speed_ratio", self.highest_speed_ratio, 1.0, 2.0)
        require_choice("duty", "orientation", self.orientation, ("horizontal", "vertical"))
        if self.highest_speed_ratio > self.overspeed_ratio:
            msg = (
                f"duty: highest_speed_ratio = {self.highest_speed_ratio:g} must not exceed "
                f"overspeed_ratio = {self.overspeed_ratio:g}"
            )
            raise ValueError(msg)

    @property
    def shaft_torque(self) -> float:
        """Torque at the shaft, N m."""
        return self.power / self.speed

    @property
    def phase_voltage_limit(self) -> float:
        """Largest peak phase voltage left after the reserve, V.

        Two-level inverter in linear space-vector modulation: peak phase voltage U_dc / sqrt(3)
        (Holmes and Lipo, Pulse Width Modulation for Power Converters, 2003; common practice).
        """
        return float(self.dc_link_voltage / 3.0**0.5 * (1.0 - self.voltage_reserve))


@dataclass(frozen=True)
class Conditions:
    """Temperatures (degrees Celsius) and the pressure of the gas in the gap (Pa, absolute).

    The field is solved with magnets of `magnet_temperature` and eddy currents of rotor parts at
    the stated temperatures. Where the heat network solves for the temperatures
    (`Cooling.temperatures`), everything else starts from the stated ones and follows the solved
    ones; otherwise the stated ones hold.
    """

    winding_temperature: float = 120.0
    magnet_temperature: float = 100.0
    sleeve_temperature: float = 100.0
    ambient_temperature: float = 40.0
    gas_temperature: float = 80.0
    gas_pressure: float = 101_325.0

    def __post_init__(self) -> None:
        for name in ("winding", "magnet", "sleeve", "ambient", "gas"):
            key = f"{name}_temperature"
            _require("conditions", f"{key} (C)", getattr(self, key), -80.0, 400.0)
        _require("conditions", "gas_pressure (Pa)", self.gas_pressure, 1.0, 5e6)


@dataclass(frozen=True)
class Construction:
    """How the machine is made: choices that are no search variables, SI units.

    Attributes
    ----------
    magnetisation : str
        ``radial`` or ``parallel``.
    copper_fill : float
        Largest conductor (bare copper) area over slot area; the current density of a design counts
        on it. What standard wires and whole strands leave of it is a metric.
    magnet_segments : int
        Circumferential segments of one magnet pole, insulated from each other.
    magnet_axial_segment : float
        Axial length of one magnet segment, m.
    strand_diameter : float
        Largest bare diameter of one round strand, m; the standard size between half of it and
        all of it that brings most copper into the slot is taken.
    wire_grade : int
        1 or 2, thickness of enamel by IEC 60317-0-1.
    winding_packing : float
        Number of wires times the square of their overall diameter over the insulated slot area: 1
        for a square grid, up to 1.155; random-wound coils reach 0.7 to 0.9 (common practice).
    parallel_groups : int or None
        Groups of a phase in parallel (2) or in series (1) for the torque current; None for the one
        that uses the voltage better.
    end_turn_extension : float
        Straight axial overhang of a coil at each end before it bends over, m.
    slot_insulation : float
        Thickness of liner and wall insulation, m (used for the smallest usable slot).
    minimum_slot_opening : float
        Narrowest slot opening that can be wound, m.
    sleeve_interference : float or None
        Radial shrink-fit interference of the sleeve at rest and cold, m; None for the one that
        leaves `contact_pressure` between magnets and core at overspeed and temperature.
    contact_pressure : float
        Pa, see `sleeve_interference`.
    end_clearance : float
        Axial clearance between rotor faces and housing, m.
    rotor_overhang : float
        Axial length of rotor iron, magnets and sleeve beyond the stack, both ends together, m.
    """

    magnetisation: Literal["radial", "parallel"] = "parallel"
    copper_fill: float = 0.42
    magnet_segments: int = 1
    magnet_axial_segment: float = 10e-3
    strand_diameter: float = 0.4e-3
    wire_grade: int = 2
    winding_packing: float = 0.85
    parallel_groups: int | None = None
    end_turn_extension: float = 2e-3
    slot_insulation: float = 0.25e-3
    minimum_slot_opening: float = 0.8e-3
    sleeve_interference: float | None = None
    contact_pressure: float = 2e6
    end_clearance: float = 3e-3
    rotor_overhang: float = 0.0

    def __post_init__(self) -> None:
        require_choice("construction", "magnetisation", self.magnetisation, ("radial", "parallel"))
        _require("construction", "copper_fill", self.copper_fill, 0.05, 0.9)
        _require("construction", "magnet_segments", self.magnet_segments, 1, 200)
        _require("construction", "magnet_axial_segment (m)", self.magnet_axial_segment, 1e-4, 10.0)
        _require("construction", "strand_diameter (m)", self.strand_diameter, 2e-5, 1e-2)
        _require("construction", "wire_grade", self.wire_grade, 1, 2)
        _require("construction", "winding_packing", self.winding_packing, 0.2, 1.155)
        if self.parallel_groups is not None:
            _require("construction", "parallel_groups", self.parallel_groups, 1, 2)
        _require("construction", "end_turn_extension (m)", self.end_turn_extension, 0.0, 1.0)
        _require("construction", "slot_insulation (m)", self.slot_insulation, 0.0, 1e-2)
        _require("construction", "minimum_slot_opening (m)", self.minimum_slot_opening, 0.0, 0.1)
        if self.sleeve_interference is not None:
            _require("construction", "sleeve_interference (m)", self.sleeve_interference, 0.0, 2e-3)
        _require("construction", "contact_pressure (Pa)", self.contact_pressure, 0.0, 1e9)
        _require("construction", "end_clearance (m)", self.end_clearance, 1e-5, 1.0)
        _require("construction", "rotor_overhang (m)", self.rotor_overhang, 0.0, 1.0)


@dataclass(frozen=True)
class MaterialSet:
    """The materials of one machine; `gas` fills the rotor chamber."""

    stator_steel: ElectricalSteel
    rotor_steel: ElectricalSteel
    magnet: Magnet
    conductor: Conductor
    sleeve: SleeveMaterial
    shaft: ShaftSteel
    gas: Gas = field(default_factory=lambda: load(Gas, "Air"))


@dataclass(frozen=True)
class RippleWeights:
    """Weights and limits of the ripple index.

    index = sum of weight times value over limit, for torque ripple (p.u.), force error magnitude
    (p.u.) and force error angle (degrees).
    """

    torque_ripple_weight: float = 1.0 / 3.0
    force_error_weight: float = 1.0 / 3.0
    force_angle_weight: float = 1.0 / 3.0
    torque_ripple_limit: float = 0.1
    force_error_limit: float = 0.1
    force_angle_limit_deg: float = 5.0

    def __post_init__(self) -> None:
        for name, value in vars(self).items():
            low = 0.0 if name.endswith("weight") else 1e-6
            _require("ripple index", name, value, low, 1e3)


@dataclass(frozen=True)
class Task:
    """One family with its duty, conditions, construction, materials and prices.

    Raises
    ------
    ValueError
        If a stated temperature lies outside the tables of a material or above what it may have,
        or the coolant is colder than the surroundings.
    """

    winding: Winding
    duty: Duty
    materials: MaterialSet
    prices: Prices
    conditions: Conditions = field(default_factory=Conditions)
    construction: Construction = field(default_factory=Construction)
    ripple: RippleWeights = field(default_factory=RippleWeights)
    cooling: Cooling = field(default_factory=Cooling)
    rotor: RotorLayout = field(default_factory=RotorLayout)
    fault: Fault = field(default_factory=Fault)

    def __post_init__(self) -> None:
        self.cooling.check_against_ambient(self.conditions.ambient_temperature)
        parts, conditions = self.materials, self.conditions
        for name, part, temperature in (
            ("magnet", parts.magnet, conditions.magnet_temperature),
            ("sleeve", parts.sleeve, conditions.sleeve_temperature),
            ("winding", parts.conductor, conditions.winding_temperature),
            ("gas", parts.gas, conditions.gas_temperature),
        ):
            _check_temperature(name, part, temperature)

    @property
    def electrical_frequency(self) -> float:
        """Fundamental frequency of both currents at the duty speed, Hz."""
        return self.winding.family.pole_pairs * self.duty.speed / (2.0 * pi)


def _check_temperature(name: str, material: Material, temperature: float) -> None:
    """Refuse a stated temperature that the material's data do not reach."""
    low, high = material.temperature_range
    if not low <= temperature <= high:
        msg = (
            f"conditions: {name}_temperature = {temperature:g} C lies outside the data of "
            f"{material.name!r}, which reach from {low:g} to {high:g} C"
        )
        raise ValueError(msg)
