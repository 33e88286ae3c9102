"""Thermal classes and permitted rises of IEC 60034-1 and IEC 60085."""

from __future__ import annotations

import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.machine.thermal.insulation import (
    CLASS_TEMPERATURE,
    RISE_LIMIT,
    class_margin,
    rise_margin,
)

check = OutsideChecks("heat")


@pytest.mark.parametrize(("letter", "temperature", "rise"), [
    ("A", 105.0, 60.0),   # rise from memory
    ("E", 120.0, 75.0),   # rise from memory
    ("B", 130.0, 80.0),
    ("F", 155.0, 105.0),
    ("H", 180.0, 125.0),
])  # fmt: skip
def test_classes(letter: str, temperature: float, rise: float) -> None:
    source = "IEC 60085"
    check.same("temperatures of the classes", CLASS_TEMPERATURE[letter], temperature, source=source)
    source = "IEC 60034-1 (A and E from memory)"
    check.same("permitted rises of the classes", RISE_LIMIT[letter], rise, source=source)
    check.within(
        "what class, ambient of 40 °C and permitted rise leave for the hot spot",
        CLASS_TEMPERATURE[letter] - 40.0 - RISE_LIMIT[letter],
        5.0,
        15.0,
        unit="K",
        why="what standards committees allow from class to class",
        source="common practice: 5 to 15 K",
    )


def test_margins() -> None:
    np.testing.assert_allclose(class_margin("F", [140.0, 160.0]), [15.0, -5.0])
    np.testing.assert_allclose(rise_margin("F", [140.0, 150.0]), [5.0, -5.0])


def test_unknown_class_is_refused() -> None:
    with pytest.raises(ValueError, match="'X' must be one of A, E, B, F, H"):
        class_margin("X", 100.0)
