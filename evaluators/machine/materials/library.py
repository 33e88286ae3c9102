"""The materials that are shipped, and how files of materials are read."""

from __future__ import annotations

import difflib
import tomllib
from collections.abc import Mapping
from dataclasses import MISSING, fields
from functools import lru_cache
from importlib import resources
from importlib.resources.abc import Traversable
from pathlib import Path
from typing import Any, TypeVar, overload

import numpy as np

from evaluators.machine.losses.iron import classical_coefficient, fit_iron_loss
from evaluators.machine.materials.kinds import (
    Conductor,
    ElectricalSteel,
    Gas,
    Magnet,
    Material,
    ShaftSteel,
    SleeveMaterial,
    Table,
)
from evaluators.machine.materials.magnetization import MagnetizationCurve
from evaluators.machine.quantity import FloatArray, Quantity

AnyMaterial = TypeVar("AnyMaterial", bound=Material)

__all__ = [
    "KINDS",
    "Conductor",
    "ElectricalSteel",
    "Gas",
    "Magnet",
    "Material",
    "ShaftSteel",
    "SleeveMaterial",
    "available",
    "load",
    "read",
]

KINDS: dict[str, type[Material]] = {
    "electrical_steel": ElectricalSteel,
    "magnet": Magnet,
    "conductor": Conductor,
    "sleeve": SleeveMaterial,
    "shaft_steel": ShaftSteel,
    "gas": Gas,
}
"""Kinds of material; each has one file of that name in `data`."""


def available(kind: str) -> tuple[str, ...]:
    """Return the names of the shipped materials of one kind.

    Raises
    ------
    ValueError
        If the kind is unknown.
    """
    return tuple(_shipped(_known_kind(kind)))


@overload
def load(kind: type[AnyMaterial], name: str) -> AnyMaterial: ...
@overload
def load(kind: str, name: str) -> Material: ...
def load(kind: type[Material] | str, name: str) -> Material:
    """Return a shipped material.

    Parameters
    ----------
    kind
        A class or its word in `KINDS`: ``load(Magnet, "REFeB 300/160")`` and
        ``load("magnet", "REFeB 300/160")`` return the same object.

    Raises
    ------
    ValueError
        If there is no such kind or material; the message lists the nearest names.
    """
    if isinstance(kind, str):
        word = _known_kind(kind)
    else:
        word = next(word for word, known in KINDS.items() if known is kind)
    shipped = _shipped(word)
    if name not in shipped:
        msg = f"no {word} is called {name!r}; {_suggest(name, tuple(shipped))}"
        raise ValueError(msg)
    return shipped[name]


def read(kind: type[AnyMaterial], path: Path | Traversable) -> dict[str, AnyMaterial]:
    """Read a TOML file of materials of one kind, one table per material.

    Raises
    ------
    ValueError
        If the file is no valid TOML or a material is incomplete or implausible; the message
        names file, material and property.
    OSError
        If the file cannot be read.
    """
    try:
        tables = tomllib.loads(path.read_text(encoding="utf-8"))
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        msg = f"{path.name} is not valid TOML: {error}"
        raise ValueError(msg) from error
    materials: dict[str, AnyMaterial] = {}
    for name, table in tables.items():
        try:
            materials[name] = _build(kind, name, table)
        except ValueError as error:
            msg = f"{path.name}, material {name!r}: {error}"
            raise ValueError(msg) from error
    return materials


def _known_kind(kind: str) -> str:
    if kind not in KINDS:
        msg = f"no kind of material is called {kind!r}; {_suggest(kind, tuple(KINDS))}"
        raise ValueError(msg)
    return kind


def _suggest(word: str, choices: tuple[str, ...]) -> str:
    folded = {choice.casefold(): choice for choice in choices}
    close = difflib.get_close_matches(word.casefold(), list(folded), n=3, cutoff=0.4)
    if close:
        return f"did you mean {' or '.join(repr(folded[choice]) for choice in close)}?"
    return f"there are {', '.join(repr(choice) for choice in choices)}"


@lru_cache(maxsize=len(KINDS))
def _shipped(word: str) -> dict[str, Material]:
    data = resources.files("evaluators.machine.materials") / "data"
    return read(KINDS[word], data / f"{word}.toml")


def _build(kind: type[AnyMaterial], name: str, table: Any) -> AnyMaterial:
    if not isinstance(table, Mapping):
        msg = f"expected a table [{name!r}], got {table!r}"
        raise ValueError(msg)
    known = {entry.name: entry for entry in fields(kind)}
    expected = [key for key in known if key not in ("name", "losses", "magnetization")]
    unknown = sorted(set(table) - set(expected))
    if unknown:
        msg = f"unknown property {unknown[0]!r}; {_suggest(unknown[0], tuple(expected))}"
        raise ValueError(msg)
    values: dict[str, Any] = {"name": name}
    for key in expected:
        if key in table:
            values[key] = _value(key, table[key])
        elif known[key].default is MISSING:
            msg = f"property {key!r} is missing"
            raise ValueError(msg)
    if "magnetization" in known:
        columns = values["magnetization_table"].columns
        values["magnetization"] = MagnetizationCurve(
            _column(columns, "field_A_per_m"), _column(columns, "flux_density_T")
        )
    if "losses" in known:
        columns = values["loss_table"].columns
        values["losses"] = fit_iron_loss(
            _column(columns, "frequency_Hz"),
            _column(columns, "flux_density_T"),
            _column(columns, "loss_W_per_kg"),
            classical_coefficient(
                *(values[key].value for key in ("thickness", "resistivity", "density"))
            ),
        )
    return kind(**values)


def _value(key: str, entry: Any) -> Any:
    if key == "description":
        return str(entry)
    if not isinstance(entry, Mapping):
        msg = f"{key} must be a table with value, unit, source and year, got {entry!r}"
        raise ValueError(msg)
    if not key.endswith("_table"):
        try:
            return Quantity.from_table(entry)
        except ValueError as error:
            msg = f"{key}: {error}"
            raise ValueError(msg) from error
    if not {"source", "year"} <= set(entry):
        msg = f"{key} lacks source or year"
        raise ValueError(msg)
    columns = {
        column: np.asarray(numbers, dtype=np.float64)
        for column, numbers in entry.items()
        if column not in ("source", "year")
    }
    return Table(columns=columns, source=entry["source"], year=entry["year"])


def _column(columns: Mapping[str, FloatArray], name: str) -> FloatArray:
    if name not in columns:
        msg = f"a table lacks the column {name!r}"
        raise ValueError(msg)
    return columns[name]
