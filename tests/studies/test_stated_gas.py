"""A gas that the study describes by its properties instead of naming it."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import CoolProp.CoolProp
import numpy as np
import pytest
from click.testing import Result
from outside import OutsideChecks

from evaluators.machine.materials.gas import gas_state
from optimizer.archive.archive import open_archive
from studies.study_file.definition import load_study

Run = Callable[..., Result]
Write = Callable[..., Path]

AT_C, AT_KPA = 70.0, 300.0
FLUID = "R1234ze(E)"

check = OutsideChecks("losses")


def property_of(key: str, kelvin: float, kpa: float = AT_KPA, fluid: str = FLUID) -> float:
    return float(CoolProp.CoolProp.PropsSI(key, "T", kelvin, "P", 1e3 * kpa, fluid))


@pytest.fixture
def section() -> str:
    kelvin = AT_C + 273.15
    density, viscosity, conductivity, heat = (property_of(key, kelvin) for key in "DVLC")
    return f"""
[gas]
name = "refrigerant"
temperature_C = {AT_C}
pressure_kPa = {AT_KPA}
density_kg_m3 = {density}
viscosity_uPa_s = {1e6 * viscosity}
thermal_conductivity_W_mK = {conductivity}
specific_heat_J_kgK = {heat}
source = "CoolProp"
year = 2025
"""


def with_gas(text: str) -> tuple[str, str]:
    return ("[families]", f"{text}\n[families]")


def test_vapour_reaches_the_machine(write_study: Write, section: str) -> None:
    study = load_study(write_study(with_gas(section)))
    assert study.materials.gas.name == "refrigerant"
    kelvin = 80.0 + 273.15
    state = gas_state(study.materials.gas, 80.0, 1e3 * AT_KPA)
    # Ten kelvin from the stated state; the extrapolation is good to some percent.
    np.testing.assert_allclose(
        [state.density, state.viscosity, state.thermal_conductivity],
        [property_of(key, kelvin) for key in "DVL"],
        rtol=0.03,
    )


def test_heavy_vapour_brakes_the_rotor(hovergap: Run, write_study: Write, section: str) -> None:
    losses = []
    analytic = ('name = "toy"', 'name = "analytic"')
    few = ("evaluations_per_family = 200", "evaluations_per_family = 4")
    for name, more in (("air", ()), ("vapour", (with_gas(section),))):
        named = ('name = "small"', f'name = "{name}"')
        study = write_study(analytic, few, named, *more, name=f"{name}.toml")
        assert hovergap("sweep", study, "--workers", "1").exit_code in (0, 3)
        row = open_archive(Path(f"results/{name}/Q6p2s1")).row(0)
        losses.append(row["loss_air_friction_W"])
    # At the Reynolds number of this gap, near 1000, C_m falls as its root (Bilgen, Boulos), so
    # friction grows as the root of density times viscosity; both chambers are at 1 bar and warm.
    kelvin = 80.0 + 273.15
    product = [
        property_of("D", kelvin, 101.325, fluid) * property_of("V", kelvin, 101.325, fluid)
        for fluid in ("Air", FLUID)
    ]
    expected = np.sqrt(product[1] / product[0])
    check(
        "friction in refrigerant vapour over that in air, through a whole study",
        losses[1] / losses[0],
        expected,
        relative=0.1,
        why="end faces follow another exponent, and the gap warms by some kelvin more or less",
        source="root of density times viscosity (Bilgen, Boulos), by CoolProp",
    )


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (("density_kg_m3 = ", "density_kg_m3 = -"), "a number from 0.0001 to 1,000.0 kg/m3"),
        (("year = 2025", ""), "year"),
        (('name = "refrigerant"', 'name = "refrigerant"\nodour = 1'), "odour"),
        (("viscosity_uPa_s", "viscosity_Pa_s"), "viscosity_uPa_s"),
    ],
)
def test_bad_gas_is_told(
    hovergap: Run, write_study: Write, section: str, change: tuple[str, str], words: str
) -> None:
    result = hovergap("check", write_study(with_gas(section.replace(*change))))
    assert result.exit_code == 2
    assert words in result.output


def test_gas_named_and_described(hovergap: Run, write_study: Write, section: str) -> None:
    named = ('shaft = "C45"', 'shaft = "C45"\ngas = "Helium"')
    result = hovergap("check", write_study(named, with_gas(section)))
    assert result.exit_code == 2
    assert "named here and described in [gas]" in result.output
