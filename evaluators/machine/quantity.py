"""A number with its unit, its dependence on temperature, and where it comes from."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

MU_0 = 4e-7 * math.pi
"""Magnetic constant in H/m; the CODATA 2018 value differs by less than 1e-9 of it."""


def floats(values: ArrayLike) -> FloatArray:
    """Return the values as an array of floats, without a copy where they are one."""
    return np.asarray(values, dtype=np.float64)


@dataclass(frozen=True)
class Quantity:
    """One material property.

    Parameters
    ----------
    value
        The value at `at_C`, in `unit`.
    unit
        Unit in SI symbols, for instance ``"kg/m3"``.
    source
        Publication, ``from memory`` with what it is a memory of, or ``invented ...``.
    year
        Year of the source.
    at_C
        Temperature of `value` in °C.
    per_K
        Relative change per kelvin, referred to `at_C`. Zero when the dependence is neglected.
    table_C, table_value
        Values against temperature, used instead of `value` and `per_K` when given; linear between
        the points and constant beyond them (ask `covers` whether that happens).
    uncertainty
        Relative spread to expect between deliveries or sources, where one is known.

    Raises
    ------
    ValueError
        If a number is not finite, a source is missing, or a table is not increasing in
        temperature.
    """

    value: float
    unit: str
    source: str
    year: int
    at_C: float = 20.0
    per_K: float = 0.0
    table_C: tuple[float, ...] = ()
    table_value: tuple[float, ...] = ()
    uncertainty: float | None = None

    def __post_init__(self) -> None:
        object.__setattr__(self, "table_C", tuple(self.table_C))
        object.__setattr__(self, "table_value", tuple(self.table_value))
        numbers = (self.value, self.at_C, self.per_K, *self.table_C, *self.table_value)
        if not all(math.isfinite(number) for number in numbers):
            msg = f"value, temperatures and tables must be finite numbers, got {numbers}"
            raise ValueError(msg)
        if not self.source.strip():
            msg = "source is empty; say `from memory` or `invented` when that is the truth"
            raise ValueError(msg)
        if len(self.table_C) != len(self.table_value):
            msg = (
                f"table_C has {len(self.table_C)} entries and table_value {len(self.table_value)};"
                " they must match"
            )
            raise ValueError(msg)
        if any(b <= a for a, b in zip(self.table_C, self.table_C[1:], strict=False)):
            msg = f"table_C must increase, got {self.table_C}"
            raise ValueError(msg)
        if self.uncertainty is not None and not 0.0 <= self.uncertainty < 1.0:
            msg = f"uncertainty = {self.uncertainty} is outside the range 0 to 1"
            raise ValueError(msg)

    def at(self, temperature_C: ArrayLike) -> FloatArray:
        """Return the value at `temperature_C` (°C, any shape), same shape."""
        temperature = floats(temperature_C)
        if self.table_C:
            return np.asarray(np.interp(temperature, self.table_C, self.table_value))
        return np.asarray(self.value * (1.0 + self.per_K * (temperature - self.at_C)))

    def covers(self, temperature_C: ArrayLike) -> NDArray[np.bool_]:
        """Tell for each temperature (°C) whether a table covers it; true when there is none."""
        temperature = floats(temperature_C)
        if not self.table_C:
            return np.ones(temperature.shape, dtype=np.bool_)
        return np.asarray((temperature >= self.table_C[0]) & (temperature <= self.table_C[-1]))

    @classmethod
    def from_table(cls, table: Mapping[str, Any]) -> Quantity:
        """Build from one TOML table.

        Raises
        ------
        ValueError
            If a key is unknown or missing, or a value has the wrong type.
        """
        known = {field.name for field in fields(cls)}
        unknown = sorted(set(table) - known)
        if unknown:
            msg = f"unknown key {unknown[0]!r}; known are {', '.join(sorted(known))}"
            raise ValueError(msg)
        missing = sorted({"value", "unit", "source", "year"} - set(table))
        if missing:
            msg = f"key {missing[0]!r} is missing"
            raise ValueError(msg)
        try:
            return cls(**table)
        except TypeError as error:
            msg = f"a value has the wrong type ({error})"
            raise ValueError(msg) from error
