"""Every number that is shipped says whether it is invented, remembered or published."""

from __future__ import annotations

import re
from dataclasses import fields
from pathlib import Path

import pytest

import studies.new_study.template
import studies.shipped
from evaluators.machine.materials import library as materials
from evaluators.machine.quantity import Quantity

SHIPPED = sorted(Path(studies.shipped.__file__).parent.glob("*.toml"))
TEMPLATE = Path(studies.new_study.template.__file__)

ORIGIN = re.compile(
    r"invented for demonstration|from memory|common practice|handbook|IEC |EN |ISO |CoolProp"
    r"|name rule|ideal gas law|molar mass"
)


@pytest.mark.parametrize("file", SHIPPED, ids=lambda file: file.stem)
def test_shipped_plants_say_that_they_are_invented(file: Path) -> None:
    first = file.read_text().split("\n", 1)[0]
    assert first.startswith("# An invented ")


@pytest.mark.parametrize("file", [*SHIPPED, TEMPLATE], ids=lambda file: file.stem)
def test_prices_say_that_they_are_invented(file: Path) -> None:
    before, _ = file.read_text().split("\n[prices]\n")
    comment = re.search(r"((?:^#.*\n?)+)\Z", before, re.MULTILINE)
    assert comment
    assert "nvented round figures" in comment[1]


@pytest.mark.parametrize(
    ("kind", "name"),
    [(kind, name) for kind in materials.KINDS for name in materials.available(kind)],
)
def test_sources_of_materials_tell_what_kind_they_are(kind: str, name: str) -> None:
    material = materials.load(kind, name)
    for entry in fields(material):
        value = getattr(material, entry.name)
        if isinstance(value, Quantity) or entry.name.endswith("_table"):
            assert ORIGIN.search(value.source), f"{entry.name}: {value.source}"
