"""The study file: what is accepted, and how every mistake is reported."""

from __future__ import annotations

from collections.abc import Callable
from math import pi
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from studies.errors import StudiesError, StudyFileError
from studies.study_file.definition import load_study, study_from

Write = Callable[..., Path]


def mistakes(file: Path) -> list[str]:
    with pytest.raises(StudiesError) as caught:
        load_study(file)
    lines = str(caught.value).splitlines()
    assert lines
    assert all(str(file) in line for line in lines)
    return lines


def line_of(file: Path, start: str) -> int:
    lines = file.read_text().splitlines()
    return next(number for number, line in enumerate(lines, 1) if line.startswith(start))


def test_units_reach_the_machine_in_si(write_study: Write) -> None:
    study = load_study(write_study())
    assert study.duty.power == 2000.0
    # 30000 r/min is 500 turns a second, 1000 pi rad/s: exact but for rounding.
    assert study.duty.speed == pytest.approx(1000.0 * pi, rel=1e-15)
    assert study.duty.balance_grade == pytest.approx(2.5e-3, rel=1e-15)
    assert study.conditions.gas_pressure == pytest.approx(101_325.0, rel=1e-15)
    assert study.construction.strand_diameter == pytest.approx(0.4e-3, rel=1e-15)
    assert study.prices.electrical_steel.waste_share == 0.4
    assert study.prices.magnet.per_kg == 80.0
    assert study.materials.shaft.name == "C45"
    assert study.families == ("Q6p2s1", "Q12p4s5")
    assert study.bounds["Q6p2s1"]["rotor_radius_mm"] == (12.0, 24.0)
    assert study.bounds["Q6p2s1"]["clearance_mm"] == (0.4, 0.4)
    assert [goal.name for goal in study.objectives] == ["loss_total_W", "cost", "ripple_index"]


def test_prices_of_cheap_and_dear_markets(write_study: Write) -> None:
    ranged = "magnet = { per_kg = 80, low_per_kg = 60.0, high_per_kg = 150.0 }"
    prices = load_study(write_study(("magnet = 80", ranged))).prices
    assert (prices.magnet.low_per_kg, prices.magnet.high_per_kg) == (60.0, 150.0)
    falling = "magnet = { per_kg = 80, low_per_kg = 90.0 }"
    assert "must not fall" in mistakes(write_study(("magnet = 80", falling)))[0]


def test_limits_of_metrics_that_may_be_negative(write_study: Write) -> None:
    signed = ("separation_margin", "insulation_margin_K", "hot_spot_temperature_C",
              "magnet_flux_density_T", "contact_pressure_MPa")  # fmt: skip
    text = "\n".join(f"{name} = {{ at_most = -1.0 }}" for name in signed)
    study = load_study(write_study(("tip_speed_m_s = { at_most = 70.0 }", text)))
    assert [limit.metric for limit in study.limits] == list(signed)


def test_families_by_rule_with_own_bounds_and_pitch(write_study: Write) -> None:
    rule = "slots = [9, 12]\npole_pairs = [2, 3, 4]\n[families.variables.Q12p4s5]\n"
    rule += "rotor_radius_mm = [15, 20]"
    study = load_study(write_study(('list = ["Q6p2s1", "Q12p4s5"]', rule)))
    assert study.families == ("Q12p2s1", "Q12p4s5")
    assert study.bounds["Q12p4s5"]["rotor_radius_mm"] == (15.0, 20.0)
    assert study.bounds["Q12p2s1"]["rotor_radius_mm"] == (12.0, 24.0)
    assert len(study.refused) == 2 * 2 * 3 - 2
    pitched = 'list = [{ id = "Q12p2s1", coil_pitch = 3 }]'
    study = load_study(write_study(('list = ["Q6p2s1", "Q12p4s5"]', pitched)))
    assert study.windings[0].family.coil_pitch == 3


def test_weighted_sum_and_sense(write_study: Write) -> None:
    text = 'name = "price"\nweighted_sum = { cost = 1.0, loss_total_W = 0.5 }\nsense = "maximise"'
    study = load_study(write_study(('metric = "cost"\nsense = "minimise"', text)))
    goal = study.objectives[1]
    assert goal.name == "price"
    assert goal.terms == (("cost", 1.0), ("loss_total_W", 0.5))
    assert goal.sign == -1.0


# Each case: what is replaced by what, the start of the line blamed, and words that must appear.
CASES = {
    "unknown key": (
        "speed_rpm = 30000",
        "speed_rmp = 30000",
        "speed_rmp",
        ["there is no key 'speed_rmp'", "did you mean 'speed_rpm'?"],
    ),
    "wrong unit": (
        "power_kW = 2.0",
        "power_W = 2000.0",
        "power_W",
        ["'power_kW'", "the unit is part of the name"],
    ),
    "wrong unit of a variable": (
        "rotor_radius_mm =",
        "rotor_radius_m =",
        "rotor_radius_m ",
        ["no design variable 'rotor_radius_m'", "'rotor_radius_mm'"],
    ),
    "value in another unit": (
        "rotor_radius_mm = [12.0, 24.0]",
        "rotor_radius_mm = [0.012, 0.024]",
        "rotor_radius_mm",
        ["got [0.012, 0.024]", "between 2 and 1000 mm"],
    ),
    "bounds reversed": (
        "rotor_radius_mm = [12.0, 24.0]",
        "rotor_radius_mm = [24.0, 12.0]",
        "rotor_radius_mm",
        ["reversed", "write [12, 24]"],
    ),
    "three bounds": (
        "rotor_radius_mm = [12.0, 24.0]",
        "rotor_radius_mm = [1, 2, 3]",
        "rotor_radius_mm",
        ["must be [low, high] or one number"],
    ),
    "truth as a bound": (
        "clearance_mm = 0.4",
        "clearance_mm = true",
        "clearance_mm",
        ["must be [low, high] or one number", "got True"],
    ),
    "text for a number": (
        "speed_rpm = 30000",
        'speed_rpm = "fast"',
        "speed_rpm",
        ["must be a number", "got 'fast'", "from 10.0 to 900,000.0 r/min"],
    ),
    "out of range": (
        "dc_link_V = 320.0",
        "dc_link_V = -320.0",
        "dc_link_V",
        ["too small", "got -320.0", "5.0 to 10,000.0 V"],
    ),
    "half a whole number": ("seed = 3", "seed = 3.5", "seed", ["a whole number", "got 3.5"]),
    "unknown section": (
        "[search]",
        "[serach]",
        "[serach]",
        ["no section 'serach'", "did you mean 'search'?"],
    ),
    "missing variable": (
        "yoke_ratio = 1.0\n",
        "",
        "[variables]",
        ["variables.yoke_ratio: is missing"],
    ),
    "missing key": ('shaft = "C45"\n', "", "[materials]", ["materials.shaft: is missing"]),
    "missing price": ("copper = 12.0\n", "", "[prices]", ["prices.copper: is missing"]),
    "negative price": ("copper = 12.0", "copper = -1", "copper", ["too small", "got -1"]),
    "unknown material": (
        '"NO20-1200"\nrotor',
        '"NO20-120"\nrotor',
        "stator_steel",
        ["no electrical steel 'NO20-120'", "did you mean 'NO20-1200'?"],
    ),
    "unknown metric": (
        'metric = "cost"',
        'metric = "costs"',
        'metric = "costs"',
        ["no metric 'costs'", "did you mean 'cost'?"],
    ),
    "unknown limit": (
        "tip_speed_m_s =",
        "tip_speed_mm_s =",
        "tip_speed_mm_s",
        ["no metric 'tip_speed_mm_s'", "'tip_speed_m_s'"],
    ),
    "contradictory limits": (
        "{ at_most = 70.0 }",
        "{ at_most = 70.0, at_least = 80.0 }",
        "tip_speed_m_s",
        ["at_least 80", "at_most 70", "no design meets"],
    ),
    "impossible limit": (
        "tip_speed_m_s = { at_most = 70.0 }",
        "efficiency = { at_least = 1.2 }",
        "efficiency",
        ["got 1.2", "between 0 and 1"],
    ),
    "negative limit": (
        "{ at_most = 70.0 }",
        "{ at_most = -1.0 }",
        "tip_speed_m_s",
        ["got -1", "not below 0"],
    ),
    "limit without side": ("{ at_most = 70.0 }", "70.0", "tip_speed_m_s", ["at_most = ..."]),
    "empty limit": ("{ at_most = 70.0 }", "{}", "tip_speed_m_s", ["limits nothing"]),
    "family that cannot be wound": (
        '"Q6p2s1"',
        '"Q9p4s5"',
        "list",
        ["Q9p4s5 cannot be wound", "two equal groups"],
    ),
    "suspension poles": ('"Q6p2s1"', '"Q6p2s4"', "list", ["must differ from", "by exactly 1"]),
    "no family name": ('"Q6p2s1"', '"6/4"', "list", ["'6/4' is no family", "Q12p4s5"]),
    "family twice": ('"Q6p2s1"', '"Q12p4s5"', "list", ["listed twice"]),
    "family as number": ('"Q6p2s1"', "7", "list", ["is no family"]),
    "list and rule": ("list =", "slots = [12]\nlist =", "[families]", ["both a list and a rule"]),
    "name with separator": (
        'name = "small"',
        'name = "../small"',
        "name",
        ["path separator", "'../small'"],
    ),
    "name with backslash": ('name = "small"', "name = 'a\\b'", "name", ["path separator"]),
    "name with control": ('name = "small"', 'name = "a\\u0007b"', "name", ["cannot name a folder"]),
    "hidden name": ('name = "small"', 'name = ".small"', "name", ["cannot name a folder"]),
    "empty name": ('name = "small"', 'name = ""', "name", ["cannot name a folder"]),
    "endless name": ('name = "small"', f'name = "{"a" * 3000}"', "name", ["3,000 characters"]),
    "NaN": ("dc_link_V = 320.0", "dc_link_V = nan", "dc_link_V", ["nan is no quantity"]),
    "infinity": ("clearance_mm = 0.4", "clearance_mm = inf", "clearance_mm", ["inf"]),
    "huge integer": ("seed = 3", f"seed = {10**30}", "seed", ["too large"]),
    "date": ("seed = 3", "seed = 2026-01-02", "seed", ["date or time"]),
    "syntax": ("seed = 3", "seed = ", "seed", ["not TOML"]),
    "key twice": ("seed = 3", "seed = 3\nseed = 4", "seed = 4", ["not TOML"]),
    "metric and sum": (
        'metric = "cost"',
        'metric = "cost"\nweighted_sum = { cost = 1.0 }',
        "[[objectives]]",
        ["either metric or weighted_sum"],
    ),
    "sense": (
        'sense = "minimise"',
        'sense = "minimize"',
        'sense = "minimize"',
        ["did you mean 'minimise'?"],
    ),
    "sense and metric": (
        'metric = "cost"\nsense = "minimise"',
        'metric = "price"\nsense = "minimize"',
        'metric = "price"',
        ["there is no metric 'price'"],
    ),
    "objective twice": (
        'metric = "cost"',
        'metric = "loss_total_W"',
        "[[objectives]]",
        ["two objectives are called 'loss_total_W'"],
    ),
    "unknown evaluator": (
        'name = "toy"',
        'name = "toi"',
        'name = "toi"',
        ["no evaluator 'toi'", "did you mean 'toy'?"],
    ),
    "section as number": (
        "[search]\nevaluations_per_family = 200\nseed = 3",
        "[search.seed]\nx=1",
        "[search.seed]",
        ["must be a whole number"],
    ),
}


@pytest.mark.parametrize("case", CASES)
def test_mistake_is_placed_and_explained(case: str, write_study: Write) -> None:
    old, new, start, words = CASES[case]
    file = write_study((old, new))
    lines = mistakes(file)
    blamed = line_of(file, start)
    if case in ("objective twice",):
        blamed = [n for n, t in enumerate(file.read_text().splitlines(), 1) if t == start][1]
    if case == "metric and sum":
        blamed = [n for n, t in enumerate(file.read_text().splitlines(), 1) if t == start][1]
    if case == "syntax":
        assert lines[0].startswith(f"{file}:{blamed}: ")
    found = [line for line in lines if line.startswith(f"{file}:{blamed}:")]
    if case == "key twice":  # the reader notices only at the end of the line or just after
        found = lines
    assert found, lines
    for word in words:
        assert any(word in line for line in found), (word, lines)


def test_all_mistakes_come_at_once_in_the_order_of_the_file(write_study: Write) -> None:
    file = write_study(
        ("power_kW = 2.0", "power_kW = 'much'"),
        ('"Copper"', '"Coper"'),
        ("clearance_mm = 0.4", "clearance_mm = 400"),
        ('"Q6p2s1"', '"Q6p3s2"'),
        ("tip_speed_m_s", "tipspeed_m_s"),
        ("seed = 3", "sed = 3"),
    )
    lines = mistakes(file)
    numbers = [int(line.removeprefix(f"{file}:").split(":")[0]) for line in lines]
    assert len(lines) == 6
    assert numbers == sorted(numbers)


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"", "empty"),
        (b"# only a comment\n", "empty"),
        (b"\xff\xfe[\x00s\x00", "not UTF-8"),
        (b'[study]\nname = "\xe9"\n', ":2: byte"),
        (b"a = " + b"[" * 100_000, "nested too deeply"),
        (b".".join([b"a"] * 5000) + b" = 1", "nested too deeply"),
        (b"a = " + b"9" * 5000, "digits"),
        (b"x" * 300_000, "bytes"),
        (b"a = 'x\x00'", "not TOML"),
        (b"[study]\r\nname = 5\r\n", ":2: study.name: must be text"),
    ],
)
def test_hostile_content(content: bytes, words: str, tmp_path: Path) -> None:
    file = tmp_path / "hostile.toml"
    file.write_bytes(content)
    assert any(words in line for line in mistakes(file))


def test_files_that_are_none(tmp_path: Path) -> None:
    assert "is a folder" in mistakes(tmp_path)[0]
    assert "there is no such file" in mistakes(tmp_path / "none.toml")[0]
    with pytest.raises(StudiesError, match="is not a plain file"):
        load_study(Path("/dev/zero"))


def test_windows_text_is_read(study_text: str) -> None:
    text = b"\xef\xbb\xbf" + study_text.replace("\n", "\r\n").encode()
    assert study_from(text, "windows.toml").name == "small"


@settings(max_examples=150, deadline=None)
@given(st.data())
def test_damaged_text_never_ends_in_anything_but_a_study_error(
    study_text: str, data: st.DataObject
) -> None:
    """Cut, repeat and replace pieces of a good file: either a study or a clear error."""
    text = study_text
    for _ in range(data.draw(st.integers(1, 3))):
        start = data.draw(st.integers(0, len(text) - 1))
        end = data.draw(st.integers(start, min(len(text), start + 40)))
        piece = data.draw(
            st.sampled_from(
                [*'[]{}="0\n', "", "-1", "nan", "true", "[[x]]\n", "a.b = 1\n", text[start:end] * 2]
            )
        )
        text = text[:start] + piece + text[end:] or "x"
    message = "damaged.toml"
    try:
        study_from(text.encode(), "damaged.toml")
    except StudyFileError as error:
        message = str(error)
    assert all(line.startswith("damaged.toml") for line in message.splitlines())


def test_what_only_the_whole_task_shows_is_placed_too(
    write_study: Write, monkeypatch: pytest.MonkeyPatch
) -> None:
    def refuse(**parts: object) -> None:
        msg = "materials: this magnet does not go with this shaft"
        raise ValueError(msg)

    monkeypatch.setattr("studies.study_file.definition.Task", refuse)
    file = write_study()
    expected = f"{file}:{line_of(file, '[materials]')}: materials: this magnet does not go"
    assert mistakes(file)[0].startswith(expected)
