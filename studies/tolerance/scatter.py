"""What scatters and by how much, and seeded draws of it."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from evaluators.machine.quantity import Quantity
from evaluators.machine.task.task import MaterialSet
from studies.errors import StudiesError
from studies.suggestions import suggest, unknown

FloatArray = NDArray[np.float64]
Distribution = Literal["normal", "uniform"]

SIGMAS = 3.0  # a tolerance is this many standard deviations of a normal scatter: Cp = 1
ENTRY = re.compile(r"\s*([A-Za-z_0-9]+)\s*=\s*([0-9.eE+-]+)\s*(%?)\s*")


@dataclass(frozen=True)
class Scatter:
    """One independent source of scatter.

    Attributes
    ----------
    name : str
        With the unit as suffix; without one the scatter is relative.
    tolerance : float
        Half the width of the tolerance, in the unit, or as a share.
    by_machine : bool
        True for a dimension of each machine, False for what a whole lot shares.
    reason : str
        Where the default comes from.
    """

    name: str
    tolerance: float
    by_machine: bool
    reason: str

    @property
    def relative(self) -> bool:
        """Whether the tolerance is a share of the value."""
        return not self.name.endswith(("_mm", "_um"))

    def text(self) -> str:
        """Name and tolerance for a reader."""
        if self.relative:
            return f"{self.name} +-{100.0 * self.tolerance:g} %"
        return f"{self.name} +-{self.tolerance:g} {self.name.rpartition('_')[2]}"


GROUND = "ground surface (common practice)"
STAMPED = "stamped or laser-cut sheet in a stack (common practice)"
MADE = "invented, put your supplier's"

DIMENSIONS = (
    Scatter("rotor_radius_mm", 0.01, True, GROUND),
    Scatter("bore_radius_mm", 0.02, True, STAMPED),
    Scatter("sleeve_thickness_mm", 0.03, True, MADE),
    Scatter("magnet_thickness_mm", 0.05, True, "sintered and ground, ISO 2768 f (from memory)"),
    Scatter("magnet_width_mm", 0.1, True, "sintered and ground, ISO 2768 f (from memory)"),
    Scatter("shaft_radius_mm", 0.01, True, GROUND),
    Scatter("tooth_width_mm", 0.03, True, STAMPED),
    Scatter("tip_width_mm", 0.05, True, STAMPED),
    Scatter("tip_height_mm", 0.05, True, STAMPED),
    Scatter("wedge_height_mm", 0.05, True, STAMPED),
    Scatter("slot_depth_mm", 0.05, True, STAMPED),
    Scatter("outer_radius_mm", 0.03, True, STAMPED),
)

# Of a lot: (name, material, property); the default is the uncertainty stated with the property.
PROPERTIES = (
    ("magnet_remanence", "magnet", "remanence", 0.02),
    ("magnet_recoil_permeability", "magnet", "recoil_permeability", 0.02),
    ("conductor_resistivity", "conductor", "resistivity", 0.01),
    ("stator_stacking_factor", "stator_steel", "stacking_factor", 0.01),
)
OTHERS = (
    Scatter("stator_steel_loss", 0.15, False, "sheet as delivered and cut; invented"),
    Scatter("copper_fill", 0.03, False, "hand-fed winding; invented"),
    Scatter("sleeve_interference_um", 10.0, False, "fit of sleeve and magnets; invented"),
)


def defaults(materials: MaterialSet) -> tuple[Scatter, ...]:
    """All sources of scatter with their default tolerance."""
    lots = []
    for name, material, quantity_name, otherwise in PROPERTIES:
        quantity: Quantity = getattr(getattr(materials, material), quantity_name)
        known = quantity.uncertainty
        lots.append(
            Scatter(
                name,
                otherwise if known is None else known,
                False,
                MADE if known is None else "uncertainty stated with the material",
            )
        )
    return (*DIMENSIONS, *lots, *OTHERS)


def overridden(scatters: Sequence[Scatter], entries: Sequence[str]) -> tuple[Scatter, ...]:
    """The sources with tolerances replaced by entries such as ``tooth_width_mm=0.05``.

    A relative tolerance may be given in per cent, ``magnet_remanence=3%``; zero takes a source
    out.

    Raises
    ------
    StudiesError
        If an entry is none, names no source or is negative.
    """
    known = {item.name: item for item in scatters}
    for entry in entries:
        match = ENTRY.fullmatch(entry)
        if match is None:
            msg = f"--scatter {entry!r}: write NAME=TOLERANCE, such as tooth_width_mm=0.05"
            raise StudiesError(msg)
        name, text, per_cent = match.groups()
        if name not in known:
            msg = f"--scatter: {unknown('source of scatter', name)}; " + suggest(
                name, known, f"known are {', '.join(known)}"
            )
            raise StudiesError(msg)
        try:
            value = float(text) * (0.01 if per_cent else 1.0)
        except ValueError:
            msg = f"--scatter {entry!r}: {text!r} is no number"
            raise StudiesError(msg) from None
        if per_cent and not known[name].relative:
            msg = f"--scatter {entry!r}: {name} is a length, give it in its unit, not in per cent"
            raise StudiesError(msg)
        if not 0.0 <= value < (1.0 if known[name].relative else np.inf):
            msg = f"--scatter {entry!r}: a tolerance is 0 or more, a relative one below 100 %"
            raise StudiesError(msg)
        known[name] = replace(known[name], tolerance=value, reason="given")
    return tuple(item for item in known.values() if item.tolerance > 0.0)


@dataclass(frozen=True)
class Draw:
    """Deviations of n machines in lots.

    Attributes
    ----------
    scatters : tuple of Scatter
    deviations : array (n, k)
        From nominal, in the unit of each source, or relative.
    lot : array (n,) of int
        Which lot each machine belongs to; machines of a lot share all but their dimensions.
    sigma : array (k,)
        Standard deviation of each source.
    """

    scatters: tuple[Scatter, ...]
    deviations: FloatArray
    lot: NDArray[np.int64]
    sigma: FloatArray

    def of(self, name: str) -> FloatArray:
        """Deviations (n,) of one source, zero if it does not scatter."""
        for column, item in enumerate(self.scatters):
            if item.name == name:
                return self.deviations[:, column]
        return np.zeros(len(self.deviations))


def draw(
    scatters: Sequence[Scatter],
    machines: int,
    lots: int,
    seed: int,
    distribution: Distribution = "normal",
) -> Draw:
    """Draw machines by Latin hypercube sampling, so that each source is covered evenly.

    McKay, Beckman, Conover, *Technometrics* 21(2), 1979. A normal scatter has the tolerance at
    `SIGMAS` standard deviations and is not cut off; a uniform one fills the tolerance.

    Parameters
    ----------
    scatters : sequence of Scatter
    machines, lots : int
        Machines are dealt to the lots in turn; at most as many lots as machines.
    seed : int
    """
    from scipy.special import ndtri
    from scipy.stats import qmc

    streams = np.random.SeedSequence(seed).spawn(2)
    own = sum(item.by_machine for item in scatters)
    lot = np.arange(machines) % lots
    shares = np.empty((machines, len(scatters)))
    for mask, rows, dimension, stream in (
        (True, machines, own, streams[0]),
        (False, lots, len(scatters) - own, streams[1]),
    ):
        if not dimension:
            continue
        sample = qmc.LatinHypercube(dimension, rng=np.random.default_rng(stream)).random(rows)
        columns = [k for k, item in enumerate(scatters) if item.by_machine is mask]
        shares[:, columns] = sample if mask else sample[lot]
    tolerance = np.array([item.tolerance for item in scatters])
    if distribution == "normal":
        sigma = tolerance / SIGMAS
        deviations = ndtri(np.clip(shares, 1e-12, 1.0 - 1e-12)) * sigma
    else:
        sigma = tolerance / np.sqrt(3.0)
        deviations = (2.0 * shares - 1.0) * tolerance
    return Draw(tuple(scatters), np.asarray(deviations), lot, sigma)
