"""The shipped materials against the limits of the standards, and the reading of data files."""

from __future__ import annotations

import math
import re
from dataclasses import fields
from pathlib import Path

import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.machine.losses.iron import iron_loss_sine
from evaluators.machine.materials import library as materials
from evaluators.machine.materials.library import Conductor, ElectricalSteel, Magnet, SleeveMaterial
from evaluators.machine.quantity import Quantity

MU_0 = 4e-7 * math.pi

check = OutsideChecks("materials")
SHEETS = (
    "IEC 60404-8-4:2013 / EN 10106:2015 (from memory, except M270-35A as quoted in public text)"
)
LIMIT = "one-sided and without tolerance: the standard guarantees limits, not typical values"
NAME_OF_MAGNET = "name rule of IEC 60404-8-1 (from memory)"

# Largest loss at 1.5 T and 1.0 T, 50 Hz in W/kg, smallest polarization at 2500, 5000, 10000 A/m
# in T, conventional density in kg/m3.
GRADES = {
    "M235-35A": (2.35, 0.95, (1.49, 1.60, 1.70), 7600.0),
    "M270-35A": (2.70, 1.10, (1.49, 1.60, 1.70), 7650.0),
    "M330-50A": (3.30, 1.35, (1.49, 1.60, 1.70), 7650.0),
}

EVERY = [(kind, name) for kind in materials.KINDS for name in materials.available(kind)]
STEELS = materials.available("electrical_steel")
MAGNETS = materials.available("magnet")


@pytest.mark.parametrize(("kind", "name"), EVERY)
def test_every_number_says_where_it_comes_from(kind: str, name: str) -> None:
    material = materials.load(kind, name)
    assert material.name == name
    assert material.description
    for entry in fields(material):
        value = getattr(material, entry.name)
        if isinstance(value, Quantity) or entry.name.endswith("_table"):
            assert value.source.strip()
            assert 1850 <= value.year <= 2100


@pytest.mark.parametrize("name", GRADES)
def test_sheets_keep_the_limits_of_their_grade(name: str) -> None:
    loss_15, loss_10, polarization, density = GRADES[name]
    steel = materials.load(ElectricalSteel, name)
    total = iron_loss_sine(steel.losses, [1.5, 1.0], 50.0).total
    check.within(
        "loss of sheets over the limit of their grade, 1.5 and 1 T, 50 Hz",
        total / [loss_15, loss_10],
        -math.inf,
        1.0,
        why=LIMIT,
        source=SHEETS,
    )
    field = np.array([2500.0, 5000.0, 10_000.0])
    j = steel.magnetization.flux_density(field) - MU_0 * field
    check.within(
        "polarization of sheets over the limit of their grade, 2.5, 5 and 10 kA/m",
        j / polarization,
        1.0,
        math.inf,
        why=LIMIT,
        source=SHEETS,
    )
    check.same("conventional density of sheets", steel.density.value, density, source=SHEETS)


@pytest.mark.parametrize("name", STEELS)
def test_sheet_names_decode_to_thickness_and_loss(name: str) -> None:
    """M + 100 W/kg at 1.5 T, 50 Hz - 100 mm A; NO + 100 mm - 100 W/kg at 1 T, 400 Hz."""
    steel = materials.load(ElectricalSteel, name)
    if match := re.fullmatch(r"M(\d{3})-(\d{2})A", name):
        limit, thickness = int(match[1]) / 100.0, int(match[2])
        loss = iron_loss_sine(steel.losses, 1.5, 50.0).total
    else:
        match = re.fullmatch(r"NO(\d{2})-(\d{4})", name)
        assert match
        limit, thickness = int(match[2]) / 100.0, int(match[1])
        loss = iron_loss_sine(steel.losses, 1.0, 400.0).total
    assert steel.thickness.value == pytest.approx(thickness * 1e-5, rel=1e-12)
    check.within(
        "loss of sheets over the limit in their name",
        loss / limit,
        0.75,
        1.0,
        why="the name is a limit; a sheet far below its grade would be sold as a better one",
        source="names of EN 10027-1 style and of EN 10303 (from memory)",
    )


@pytest.mark.parametrize("name", STEELS)
def test_fitted_losses_follow_the_table(name: str) -> None:
    steel = materials.load(ElectricalSteel, name)
    table = steel.loss_table.columns
    fit = iron_loss_sine(steel.losses, table["flux_density_T"], table["frequency_Hz"])
    check(
        "losses by the three-term law over the table of each sheet",
        fit.total,
        table["loss_W_per_kg"],
        relative=0.025,
        why="the scatter of the tables is 1.5 %; a three-term law should not add much to it",
        source="loss tables of the shipped sheets, with their sources in the data files",
    )
    check.within(
        "classical loss over the loss in the table of each sheet",
        fit.classical / table["loss_W_per_kg"],
        0.0,
        1.0,
        why="a lower bound of any measured total",
        source="loss tables of the shipped sheets, with their sources in the data files",
    )


@pytest.mark.parametrize("name", MAGNETS)
def test_magnets_carry_the_energy_of_their_name(name: str) -> None:
    """kJ/m3 / coercivity in 10 kA/m; (BH)max = Br²/(4 mu0 mu_rec) for a straight line that
    reaches half of Br.
    """
    magnet = materials.load(Magnet, name)
    match = re.fullmatch(r"RE(?:FeB|Co) (\d+)/(\d+)", name)
    assert match
    remanence = magnet.remanence.at(20.0)
    energy = remanence**2 / (4.0 * MU_0 * magnet.recoil_permeability.value)
    check.within(
        "energy product of magnets over that of their name",
        energy / (int(match[1]) * 1e3),
        1.0,
        1.06,
        why="a least value; with much more it would bear a higher name",
        source=NAME_OF_MAGNET,
    )
    check.within(
        "coercivity of magnets over that of their name",
        magnet.coercivity.at(20.0) / (int(match[2]) * 1e4),
        1.0,
        math.inf,
        why="a least value",
        source=NAME_OF_MAGNET,
    )
    assert magnet.knee_flux_density(20.0) < 0.5 * remanence


# Ranges of public tables: Br T, HcJ kA/m, alpha %/K, beta %/K, resistivity uohm m, density g/cm3.
RANGES = {
    "NdFeB": ((1.0, 1.45), (800, 3000), (-0.12, -0.08), (-0.75, -0.34), (1.2, 1.6), (7.4, 7.7)),
    "SmCo5": ((0.8, 1.1), (600, 2000), (-0.045, -0.04), (-0.3, -0.2), (0.5, 0.6), (8.2, 8.4)),
    "Sm2Co17": ((0.9, 1.15), (450, 2100), (-0.035, -0.03), (-0.3, -0.15), (0.8, 0.9), (8.3, 8.5)),
}


@pytest.mark.parametrize("name", MAGNETS)
def test_magnets_lie_in_the_range_of_their_class(name: str) -> None:
    magnet = materials.load(Magnet, name)
    (family,) = (key for key in RANGES if key in magnet.description)
    values = {
        "remanence": magnet.remanence.value,
        "coercivity": magnet.coercivity.value / 1e3,
        "change of remanence with temperature": magnet.remanence.per_K * 100.0,
        "change of coercivity with temperature": magnet.coercivity.per_K * 100.0,
        "resistivity": magnet.resistivity.value * 1e6,
        "density": magnet.density.value / 1e3,
    }
    for (what, value), (low, high) in zip(values.items(), RANGES[family], strict=True):
        check.within(
            f"{what} of magnets within the range of their class (0 to 1)",
            (value - low) / (high - low),
            0.0,
            1.0,
            why="what makers offer",
            source="ranges of public tables of makers (common practice)",
        )


def test_magnet_against_temperature() -> None:
    """Br 1.2 T, -0.11 %/K: 1.068 T at 120 °C; HcJ 1592 kA/m, -0.6 %/K: 636.8 kA/m."""
    remanence = Quantity(1.2, "T", "test", 2026, per_K=-0.0011)
    coercivity = Quantity(1592e3, "A/m", "test", 2026, per_K=-0.006)
    assert remanence.at(120.0) == pytest.approx(1.068, rel=1e-12)  # arithmetic
    assert coercivity.at(120.0) == pytest.approx(636.8e3, rel=1e-12)


def test_knee_rises_with_temperature_and_ends_the_recoil_line() -> None:
    magnet = materials.load(Magnet, "REFeB 300/160")
    hot = magnet.knee_flux_density(np.array([20.0, 100.0, 150.0]))
    assert np.all(np.diff(hot) > 0.0)
    line = magnet.remanence.at(150.0) + MU_0 * magnet.recoil_permeability.value * magnet.knee_field(
        150.0
    )
    assert hot[-1] == pytest.approx(line, rel=1e-12)


def test_copper_follows_iec_60028() -> None:
    copper = materials.load(Conductor, "Copper")
    check(
        "conductivity of copper at 20 °C and its change over 100 K",
        [copper.resistivity.at(20.0) * 58e6, copper.resistivity.at(120.0) * 58e6],
        [1.0, 1.393],
        relative=1e-9,
        why="exact by definition: 58 MS/m, 0.00393 1/K",
        source="IEC 60028",
    )
    assert copper.density.value == 8890.0
    check(
        "resistance of copper at 120 °C over that at 20 °C",
        copper.resistivity.at(120.0) * 58e6,
        355.0 / 255.0,
        relative=1e-3,
        why="the rule and the coefficient are two roundings of one law",
        source="rule of (235 + t) of IEC 60034-1",
    )


@pytest.mark.parametrize(("diameter", "ohm_per_m"), [
    (0.200e-3, 0.544119), (0.315e-3, 0.219348), (0.500e-3, 0.087059), (0.710e-3, 0.043176),
    (1.000e-3, 0.021765), (1.600e-3, 0.008502), (2.000e-3, 0.005441),
])  # fmt: skip
def test_wire_resistance(diameter: float, ohm_per_m: float) -> None:
    copper = materials.load(Conductor, "Copper")
    area = math.pi / 4.0 * diameter**2
    ours = copper.resistivity.at(20.0) / area
    check(
        "nominal resistance of enamelled wires",
        ours * 58.0 / 58.5,
        ohm_per_m,
        absolute=6e-7,
        unit="ohm/m",
        why="half a unit of the sixth decimal, beside the 58.5 to 58 MS/m of the two standards",
        source="IEC 60317-0-1 (from memory)",
    )


def test_strength_follows_its_table() -> None:
    sleeve = materials.load(SleeveMaterial, "TiAl6V4")
    table = sleeve.yield_strength
    middle = 0.5 * (table.table_C[0] + table.table_C[1])
    mean = 0.5 * (table.table_value[0] + table.table_value[1])
    assert table.at(middle) == pytest.approx(mean, rel=1e-12)  # linear between points
    np.testing.assert_array_equal(sleeve.covers([20.0, 300.0, 301.0]), [True, True, False])


def test_only_the_wound_fibre_is_anisotropic() -> None:
    for name in materials.available("sleeve"):
        sleeve = materials.load(SleeveMaterial, name)
        assert sleeve.isotropic == ("fibre" not in name)
        stiffness = sleeve.young_modulus_radial.at(20.0) / sleeve.young_modulus.at(20.0)
        assert (stiffness == 1.0) == sleeve.isotropic


def test_unknown_names_get_suggestions() -> None:
    with pytest.raises(ValueError, match="did you mean 'M270-35A'"):
        materials.load(ElectricalSteel, "m270-35")
    with pytest.raises(ValueError, match="there are 'Copper', 'Aluminium'"):
        materials.load("conductor", "xyz")
    with pytest.raises(ValueError, match="did you mean 'magnet'"):
        materials.available("magnets")


GOOD = """
["Wire"]
description = "test"
resistivity = { value = 2e-8, unit = "ohm m", source = "test", year = 2026 }
density = { value = 9000, unit = "kg/m3", source = "test", year = 2026 }
expansion = { value = 2e-5, unit = "1/K", source = "test", year = 2026 }
thermal_conductivity = { value = 300, unit = "W/(m K)", source = "test", year = 2026 }
specific_heat = { value = 400, unit = "J/(kg K)", source = "test", year = 2026 }
"""


def test_own_file_is_read(tmp_path: Path) -> None:
    path = tmp_path / "own.toml"
    path.write_text(GOOD)
    assert materials.read(Conductor, path)["Wire"].density.value == 9000


@pytest.mark.parametrize(("old", "new", "message"), [
    ('unit = "kg/m3"', 'unit = "g/cm3"', "density is in 'g/cm3'; it must be in 'kg/m3'"),
    ("value = 9000", "value = 9", "density = 9 kg/m3 is outside the range"),
    ("value = 9000", "value = 90000", "density = 90000 kg/m3 is outside the range"),
    ('source = "test", year', 'source = " ", year', "source is empty"),
    (', year = 2026', "", "'year' is missing"),
    ("expansion =", "expansoin =", "did you mean 'expansion'"),
    ("value = 9000", 'value = "heavy"', "wrong type"),
    ("value = 9000", "value = nan", "finite"),
    ('year = 2026', "year = 2026, per_Kelvin = 1", "unknown key 'per_Kelvin'"),
    ('["Wire"]', '["Wire"', "not valid TOML"),
    ('year = 2026', "year = 2026, table_C = [1], table_value = []", "must match"),
    ('year = 2026', "year = 2026, table_C = [2, 1], table_value = [1, 1]", "must increase"),
])  # fmt: skip
def test_bad_files_are_refused_with_place_and_reason(
    tmp_path: Path, old: str, new: str, message: str
) -> None:
    path = tmp_path / "own.toml"
    path.write_text(GOOD.replace(old, new))
    with pytest.raises(ValueError, match=re.escape(message)) as caught:
        materials.read(Conductor, path)
    assert "own.toml" in str(caught.value)


def test_missing_property_is_named(tmp_path: Path) -> None:
    path = tmp_path / "own.toml"
    path.write_text("\n".join(line for line in GOOD.splitlines() if "expansion" not in line))
    with pytest.raises(ValueError, match="'expansion' is missing"):
        materials.read(Conductor, path)
