"""The section ``prices``: a price per kilogram of each material, plain or in detail."""

from __future__ import annotations

from dataclasses import MISSING, fields

from pydantic import Field

from evaluators.machine.cost import Price, Prices
from studies.errors import Finding, Path, quoted
from studies.study_file.schema_base import Section
from studies.study_file.sections import validated
from studies.suggestions import suggest, unknown

LARGEST_PRICE = 1e7  # per kilogram
LONGEST_CURRENCY = 12


class PriceEntry(Section):
    """Price of one material in detail."""

    per_kg: float = Field(ge=0.0, le=LARGEST_PRICE, description="price of a kilogram bought")
    low_per_kg: float | None = Field(
        None, ge=0.0, le=LARGEST_PRICE, description="the same in a cheap market"
    )
    high_per_kg: float | None = Field(
        None, ge=0.0, le=LARGEST_PRICE, description="the same in a dear market"
    )
    waste_share: float = Field(
        Price.waste_share, ge=0.0, le=0.99, description="share of the bought mass that is lost"
    )
    processing_per_kg: float = Field(
        Price.processing_per_kg,
        ge=0.0,
        le=LARGEST_PRICE,
        description="price of making a kilogram of it into parts",
    )


def check_prices(table: object) -> tuple[Prices | None, list[Finding]]:
    """Read the section; None exactly if there are findings."""
    path: Path = ("prices",)
    known = Prices.materials()
    if not isinstance(table, dict):
        problem = f"must be a table (got {quoted(table)})"
        return None, [Finding(path, problem, f"known are {', '.join(known)}")]
    findings: list[Finding] = []
    prices: dict[str, Price] = {}
    currency = table.get("currency", "EUR")
    if (
        not isinstance(currency, str)
        or not currency.isprintable()
        or not 1 <= len(currency.strip()) <= LONGEST_CURRENCY
    ):
        problem = f"cannot name a currency (got {quoted(currency)})"
        findings.append(Finding((*path, "currency"), problem, 'write a short text such as "EUR"'))
    for key, value in table.items():
        here = (*path, key)
        if key == "currency":
            continue
        if key not in known:
            remedy = suggest(key, [*known, "currency"])
            findings.append(Finding(here, unknown("price", key), remedy))
            continue
        plain = isinstance(value, int | float) and not isinstance(value, bool)
        if not plain and not isinstance(value, dict):
            problem = f"must be a price per kilogram (got {quoted(value)})"
            remedy = "give a number, or { per_kg = ..., waste_share = ... }"
            findings.append(Finding(here, problem, remedy))
            continue
        entry, wrong = validated(PriceEntry, {"per_kg": value} if plain else value, here)
        if plain:
            wrong = [Finding(here, item.problem, item.remedy) for item in wrong]
        findings += wrong
        if entry is not None:
            try:
                prices[key] = Price(**entry.model_dump())
            except ValueError as error:
                findings.append(Finding(here, str(error)))
    required = [item.name for item in fields(Prices) if item.default_factory is MISSING]
    findings += [
        Finding((*path, key), "is missing", "give its price per kilogram")
        for key in known
        if key not in table and key in required
    ]
    if findings:
        return None, findings
    return Prices(**prices, currency=currency), []
