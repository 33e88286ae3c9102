"""Thermal classes of insulation and permitted temperature rises."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.quantity import FloatArray, floats

CLASS_TEMPERATURE: dict[str, float] = {"A": 105.0, "E": 120.0, "B": 130.0, "F": 155.0, "H": 180.0}
"""Hottest temperature in degC of each class; IEC 60085 and IEC 60034-1."""

RISE_LIMIT: dict[str, float] = {"A": 60.0, "E": 75.0, "B": 80.0, "F": 105.0, "H": 125.0}
"""Rise in K of the mean winding temperature (by resistance) over a coolant of 40 degC.

IEC 60034-1, air-cooled windings of machines of 0.6 to 200 kW; A and E from memory.
"""

REFERENCE_AMBIENT = 40.0  # degC, to which the rises belong; IEC 60034-1


def class_margin(insulation_class: str, hot_spot_C: ArrayLike) -> FloatArray:
    """Return what is left of `CLASS_TEMPERATURE` at the hottest point, in K.

    Parameters
    ----------
    insulation_class
        A, E, B, F or H.
    hot_spot_C
        Hottest temperature of the winding in degC, any shape.

    Raises
    ------
    ValueError
        If there is no such class.
    """
    return np.asarray(_look_up(CLASS_TEMPERATURE, insulation_class) - floats(hot_spot_C))


def rise_margin(insulation_class: str, mean_C: ArrayLike) -> FloatArray:
    """Return what the mean winding temperature leaves below the permitted one, in K.

    The permitted mean is the rise of `RISE_LIMIT` above 40 degC; with another coolant temperature
    IEC 60034-1 moves the rise by the difference, so that the permitted temperature stays.

    Parameters
    ----------
    insulation_class
        A, E, B, F or H.
    mean_C
        Mean temperature of the winding in degC, as its resistance shows it, any shape.

    Raises
    ------
    ValueError
        If there is no such class.
    """
    limit = REFERENCE_AMBIENT + _look_up(RISE_LIMIT, insulation_class)
    return np.asarray(limit - floats(mean_C))


def _look_up(table: dict[str, float], insulation_class: str) -> float:
    if insulation_class not in table:
        msg = f"insulation class {insulation_class!r} must be one of {', '.join(table)}"
        raise ValueError(msg)
    return table[insulation_class]
