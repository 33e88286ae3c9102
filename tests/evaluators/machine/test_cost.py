"""Cost of materials: arithmetic of waste and processing, and what is refused."""

from __future__ import annotations

import numpy as np
import pytest

from evaluators.machine.cost import Price, Prices, active_material_cost, material_costs

PRICES = Prices(
    electrical_steel=Price(2.0, waste_share=0.5),
    copper=Price(10.0, waste_share=0.2, processing_per_kg=1.5),
    magnet=Price(80.0),
    sleeve=Price(40.0),
)


def test_waste_is_a_share_of_what_is_bought() -> None:
    """Half of the sheet is scrap: 1 kg in the machine is 2 kg bought."""
    assert PRICES.electrical_steel.installed("base") == 4.0
    assert PRICES.copper.installed("base") == 14.0


def test_costs_add_up_over_designs() -> None:
    masses = {"electrical_steel": np.array([1.0, 2.0]), "copper": 0.5, "magnet": np.array([0.1, 0])}
    parts = material_costs(masses, PRICES)
    np.testing.assert_allclose(parts["electrical_steel"], [4.0, 8.0])
    np.testing.assert_allclose(active_material_cost(masses, PRICES), [19.0, 15.0])


def test_free_material_costs_nothing() -> None:
    assert active_material_cost({"shaft_steel": 3.0}, PRICES) == 0.0
    assert active_material_cost({}, PRICES) == 0.0


@pytest.mark.parametrize(("arguments", "word"), [
    ((-1.0,), "per_kg"),
    ((1.0, 1.0), "waste_share"),
    ((1.0, -0.1), "waste_share"),
    ((1.0, 0.0, float("inf")), "processing_per_kg"),
])  # fmt: skip
def test_bad_prices_are_refused(arguments: tuple[float, ...], word: str) -> None:
    with pytest.raises(ValueError, match=word):
        Price(*arguments)


def test_unknown_material_and_empty_currency_are_refused() -> None:
    with pytest.raises(ValueError, match="no price for 'gold'; priced are electrical_steel"):
        material_costs({"gold": 1.0}, PRICES)
    with pytest.raises(ValueError, match="currency"):
        Prices(Price(1.0), Price(1.0), Price(1.0), Price(1.0), currency=" ")
