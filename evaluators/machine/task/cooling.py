"""How the machine is cooled, as the study describes it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, get_args

from evaluators.machine.checks import require, require_choice
from evaluators.machine.thermal.insulation import CLASS_TEMPERATURE

Method = Literal["jacket", "forced air", "coefficient"]
Temperatures = Literal["solved", "fixed"]


@dataclass(frozen=True)
class Cooling:
    """Cooling of the frame and the gap, and what the heat network needs to know; SI units.

    Attributes
    ----------
    temperatures : str
        ``solved``: winding, magnets and gas take the temperatures of the heat network, and all
        losses, fluxes and strengths follow them. ``fixed``: they take those of the study's
        conditions, and the network is left out.
    method : str
        Of the frame: ``jacket`` (liquid in a channel around the stack), ``forced air`` (along a
        ribbed frame) or ``coefficient`` (`heat_transfer_coefficient` over the plain frame).
    coolant_temperature : float
        At the inlet, degC.
    coolant_flow : float
        Of the liquid in the jacket, m3/s.
    channel_height, channel_width : float
        Of the jacket's channel, m; one channel wound round the frame, whose wetted floor covers
        the stack.
    glycol : bool
        Whether half the mass of the liquid is ethylene glycol; otherwise it is water.
    air_speed : float
        Along the ribs, m/s, for ``forced air``.
    rib_height, rib_thickness, rib_gap : float
        Of the frame's ribs, m; a height of zero is a plain frame.
    heat_transfer_coefficient : float
        W/(m2 K), for ``coefficient``.
    frame_thickness : float
        Radial wall between stack and coolant, m.
    joint_conductance : float
        Of the fit between stack and frame, W/(m2 K): a film of 0.01 mm of air makes about 2700
        (common practice: interference fits behave like films of 0.01 to 0.08 mm).
    gap_flow : float
        Gas blown axially through the gap, m3/s at the state of the gap; zero for none.
    gap_flow_temperature : float or None
        Of that gas at the inlet, degC; None for the ambient temperature.
    impregnation_conductivity, liner_conductivity : float
        Of the resin between the strands and of the slot liner, W/(m K).
    insulation_class : str
        Thermal class of IEC 60085: A, E, B, F or H.
    hot_spot_allowance : float
        Added to the hottest computed point of the winding for what no network sees, K.
    condensation_prevented : bool
        States that no moisture can condense on the frame (dry or hermetic surroundings); only
        then may the coolant be colder than the surroundings.
    """

    temperatures: Temperatures = "solved"
    method: Method = "jacket"
    coolant_temperature: float = 40.0
    coolant_flow: float = 1e-4
    channel_height: float = 5e-3
    channel_width: float = 12e-3
    glycol: bool = False
    air_speed: float = 8.0
    rib_height: float = 20e-3
    rib_thickness: float = 3e-3
    rib_gap: float = 7e-3
    heat_transfer_coefficient: float = 2000.0
    frame_thickness: float = 4e-3
    joint_conductance: float = 2000.0
    gap_flow: float = 0.0
    gap_flow_temperature: float | None = None
    impregnation_conductivity: float = 0.25
    liner_conductivity: float = 0.2
    insulation_class: Literal["A", "E", "B", "F", "H"] = "F"
    hot_spot_allowance: float = 10.0
    condensation_prevented: bool = False

    def __post_init__(self) -> None:
        owner = "cooling"
        require_choice(owner, "temperatures", self.temperatures, get_args(Temperatures))
        require_choice(owner, "method", self.method, get_args(Method))
        require_choice(owner, "insulation_class", self.insulation_class, tuple(CLASS_TEMPERATURE))
        require(owner, "coolant_temperature (C)", self.coolant_temperature, -60.0, 150.0)
        require(owner, "coolant_flow (m3/s)", self.coolant_flow, 1e-7, 1.0)
        require(owner, "channel_height (m)", self.channel_height, 2e-4, 0.2)
        require(owner, "channel_width (m)", self.channel_width, 5e-4, 1.0)
        require(owner, "air_speed (m/s)", self.air_speed, 0.1, 60.0)
        require(owner, "rib_height (m)", self.rib_height, 0.0, 0.3)
        require(owner, "rib_thickness (m)", self.rib_thickness, 1e-4, 0.1)
        require(owner, "rib_gap (m)", self.rib_gap, 1e-4, 0.3)
        require(
            owner,
            "heat_transfer_coefficient (W/(m2 K))",
            self.heat_transfer_coefficient,
            0.5,
            1e5,
        )
        require(owner, "frame_thickness (m)", self.frame_thickness, 1e-4, 0.2)
        require(owner, "joint_conductance (W/(m2 K))", self.joint_conductance, 10.0, 1e6)
        require(owner, "gap_flow (m3/s)", self.gap_flow, 0.0, 10.0)
        if self.gap_flow_temperature is not None:
            require(owner, "gap_flow_temperature (C)", self.gap_flow_temperature, -80.0, 300.0)
        for name in ("impregnation_conductivity", "liner_conductivity"):
            require(owner, f"{name} (W/(m K))", getattr(self, name), 0.02, 10.0)
        require(owner, "hot_spot_allowance (K)", self.hot_spot_allowance, 0.0, 100.0)

    def check_against_ambient(self, ambient_temperature: float) -> None:
        """Refuse a coolant colder than the surroundings unless condensation is prevented.

        Raises
        ------
        ValueError
            Naming both temperatures.
        """
        if self.temperatures == "fixed" or self.condensation_prevented:
            return
        if self.coolant_temperature < ambient_temperature:
            msg = (
                f"cooling: coolant_temperature = {self.coolant_temperature:g} C must not be below "
                f"the ambient temperature of {ambient_temperature:g} C, where moisture condenses "
                "on frame and winding; warm the coolant, or state condensation_prevented"
            )
            raise ValueError(msg)
