"""Cost of the active materials from masses and a price list."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field, fields
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.quantity import FloatArray, floats

Scenario = Literal["low", "base", "high"]
SCENARIOS: tuple[Scenario, ...] = ("low", "base", "high")
"""Markets a price list tells apart."""


@dataclass(frozen=True)
class Price:
    """Price of one material.

    Parameters
    ----------
    per_kg
        Currency units per kilogram bought.
    waste_share
        Share of the bought mass that does not end up in the machine (punching scrap, grinding
        dust, wire ends), from 0 to below 1.
    processing_per_kg
        Currency units per kilogram in the machine for turning material into a part.
    low_per_kg, high_per_kg
        `per_kg` in a cheap and in a dear market; None for the same.

    Raises
    ------
    ValueError
        If a number is negative or not finite, the waste share reaches 1, or the three prices do
        not rise.
    """

    per_kg: float
    waste_share: float = 0.0
    processing_per_kg: float = 0.0
    low_per_kg: float | None = None
    high_per_kg: float | None = None

    def __post_init__(self) -> None:
        for name in ("per_kg", "processing_per_kg", "low_per_kg", "high_per_kg"):
            value = getattr(self, name)
            if value is not None and not (math.isfinite(value) and value >= 0.0):
                msg = f"{name} = {value} must be 0 or more"
                raise ValueError(msg)
        if not 0.0 <= self.waste_share < 1.0:
            msg = f"waste_share = {self.waste_share} must be 0 or more and below 1"
            raise ValueError(msg)
        if not self._bought("low") <= self.per_kg <= self._bought("high"):
            msg = (
                f"low_per_kg = {self._bought('low')}, per_kg = {self.per_kg} and high_per_kg = "
                f"{self._bought('high')} must not fall"
            )
            raise ValueError(msg)

    def installed(self, scenario: Scenario) -> float:
        """Currency units per kilogram that is in the machine."""
        return self._bought(scenario) / (1.0 - self.waste_share) + self.processing_per_kg

    def _bought(self, scenario: Scenario) -> float:
        other = {"low": self.low_per_kg, "base": None, "high": self.high_per_kg}[scenario]
        return self.per_kg if other is None else other


@dataclass(frozen=True)
class Prices:
    """Price list of the active materials; `currency` only labels the result.

    Raises
    ------
    ValueError
        If the currency is empty.
    """

    electrical_steel: Price
    copper: Price
    magnet: Price
    sleeve: Price
    shaft_steel: Price = field(default_factory=lambda: Price(0.0))
    currency: str = "EUR"

    def __post_init__(self) -> None:
        if not self.currency.strip():
            msg = "currency is empty; name one, for instance EUR"
            raise ValueError(msg)

    @classmethod
    def materials(cls) -> tuple[str, ...]:
        """Return the names of the priced materials."""
        return tuple(entry.name for entry in fields(cls) if entry.name != "currency")


def material_costs(
    masses: Mapping[str, ArrayLike], prices: Prices, scenario: Scenario = "base"
) -> dict[str, FloatArray]:
    """Return the cost of each material in currency units.

    Parameters
    ----------
    masses
        Net masses in kg by the names of `Prices.materials`, shape (n,) each; materials left out
        cost nothing.
    prices
        Price list.
    scenario
        Market whose prices count.

    Returns
    -------
    dict
        By the same names, shape (n,).

    Raises
    ------
    ValueError
        If a material has no price.
    """
    unknown = sorted(set(masses) - set(Prices.materials()))
    if unknown:
        msg = f"no price for {unknown[0]!r}; priced are {', '.join(Prices.materials())}"
        raise ValueError(msg)
    return {
        name: floats(mass) * float(getattr(prices, name).installed(scenario))
        for name, mass in masses.items()
    }


def active_material_cost(
    masses: Mapping[str, ArrayLike], prices: Prices, scenario: Scenario = "base"
) -> FloatArray:
    """Return the cost of all active materials in currency units, shape (n,).

    Arguments and exceptions as for `material_costs`.
    """
    total: FloatArray = np.zeros(())
    for cost in material_costs(masses, prices, scenario).values():
        total = np.asarray(total + cost)
    return total
