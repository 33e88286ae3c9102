"""Commands that need no results: families, metrics, materials, new, check, help."""

from __future__ import annotations

import json
import re
import resource
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest
from click.testing import Result

from evaluators.machine.demagnetisation import Fault
from evaluators.machine.metrics import METRICS
from evaluators.machine.task.cooling import Cooling
from evaluators.machine.task.rotor_layout import RotorLayout
from evaluators.machine.task.task import Conditions, Construction, Duty, RippleWeights
from studies import cli, commands
from studies.shipped.library import shipped
from studies.study_file import convert
from studies.study_file.crosschecks import Limit
from studies.study_file.schema import (
    ConditionsSection,
    ConstructionSection,
    DutySection,
    RippleSection,
)
from studies.study_file.schema_machine import CoolingSection, FaultSection, RotorSection

Run = Callable[..., Result]


def test_families_as_json(hovergap: Run) -> None:
    result = hovergap("families", "--slots", "6,12", "--pole-pairs", "2-4", "--json")
    assert result.exit_code == 0
    rows = {row["family"]: row for row in json.loads(result.output)}
    # Q6p2s1 and Q12p4s5 with tooth coils have the factor sin(60 degrees) (closed form).
    assert {"Q6p2s1", "Q12p4s5"} <= rows.keys()
    assert rows["Q12p4s5"] == rows["Q12p4s5"] | {
        "slots": 12,
        "pole_pairs": 4,
        "suspension_pole_pairs": 5,
        "coil_pitch": 1,
    }
    for name in ("Q6p2s1", "Q12p4s5"):
        # Rounding of a sum of at most a dozen unit phasors.
        assert rows[name]["torque_winding_factor"] == pytest.approx(0.75**0.5, abs=1e-12)
        assert rows[name]["residual_voltage"] == pytest.approx(0.0, abs=1e-9)


def test_families_table_with_frequency_and_refusals(hovergap: Run) -> None:
    arguments = ("families", "--slots", "9,12", "--pole-pairs", "4", "--speed", "15000")
    result = hovergap(*arguments, "--refused")
    assert result.exit_code == 0
    assert re.search(r"^Q12p4s5 .* 1000$", result.output, re.MULTILINE)  # 4 x 250 turns a second
    assert "Q9p4s5 cannot be wound" in result.output


@pytest.mark.parametrize("value", ["a", "12-6", "2", "1e3", "", "6,,9", "400", "99999999999999"])
def test_families_refuses_bad_numbers(value: str, hovergap: Run) -> None:
    result = hovergap("families", "--slots", value)
    assert result.exit_code == 2
    assert "--slots" in result.output


def test_metrics_and_materials(hovergap: Run) -> None:
    text = hovergap("metrics").output
    assert all(metric.name in text and metric.definition in text for metric in METRICS)
    heads = [line for line in text.splitlines() if line and not line.startswith(" ")]
    assert sorted(heads) == sorted({metric.group for metric in METRICS})  # each group once
    listed = json.loads(hovergap("metrics", "--json").output)
    assert [item["name"] for item in listed] == [metric.name for metric in METRICS]
    assert "rotor_radius_mm" in hovergap("metrics", "--variables").output
    names = {item["name"] for item in json.loads(hovergap("materials", "--json").output)}
    assert {"Copper", "TiAl6V4", "42CrMo4"} <= names


def test_new_in_a_folder_that_is_not_there(hovergap: Run) -> None:
    result = hovergap("new", "none/drive.toml")
    assert result.exit_code == 2
    assert "there is no folder none" in result.output


@pytest.mark.parametrize(
    ("power", "speed", "link"),
    [("11", "48000", "560"), ("0.05", "120000", "48"), ("250", "6000", "750"), ("2", "500", "400")],
)
def test_new_writes_a_study_that_checks(power: str, speed: str, link: str, hovergap: Run) -> None:
    options = ("--power", power, "--speed", speed, "--dc-link", link)
    result = hovergap("new", "fan.toml", *options)
    assert result.exit_code == 0, result.output
    text = Path("fan.toml").read_text()
    assert "First-order sizing" in text
    assert hovergap("check", "fan.toml").exit_code == 0
    again = hovergap("new", "fan.toml")
    assert again.exit_code == 2
    assert "left alone" in again.output
    assert Path("fan.toml").read_text() == text


@pytest.mark.parametrize(
    ("option", "value", "said"),
    [
        ("--power", "30kW", "give it in kW without writing the unit, so 30"),
        ("--speed", "9000rpm", "give it in r/min without writing the unit"),
        ("--power", "nan", "'nan' is no number"),
        ("--dc-link", "1", "1 V is out of range; give 5 to 10000"),
    ],
)
def test_new_says_how_to_write_a_quantity(
    option: str, value: str, said: str, hovergap: Run
) -> None:
    result = hovergap("new", "fan.toml", option, value)
    assert result.exit_code == 2
    assert said in result.output
    assert not Path("fan.toml").exists()


@pytest.mark.parametrize("name", ["fan", "fan.txt", ".toml", "a b.toml", "none/fan.toml"])
def test_new_refuses_unusable_names(name: str, hovergap: Run) -> None:
    result = hovergap("new", name)
    assert result.exit_code in (1, 2)
    assert len(result.output.strip().splitlines()) == 1
    assert not Path(name).exists()


@pytest.mark.parametrize(
    ("speed", "pole_pairs"), [("20000", {1, 2, 4, 5}), ("48000", {1, 2}), ("90000", {1})]
)
def test_new_study_tries_every_number_of_pole_pairs(
    speed: str, pole_pairs: set[int], hovergap: Run, tmp_path: Path
) -> None:
    """All that a three-phase winding can have below 1700 Hz at this speed, by f = p n / 60."""
    file = tmp_path / "drive.toml"
    assert hovergap("new", file, "--speed", speed).exit_code == 0
    ids = re.findall(r'"Q\d+p(\d+)s\d+"', file.read_text())
    assert {int(pairs) for pairs in ids} == pole_pairs
    # Overspeed is 1.2 of the speed unless told: the rotor passes no bending speed on its way.
    limit = f"free_bending_speed_rpm = {{ at_least = {1.2 * float(speed):.0f} }}"
    assert limit in file.read_text()


def test_sizing_follows_its_stated_rules() -> None:
    from studies.new_study.sizing import LENGTH_RATIO, TIP_SPEED, TORQUE_PER_VOLUME, size

    slow = size(5000.0, 300.0, 1.2)
    volume = 3.141592653589793 * slow.rotor_radius**2 * slow.stack_length
    # Torque, volume and slenderness are exact relations, so only rounding is allowed.
    assert slow.torque == pytest.approx(5000.0 / 300.0, rel=1e-12)
    assert volume == pytest.approx(slow.torque / TORQUE_PER_VOLUME, rel=1e-12)
    assert slow.stack_length == pytest.approx(LENGTH_RATIO * 2.0 * slow.rotor_radius, rel=1e-12)
    fast = size(100e3, 6000.0, 1.2)
    assert fast.limited_by_tip_speed
    assert fast.tip_speed == pytest.approx(TIP_SPEED, rel=1e-12)
    volume = 3.141592653589793 * fast.rotor_radius**2 * fast.stack_length
    assert volume == pytest.approx(fast.torque / TORQUE_PER_VOLUME, rel=1e-12)


def test_check_says_what_would_be_searched(hovergap: Run, write_study: Callable[..., Path]) -> None:
    result = hovergap("check", write_study())
    assert result.exit_code == 0
    for words in ("Q12p4s5", "2000 ", "minimise cost", "tip_speed_m_s at most 70 m/s", "in order"):
        assert words in result.output


def test_check_reports_what_the_evaluator_cannot_do(
    hovergap: Run, write_study: Callable[..., Path]
) -> None:
    lacking = 'name = "toy"\n[evaluator.settings]\nmetrics = ["cost", "ripple_index"]'
    result = hovergap("check", write_study(('name = "toy"', lacking)))
    assert result.exit_code == 2
    assert "does not return loss_total_W, tip_speed_m_s" in result.output
    wrong = 'name = "toy"\n[evaluator.settings]\ndelay = 1'
    result = hovergap("check", write_study(('name = "toy"', wrong)))
    assert result.exit_code == 2
    assert "there is no setting 'delay'" in result.output


@pytest.mark.parametrize("name", sorted(shipped()))
def test_shipped_studies_check(name: str, hovergap: Run) -> None:
    result = hovergap("check", name)
    assert result.exit_code == 0, result.output
    families = [line for line in result.output.splitlines() if re.match(r"Q\d+p\d+s\d+ ", line)]
    assert len(families) >= 6


def test_a_study_that_is_neither_file_nor_shipped(hovergap: Run) -> None:
    result = hovergap("check", "compresor")
    assert result.exit_code == 2
    assert "did you mean 'compressor'?" in result.output


def test_ranges_of_the_file_are_accepted_by_the_machine() -> None:
    """What a key accepts at its ends, the machine's own checks accept too."""
    builders = {
        DutySection: convert.duty,
        ConditionsSection: convert.conditions,
        ConstructionSection: convert.construction,
        RippleSection: convert.ripple,
        CoolingSection: convert.cooling,
        RotorSection: convert.rotor,
        FaultSection: convert.fault,
    }
    base = {"power_kW": 1.0, "speed_rpm": 1000.0, "dc_link_V": 500.0}
    for section, build in builders.items():
        given = base if section is DutySection else {}
        for key, field in section.model_fields.items():
            for item in field.metadata:
                for end in ("ge", "le"):
                    if hasattr(item, end):
                        trial = {**given, key: getattr(item, end)}
                        if key == "highest_speed_ratio":
                            trial["overspeed_ratio"] = trial[key]
                        build(section.model_validate(trial))  # type: ignore[operator]


def test_defaults_of_the_file_are_those_of_the_machine() -> None:
    """A key left out means what the machine's own default means, whatever its unit.

    Two conversions there and back: rounding only.
    """
    base = {"power_kW": 1.0, "speed_rpm": 60.0, "dc_link_V": 560.0}
    pairs = [
        (convert.duty(DutySection(**base)), Duty(1000.0, 2.0 * 3.141592653589793)),
        (convert.conditions(ConditionsSection()), Conditions()),
        (convert.construction(ConstructionSection()), Construction()),
        (convert.ripple(RippleSection()), RippleWeights()),
        (convert.cooling(CoolingSection()), Cooling()),
        (convert.rotor(RotorSection()), RotorLayout()),
        (convert.fault(FaultSection()), Fault()),
    ]
    for found, wanted in pairs:
        for name, value in vars(wanted).items():
            expected = pytest.approx(value, rel=1e-12) if isinstance(value, float) else value
            assert getattr(found, name) == expected, (type(wanted).__name__, name)


def test_units_of_cooling_and_rotor() -> None:
    cooling = convert.cooling(CoolingSection(coolant_flow_L_min=6.0, gap_flow_L_s=2.0))
    # 6 L/min is 0.1 L/s, 1e-4 m3/s; exact but for rounding.
    assert cooling.coolant_flow == pytest.approx(1e-4, rel=1e-12)
    assert cooling.gap_flow == pytest.approx(2e-3, rel=1e-12)
    rotor = convert.rotor(
        RotorSection(
            suspension_stiffness_N_mm=500.0,
            overhung_transverse_inertia_kg_cm2=3.0,
            drive_end_length_mm=40.0,
        )
    )
    assert rotor.suspension_stiffness == pytest.approx(5e5, rel=1e-12)
    assert rotor.overhung_transverse_inertia == pytest.approx(3e-4, rel=1e-12)
    assert rotor.drive_end_length == pytest.approx(0.04, rel=1e-12)


def test_limit_scale_and_words() -> None:
    assert Limit("torque_ripple", "at_most", 0.0).scale == 1.0
    assert Limit("contact_pressure_MPa", "at_least", -2.0).scale == 2.0
    assert Limit("mass_kg", "at_most", 3.0).text() == "mass_kg at most 3 kg"


def test_help_is_quick_and_lists_all_commands(process: Callable[..., object]) -> None:
    heavy = "{'numpy', 'pydantic', 'pyarrow'}"
    code = f"import sys, studies.cli; sys.exit(bool({heavy} & set(sys.modules)))"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
    times = []
    for _ in range(3):
        before = resource.getrusage(resource.RUSAGE_CHILDREN)
        result = process("--help")
        after = resource.getrusage(resource.RUSAGE_CHILDREN)
        times.append(after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime)
    assert result.returncode == 0  # type: ignore[attr-defined]
    for name in ("new", "check", "sweep", "resume", "status", "compare", "inspect", "families"):
        assert f"  {name} " in result.stdout  # type: ignore[attr-defined]
    # Processor time, which hardly depends on what else runs: 0.08 s measured on slow cores. A
    # user begins to wait at about 0.3 s.
    assert min(times) < 0.3


def test_every_file_of_commands_is_a_command() -> None:
    files = {file.stem for file in Path(commands.__file__).parent.glob("*.py")}
    assert set(cli.main.commands) == files - {"__init__", "options"}


def test_version(hovergap: Run) -> None:
    result = hovergap("--version")
    assert result.exit_code == 0
    assert re.fullmatch(r"hovergap (\d+\.\d+\.\d+\S*|unknown)\n", result.output)


def test_reader_of_a_pipe_may_leave(process: Callable[..., object]) -> None:
    """As in `hovergap metrics | head -1`; the text is longer than a pipe holds."""
    lines = "import sys, studies.cli\nsys.argv = ['hovergap', 'metrics', '--json']\n"
    code = f"{lines}for _ in range(20):\n    studies.cli.main(standalone_mode=False)"
    child = subprocess.Popen(
        [sys.executable, "-c", code], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
    )
    assert child.stdout is not None
    child.stdout.readline()
    child.stdout.close()
    assert child.stderr is not None
    errors = child.stderr.read()
    child.wait(timeout=60)
    assert "Traceback" not in errors


def test_unknown_commands_and_options(hovergap: Run) -> None:
    for arguments in (("swep",), ("sweep",), ("sweep", "x.toml", "--bugdet", "1"), ("compare",)):
        result = hovergap(*arguments)
        assert result.exit_code == 2
        assert "Traceback" not in result.output
