"""Residual unbalance and the rotating force it leaves to the suspension."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from evaluators.machine.quantity import FloatArray, floats


class ResidualUnbalance(NamedTuple):
    """Permissible residual unbalance of a rotor; arrays of the shape of the arguments."""

    eccentricity: FloatArray
    """Offset of the centre of mass in m."""
    unbalance: FloatArray
    """Mass times offset in kg m."""
    force: FloatArray
    """Force turning with the rotor in N."""


def residual_unbalance(
    grade: ArrayLike, mass: ArrayLike, speed: ArrayLike, balanced_at: ArrayLike
) -> ResidualUnbalance:
    """Return what a balance grade leaves on a rotor.

    The grade G is the product of offset and angular speed: e = G / w. ISO 21940-11:2016 (the
    former ISO 1940-1).

    Parameters
    ----------
    grade
        G in m/s: the grade G 2.5 is 2.5e-3.
    mass
        Rotor mass in kg.
    speed
        Angular speed at which the force is wanted, in rad/s.
    balanced_at
        Highest service speed the grade is stated for, in rad/s, above zero.
    """
    eccentricity = floats(grade) / floats(balanced_at)
    unbalance = floats(mass) * eccentricity
    return ResidualUnbalance(
        eccentricity=eccentricity,
        unbalance=unbalance,
        force=np.asarray(unbalance * floats(speed) ** 2),
    )
