"""What the user prefers: criteria with weights and aspiration levels, limits, prices."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any, Literal

from evaluators.machine.cost import Price, Prices
from evaluators.machine.metrics import METRIC
from studies.errors import StudiesError
from studies.study_file.crosschecks import METRIC_LISTING, Limit
from studies.study_file.definition import Study
from studies.suggestions import suggest, unknown

Method = Literal["achievement", "sum"]
Market = Literal["low", "base", "high"]


@dataclass(frozen=True)
class Criterion:
    """One objective or metric by which designs are ranked.

    Attributes
    ----------
    name, unit : str
    maximise : bool
    weight : float
        Above zero.
    aspiration : float or None
        Level that would satisfy, in its own sense and unit; None for the best there is.
    """

    name: str
    unit: str
    maximise: bool
    weight: float
    aspiration: float | None = None

    @property
    def sign(self) -> float:
        """Factor that turns the value into one to be minimised."""
        return -1.0 if self.maximise else 1.0


@dataclass(frozen=True)
class Preferences:
    """Everything the user asked for.

    Attributes
    ----------
    criteria : tuple of Criterion
    limits : tuple of Limit
        Beside those of the study.
    prices : mapping of material to price per kilogram
        Scenario; empty for the study's own prices.
    method : str
    market : str
        Which of the study's price lists counts where it tells markets apart.
    """

    criteria: tuple[Criterion, ...]
    limits: tuple[Limit, ...]
    prices: Mapping[str, float]
    method: Method
    market: Market = "base"


def read_pairs(option: str, entries: Sequence[str]) -> dict[str, float]:
    """Read ``NAME=NUMBER`` entries of a repeatable option.

    Raises
    ------
    StudiesError
        If one is none, or a name occurs twice.
    """
    found: dict[str, float] = {}
    for entry in entries:
        name, equals, text = entry.partition("=")
        name = name.strip()
        try:
            value = float(text)
        except ValueError:
            value = math.nan
        if not equals or not name or not math.isfinite(value):
            msg = f"{option} {entry!r}: write NAME=NUMBER"
            raise StudiesError(msg)
        if name in found:
            msg = f"{option}: {name} is given twice"
            raise StudiesError(msg)
        found[name] = value
    return found


def preferences(
    study: Study,
    weights: Mapping[str, float],
    aspirations: Mapping[str, float],
    at_most: Mapping[str, float],
    at_least: Mapping[str, float],
    prices: Mapping[str, float],
    method: Method,
    market: Market = "base",
) -> Preferences:
    """Check and put together.

    Criteria are the study's objectives with weight 1 and whatever `weights` and `aspirations`
    name; a weight of zero takes one out.

    Raises
    ------
    StudiesError
        If a name is unknown, a weight negative, no criterion is left, or the weighted sum is
        asked to use aspiration levels.
    """
    if aspirations and method == "sum":
        msg = "a weighted sum has no use for aspiration levels; leave out --aspire or the method"
        raise StudiesError(msg)
    named = dict.fromkeys([*(goal.name for goal in study.objectives), *weights, *aspirations])
    criteria = []
    for name in named:
        weight = weights.get(name, 1.0)
        if weight < 0.0:
            msg = f"--weight {name}={weight:g}: a weight is 0 or more"
            raise StudiesError(msg)
        if weight > 0.0:
            criteria.append(_criterion(study, name, weight, aspirations.get(name)))
        elif name in aspirations:
            msg = f"{name} has an aspiration level and the weight 0; give one or the other"
            raise StudiesError(msg)
    if not criteria:
        msg = "no criterion is left to rank by; give at least one weight above 0"
        raise StudiesError(msg)
    limits = [_limit(name, value, "at_most") for name, value in at_most.items()]
    limits += [_limit(name, value, "at_least") for name, value in at_least.items()]
    for name, value in prices.items():
        known = Prices.materials()
        if name not in known:
            msg = f"--price: {unknown('price', name)}; " + suggest(
                name, known, f"known are {', '.join(known)}"
            )
            raise StudiesError(msg)
        if value < 0.0:
            msg = f"--price {name}={value:g}: a price is 0 or more"
            raise StudiesError(msg)
    if prices and market != "base":
        msg = "give either a market or prices of your own, not both"
        raise StudiesError(msg)
    return Preferences(tuple(criteria), tuple(limits), dict(prices), method, market)


def scenario_prices(prices: Prices, scenario: Mapping[str, float]) -> Prices:
    """The price list with prices per kilogram bought replaced; waste and processing stay."""
    changed: dict[str, Any] = {}
    for name, value in scenario.items():
        old: Price = getattr(prices, name)
        changed[name] = Price(value, old.waste_share, old.processing_per_kg)
    return replace(prices, **changed)


def _criterion(study: Study, name: str, weight: float, aspiration: float | None) -> Criterion:
    for goal in study.objectives:
        if goal.name == name:
            unit = METRIC[name].unit if name in METRIC else ""
            return Criterion(name, unit, goal.maximise, weight, aspiration)
    if name not in METRIC:
        raise StudiesError(_no_metric(name, "criterion"))
    smaller = METRIC[name].smaller_is_better
    if smaller is None:
        msg = f"{name}: neither more nor less of it is better in itself; limit it instead"
        raise StudiesError(msg)
    return Criterion(name, METRIC[name].unit, not smaller, weight, aspiration)


def _limit(name: str, value: float, kind: Literal["at_most", "at_least"]) -> Limit:
    if name not in METRIC:
        raise StudiesError(_no_metric(name, "metric to limit"))
    return Limit(name, kind, value)


def _no_metric(name: str, what: str) -> str:
    return f"{unknown(what, name)}; {suggest(name, METRIC, METRIC_LISTING)}"
