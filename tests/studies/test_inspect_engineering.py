"""What ``hovergap inspect`` says of strength, levitation, winding, magnets, bending and cost."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from click.testing import Result

from evaluators.machine.metrics import METRIC
from optimizer.archive.archive import open_archive
from studies.tables import WIDEST

Run = Callable[..., Result]
Write = Callable[..., Path]


@pytest.fixture
def swept(hovergap: Run, write_study: Write) -> Path:
    """A few designs by the analytic evaluator, whose numbers follow from each other."""
    study = write_study(
        ('name = "toy"', 'name = "analytic"'),
        ("evaluations_per_family = 200", "evaluations_per_family = 20"),
        ("speed_rpm = 30000", "speed_rpm = 30000\noverspeed_ratio = 1.25"),
        ("magnet = 80", "magnet = { per_kg = 80, low_per_kg = 50, high_per_kg = 140 }"),
    )
    result = hovergap("sweep", study, "--workers", "1")
    assert result.exit_code in (0, 3), result.output  # 3: no feasible design among so few
    return Path("results/small")


def first_good(folder: Path) -> tuple[str, dict[str, float]]:
    table = open_archive(folder / "Q12p4s5").table()
    row = next(row for row in table.to_pylist() if row["status"] == "ok")
    return f"Q12p4s5-{row['evaluation']}", row


def test_strength_states_hold_the_stored_extremes(hovergap: Run, swept: Path) -> None:
    design, row = first_good(swept)
    found = json.loads(hovergap("inspect", swept, design, "--json").output)["engineering"]
    states = found["strength_states"]
    assert [round(state["speed_rpm"]) for state in states] == [
        0, 0, 30000, 30000, 37500, 37500
    ]  # fmt: skip
    assert [state["temperature_C"] for state in states[::2]] == [20.0] * 3
    hot = [state["temperature_C"] for state in states[1::2]]
    np.testing.assert_allclose(hot, row["sleeve_temperature_C"], rtol=1e-9)
    # The metrics are the worst of rest and overspeed; unit changes cost a few roundings.
    ends = states[:2] + states[4:]
    worst = max(state["sleeve_ratio"] for state in ends)
    assert worst == pytest.approx(row["sleeve_stress_ratio"], rel=1e-9)
    least = min(state["core_pressure_MPa"] for state in states[4:])
    assert least == pytest.approx(row["contact_pressure_MPa"], rel=1e-9)
    assert least == pytest.approx(2.0, rel=1e-6)  # what the interference was chosen for
    assert f"from {row['sleeve_interference_um']:.0f} um" in found["interference"]


def test_levitation_budget_is_the_stored_one(hovergap: Run, swept: Path) -> None:
    design, row = first_good(swept)
    found = json.loads(hovergap("inspect", swept, design, "--json").output)["engineering"]
    budget = found["levitation_budget"]
    assert budget[0]["demand_N"] == row["rotor_weight_N"]  # the shaft is horizontal
    process = next(line for line in budget if line["demand"] == "process force")
    assert process["ratio"] is None  # nothing is demanded
    together = [line for line in budget if line["demand"] == "all of these at once"]
    assert [line["ratio"] for line in together] == pytest.approx(
        [row["suspension_ratio"], row["rated_suspension_ratio"]], rel=1e-12
    )
    # ISO 14839-2: 0.3, 0.4 and 0.5 of the touchdown clearance, half of 0.4 mm here.
    zones = found["displacement_zones_um"]
    assert list(zones.values()) == pytest.approx([60.0, 80.0, 100.0], rel=1e-9)


def test_text_tells_every_limit_in_plain_words(hovergap: Run, swept: Path) -> None:
    design, row = first_good(swept)
    output = hovergap("inspect", swept, design).output
    flat = " ".join(output.split())
    for words in (
        f"{row['turns_per_coil']:.0f} turns a coil of {row['strands_per_turn']:.0f} strands",
        "replace no rotor-dynamic analysis",
        "no proof that a controller levitates it",
        "before any safety factor",
        "overspeed test under containment",
        "short circuit of three phases",
        "class F ends at 155 degC (IEC 60085)",
        "Active materials, EUR",
    ):
        assert words in flat, words
    assert row["cost_low"] < row["cost"] < row["cost_high"]
    for name in ("loss_copper_W", "magnet_temperature_C", "cost_high"):
        line = next(line for line in output.splitlines() if f" {name} " in line)
        assert METRIC[name].source.startswith(line.rpartition("  ")[2])
    assert max(map(len, output.splitlines())) <= WIDEST


def test_iron_loss_is_shown_by_place_and_by_mechanism(hovergap: Run, swept: Path) -> None:
    design, row = first_good(swept)
    lines = hovergap("inspect", swept, design).output.splitlines()
    found = {
        words[0]: float(words[1])
        for words in map(str.split, lines)
        if len(words) == 4 and words[0].startswith("loss_")  # name, W, share, %
    }
    places = found["loss_teeth_W"] + found["loss_yoke_W"]
    mechanisms = sum(found[f"loss_iron_{name}_W"] for name in ("hysteresis", "eddy", "excess"))
    # Four digits are printed.
    assert places == pytest.approx(row["loss_iron_W"], rel=1e-3)
    assert mechanisms == pytest.approx(row["loss_iron_W"], rel=1e-3)
    under = [line for line in lines if line.startswith("  loss_")]
    assert len(under) == 5


def test_metrics_that_are_not_stored_leave_their_topic_out(
    hovergap: Run, write_study: Write
) -> None:
    names = '["loss_total_W", "cost", "ripple_index", "tip_speed_m_s", "winding_temperature_C"]'
    study = write_study(('name = "toy"', f'name = "toy"\nsettings = {{ metrics = {names} }}'))
    assert hovergap("sweep", study, "--workers", "1", "--budget", "40").exit_code == 0
    text = hovergap("inspect", "results/small", "Q12p4s5-3")
    assert text.exit_code == 0, text.output
    assert "Levitation budget" not in text.output
    assert "tip_speed_m_s" in text.output
    found = hovergap("inspect", "results/small", "Q12p4s5-3", "--json")
    assert "levitation_budget" not in json.loads(found.output)["engineering"]
