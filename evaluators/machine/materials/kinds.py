"""What each kind of material consists of, and the ranges its properties must lie in."""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Annotated, get_args, get_type_hints

import numpy as np
from numpy.typing import ArrayLike, NDArray

from evaluators.machine.losses.iron import IronLossCoefficients
from evaluators.machine.materials.magnetization import MagnetizationCurve
from evaluators.machine.quantity import MU_0, FloatArray, Quantity

ABSOLUTE_ZERO_C = -273.15


@dataclass(frozen=True)
class Limits:
    """Unit of a property, and the range beyond which its value must be a slip."""

    unit: str
    low: float
    high: float


def properties(kind: type[Material]) -> dict[str, Limits]:
    """Return the properties of a kind of material that are quantities, with their limits."""
    found: dict[str, Limits] = {}
    for name, hint in get_type_hints(kind, include_extras=True).items():
        for item in get_args(hint):
            if isinstance(item, Limits):
                found[name] = item
    return found


@dataclass(frozen=True, kw_only=True)
class Material:
    """What all materials share.

    Parameters
    ----------
    name
        Designation under which the material is loaded.
    description
        One sentence for tables.
    density
        kg/m3.

    Raises
    ------
    ValueError
        If a property has another unit than declared or lies outside its plausible range.
    """

    name: str
    description: str
    density: Annotated[Quantity, Limits("kg/m3", 0.01, 25e3)]

    def __post_init__(self) -> None:
        for name, limits in properties(type(self)).items():
            quantity = getattr(self, name)
            if quantity is None:
                continue
            if quantity.unit != limits.unit:
                msg = f"{self.name}: {name} is in {quantity.unit!r}; it must be in {limits.unit!r}"
                raise ValueError(msg)
            for value in (quantity.value, *quantity.table_value):
                if not limits.low <= value <= limits.high:
                    msg = (
                        f"{self.name}: {name} = {value} {limits.unit} is outside the range"
                        f" {limits.low} to {limits.high}"
                    )
                    raise ValueError(msg)

    def covers(self, temperature_C: ArrayLike) -> NDArray[np.bool_]:
        """Tell for each temperature (°C) whether all tables of the material cover it."""
        known = np.ones(np.shape(temperature_C), dtype=np.bool_)
        for entry in fields(self):
            quantity = getattr(self, entry.name)
            if isinstance(quantity, Quantity):
                known = known & quantity.covers(temperature_C)
        return np.asarray(known)

    @property
    def temperature_range(self) -> tuple[float, float]:
        """Lowest and highest temperature in degC that every table covers and the limit allows."""
        low, high = ABSOLUTE_ZERO_C, float("inf")
        for entry in fields(self):
            quantity = getattr(self, entry.name)
            if not isinstance(quantity, Quantity):
                continue
            if entry.name == "maximum_temperature":
                high = min(high, quantity.value)
            elif quantity.table_C:
                low, high = max(low, quantity.table_C[0]), min(high, quantity.table_C[-1])
        return low, high


@dataclass(frozen=True, kw_only=True)
class SolidMaterial(Material):
    """A solid with its thermal properties."""

    density: Annotated[Quantity, Limits("kg/m3", 100.0, 25e3)]
    resistivity: Annotated[Quantity, Limits("ohm m", 1e-9, 1e12)]
    thermal_conductivity: Annotated[Quantity, Limits("W/(m K)", 0.05, 1e3)]
    specific_heat: Annotated[Quantity, Limits("J/(kg K)", 50.0, 5e3)]


@dataclass(frozen=True, kw_only=True, eq=False)
class Table:
    """A measured table with its provenance; `columns` are equally long."""

    columns: dict[str, FloatArray]
    source: str
    year: int


@dataclass(frozen=True, kw_only=True)
class ElectricalSteel(SolidMaterial):
    """Non-oriented electrical sheet.

    `magnetization` is that of the solid sheet at room temperature and direct current; use
    ``magnetization.laminated(stacking_factor)`` for the stack. `losses` are fitted to
    `loss_table`, new undamaged sheet; the influence of cutting and joining is for the user of
    the coefficients to add.
    """

    thickness: Annotated[Quantity, Limits("m", 2e-5, 2e-3)]
    stacking_factor: Annotated[Quantity, Limits("1", 0.5, 1.0)]
    yield_strength: Annotated[Quantity, Limits("Pa", 5e7, 3e9)]
    magnetization: MagnetizationCurve
    magnetization_table: Table
    losses: IronLossCoefficients
    loss_table: Table


@dataclass(frozen=True, kw_only=True)
class Magnet(SolidMaterial):
    """Sintered permanent magnet with a straight recoil line that ends in a knee.

    B = remanence + mu0 recoil_permeability H holds down to H = -knee_ratio * coercivity, where
    coercivity is that of polarization (HcJ). Temperature coefficients are the reversible ones;
    thermal expansion is given along and across the direction of magnetization.
    """

    remanence: Annotated[Quantity, Limits("T", 0.1, 1.6)]
    coercivity: Annotated[Quantity, Limits("A/m", 5e4, 4e6)]
    recoil_permeability: Annotated[Quantity, Limits("1", 1.0, 1.5)]
    knee_ratio: Annotated[Quantity, Limits("1", 0.3, 1.0)]
    maximum_temperature: Annotated[Quantity, Limits("degC", 20.0, 600.0)]
    young_modulus: Annotated[Quantity, Limits("Pa", 1e9, 5e11)]
    poisson_ratio: Annotated[Quantity, Limits("1", 0.0, 0.5)]
    tensile_strength: Annotated[Quantity, Limits("Pa", 1e6, 1e9)]
    compressive_strength: Annotated[Quantity, Limits("Pa", 1e7, 1e10)]
    expansion_along: Annotated[Quantity, Limits("1/K", -1e-5, 5e-5)]
    expansion_across: Annotated[Quantity, Limits("1/K", -1e-5, 5e-5)]

    def knee_field(self, temperature_C: ArrayLike) -> FloatArray:
        """Return the field at the knee in A/m (negative) at a temperature in °C."""
        return np.asarray(-self.knee_ratio.at(temperature_C) * self.coercivity.at(temperature_C))

    def knee_flux_density(self, temperature_C: ArrayLike) -> FloatArray:
        """Return the flux density at the knee in T at a temperature in °C.

        Below this value a magnet loses part of its remanence. Negative values mean that the
        whole second quadrant is straight.
        """
        slope = MU_0 * self.recoil_permeability.at(temperature_C)
        return np.asarray(self.remanence.at(temperature_C) + slope * self.knee_field(temperature_C))


@dataclass(frozen=True, kw_only=True)
class Conductor(SolidMaterial):
    """Metal of a winding."""

    expansion: Annotated[Quantity, Limits("1/K", 0.0, 1e-4)]


@dataclass(frozen=True, kw_only=True)
class StructuralMaterial(SolidMaterial):
    """A solid that carries load; properties are those along the hoop unless named otherwise."""

    young_modulus: Annotated[Quantity, Limits("Pa", 1e8, 1e12)]
    poisson_ratio: Annotated[Quantity, Limits("1", 0.0, 0.5)]
    expansion: Annotated[Quantity, Limits("1/K", -1e-5, 1e-4)]
    yield_strength: Annotated[Quantity, Limits("Pa", 1e6, 1e10)]
    tensile_strength: Annotated[Quantity, Limits("Pa", 1e6, 1e10)]
    maximum_temperature: Annotated[Quantity, Limits("degC", 20.0, 1200.0)]

    def __post_init__(self) -> None:
        super().__post_init__()
        if self.yield_strength.value > self.tensile_strength.value:
            msg = (
                f"{self.name}: yield_strength = {self.yield_strength.value} Pa exceeds"
                f" tensile_strength = {self.tensile_strength.value} Pa"
            )
            raise ValueError(msg)


@dataclass(frozen=True, kw_only=True)
class SleeveMaterial(StructuralMaterial):
    """Retaining sleeve: an isotropic metal, or a wound fibre with properties across the fibre.

    `poisson_ratio` is the contraction across the hoop under stress along it. `resistivity` is
    that along the axis, the way induced currents flow. A wound fibre has no yield point; its
    `yield_strength` is the stress up to which its maker's data hold, here equal to the strength.
    """

    relative_permeability: Annotated[Quantity, Limits("1", 1.0, 1.5)]
    radial_young_modulus: Annotated[Quantity | None, Limits("Pa", 1e8, 1e12)] = None
    radial_expansion: Annotated[Quantity | None, Limits("1/K", -1e-5, 2e-4)] = None

    def __post_init__(self) -> None:
        super().__post_init__()
        if (self.radial_young_modulus is None) != (self.radial_expansion is None):
            msg = f"{self.name}: give both radial_young_modulus and radial_expansion, or neither"
            raise ValueError(msg)

    @property
    def isotropic(self) -> bool:
        """Whether the material is the same in all directions."""
        return self.radial_young_modulus is None

    @property
    def young_modulus_radial(self) -> Quantity:
        """Young's modulus in the radial direction, Pa."""
        return self.radial_young_modulus or self.young_modulus

    @property
    def expansion_radial(self) -> Quantity:
        """Thermal expansion in the radial direction, 1/K."""
        return self.radial_expansion or self.expansion


@dataclass(frozen=True, kw_only=True)
class ShaftSteel(StructuralMaterial):
    """Steel of shaft and solid rotor core."""

    magnetization: MagnetizationCurve
    magnetization_table: Table


@dataclass(frozen=True, kw_only=True)
class Gas(Material):
    """Gas of the rotor chamber, ideal, with viscosity and conductivity by Sutherland's law.

    `density` is that at 101325 Pa and the temperature it states.
    """

    specific_heat: Annotated[Quantity, Limits("J/(kg K)", 100.0, 2e4)]
    gas_constant: Annotated[Quantity, Limits("J/(kg K)", 20.0, 5e3)]
    viscosity: Annotated[Quantity, Limits("Pa s", 1e-6, 1e-4)]
    viscosity_temperature: Annotated[Quantity, Limits("K", 1.0, 2e3)]
    thermal_conductivity: Annotated[Quantity, Limits("W/(m K)", 1e-3, 1.0)]
    conductivity_temperature: Annotated[Quantity, Limits("K", 1.0, 2e3)]
