"""Scatter, yield and contributors against closed forms."""

from __future__ import annotations

import csv
import json
from collections.abc import Callable
from math import erf, sqrt
from pathlib import Path

import numpy as np
import pytest
from click.testing import Result
from hypothesis import given, settings
from hypothesis import strategies as st
from machines import PLAIN
from outside import OutsideChecks

from evaluators.machine.geometry.cross_sections import cross_sections
from evaluators.machine.task.task import Construction
from evaluators.machine.winding.families import design_winding
from studies.stored.families import stored_family
from studies.tables import WIDEST
from studies.tolerance.build import nominal_dimensions, scattered_variables
from studies.tolerance.scatter import DIMENSIONS, Scatter, draw, overridden
from studies.tolerance.statistics import contributions, yield_of

Run = Callable[..., Result]
Write = Callable[..., Path]

check = OutsideChecks("studies")


def normal(x: float) -> float:
    """Standard normal distribution function."""
    return 0.5 * (1.0 + erf(x / sqrt(2.0)))


def sources(*sigmas: float, by_machine: bool = True) -> tuple[Scatter, ...]:
    """Scatters of given standard deviation; a tolerance is three of them."""
    return tuple(
        Scatter(f"source{k}_mm", 3.0 * sigma, by_machine, "test") for k, sigma in enumerate(sigmas)
    )


def test_yield_and_contributors_of_a_linear_metric_are_the_closed_form() -> None:
    sigmas, slopes = np.array([0.1, 0.4, 0.2]), np.array([3.0, -1.0, 0.5])
    drawn = draw(sources(*sigmas), 20_000, 20, seed=4)
    assert drawn.sigma == pytest.approx(sigmas)
    values = 7.0 + drawn.deviations @ slopes
    whole = float(np.sqrt(np.sum((slopes * sigmas) ** 2)))
    limit = 7.4
    found = yield_of(values <= limit, drawn.lot)
    exact = normal((limit - 7.0) / whole)
    source = "normal distribution of a sum, closed form"
    check(
        "yield of a linear metric",
        found.share,
        exact,
        absolute=5.0 * sqrt(exact * (1.0 - exact) / 20_000),
        why="five standard errors of 20,000 independent machines; a Latin hypercube is better",
        source=source,
    )
    assert found.low <= exact <= found.high
    parts = contributions(drawn.deviations, drawn.sigma, values)
    check(
        "shares of the sources in the variance of a linear metric",
        parts.shares,
        (slopes * sigmas) ** 2 / whole**2,
        absolute=0.02,
        why="sample variances and correlations of 20,000 draws are right to about 1 %",
        source=source,
    )
    assert parts.slopes == pytest.approx(slopes, rel=1e-9)  # noise-free, so exact
    assert parts.explained == pytest.approx(1.0, abs=1e-12)
    assert parts.deviation == pytest.approx(whole, rel=0.02)


def test_uniform_scatter_has_the_closed_form_too() -> None:
    drawn = draw(sources(1.0 / 3.0), 5000, 5, seed=1, distribution="uniform")
    values = drawn.deviations[:, 0]
    assert np.abs(values).max() <= 1.0
    # One point in each of 5000 equal strata: the share below 0.5 is 3/4 to one machine.
    assert np.mean(values <= 0.5) == pytest.approx(0.75, abs=1.0 / 5000.0)
    assert drawn.sigma[0] == pytest.approx(1.0 / sqrt(3.0))


def test_draws_repeat_and_lots_share_what_is_theirs() -> None:
    mixed = (*sources(0.1, 0.2), Scatter("magnet_remanence", 0.02, False, "test"))
    one, two = draw(mixed, 60, 6, seed=9), draw(mixed, 60, 6, seed=9)
    assert (one.deviations == two.deviations).all()
    assert not (draw(mixed, 60, 6, seed=10).deviations == one.deviations).any()
    remanence = one.of("magnet_remanence")
    for lot in range(6):
        assert len(set(remanence[one.lot == lot])) == 1
    assert len(set(remanence)) == 6
    assert len(set(one.of("source0_mm"))) == 60
    assert not one.of("another").any()


def test_lots_that_differ_widen_the_interval() -> None:
    lot = np.arange(200) % 10
    alike = yield_of(np.arange(200) % 4 < 2, np.arange(200) // 20)
    apart = yield_of(lot < 5, lot)  # whole lots pass or fail
    assert alike.share == apart.share == 0.5
    assert apart.high - apart.low > 2.0 * (alike.high - alike.low)
    all_pass = yield_of(np.ones(50, dtype=bool), np.arange(50) % 5)
    assert all_pass.high == 1.0
    check(
        "interval of a yield: 100 of 200 machines, 50 of 50",
        [alike.low, alike.high, all_pass.low],
        [0.4313609, 0.5686391, 1.0 / (1.0 + 1.959964**2 / 50.0)],
        absolute=1e-6,
        why="printed digits",
        source="Wilson 1927, own evaluation of his formula",
    )


@settings(max_examples=60, deadline=None)
@given(
    span=st.floats(0.5, 1.7),
    tooth=st.floats(0.35, 0.65),
    seed=st.integers(0, 1000),
)
def test_scattered_variables_give_back_the_scattered_dimensions(
    span: float, tooth: float, seed: int
) -> None:
    design = {**PLAIN, "tip_span_ratio": span, "tooth_width_ratio": tooth}
    family = design_winding(12, 4, 5).family
    construction = Construction()
    batch = {name: np.array([value]) for name, value in design.items()}
    sections, valid, _ = cross_sections(family, batch, construction)
    assert valid.size == 1
    drawn = draw(DIMENSIONS, 8, 4, seed)
    variables = scattered_variables(sections, drawn)
    variables["current_density_A_mm2"] = np.full(8, 5.0)
    built, valid, _ = cross_sections(family, variables, construction)
    nominal = nominal_dimensions(sections)
    for machine, row in enumerate(valid.tolist()):
        got = nominal_dimensions(built.rows(slice(machine, machine + 1)))
        for name, value in nominal.items():
            # The way there and back is exact but for rounding.
            assert got[name] == pytest.approx(value + drawn.of(name)[row], abs=1e-9)


def test_without_deviation_the_variables_are_the_designs() -> None:
    family = design_winding(6, 2, 1).family
    batch = {name: np.array([value]) for name, value in PLAIN.items()}
    sections, _, _ = cross_sections(family, batch, Construction())
    back = scattered_variables(sections, draw((DIMENSIONS[0],), 1, 1, 0))
    for name, value in back.items():
        if name not in ("rotor_radius_mm", "clearance_mm", "magnet_arc_ratio", "core_ratio"):
            assert value[0] == pytest.approx(PLAIN[name], rel=1e-12)


def test_overrides_are_read_and_refused_clearly() -> None:
    from studies.errors import StudiesError

    base = (DIMENSIONS[0], Scatter("magnet_remanence", 0.02, False, "test"))
    one, two = overridden(base, ["rotor_radius_mm=0.5", "magnet_remanence=3%"])
    assert (one.tolerance, two.tolerance) == (0.5, pytest.approx(0.03))
    assert overridden(base, ["rotor_radius_mm=0"]) == base[1:]
    for entry, words in (
        ("rotor_radius_mm", "write NAME=TOLERANCE"),
        ("roter_radius_mm=1", "'rotor_radius_mm'"),
        ("rotor_radius_mm=-1", "0 or more"),
        ("rotor_radius_mm=1e", "is no number"),
        ("rotor_radius_mm=3%", "not in per cent"),
        ("magnet_remanence=150%", "below 100 %"),
    ):
        with pytest.raises(StudiesError, match=words):
            overridden(base, [entry])


@pytest.fixture
def swept(hovergap: Run, write_study: Write) -> tuple[Path, str]:
    from studies.stored.layout import open_results

    write_study()
    done = hovergap("sweep", "small.toml", "--budget", "60", "--workers", "1")
    assert done.exit_code == 0, done.output
    folder = Path("results/small")
    return folder, stored_family(open_results(folder), "Q6p2s1").front_ids[0]


def test_command_gives_the_closed_form_for_a_linear_metric(
    hovergap: Run, swept: tuple[Path, str]
) -> None:
    """The toy's tip speed is radius times speed: normal radii give a normal tip speed."""
    folder, design = swept
    shown = json.loads(hovergap("inspect", folder, design, "--json").output)
    radius = shown["variables"]["rotor_radius_mm"]
    speed = 30_000.0 * 2.0 * np.pi / 60.0
    limit = 70.0 / speed * 1e3  # mm at which the limit is reached
    sigma = (limit - radius) / 0.8  # so that the yield is Phi(0.8)
    done = hovergap(
        "tolerance", folder, design, "--machines", "400", "--only",
        "--scatter", f"rotor_radius_mm={3.0 * sigma:.9f}", "--scatter", "bore_radius_mm=0.001",
        "--json", "--output", "out",
    )  # fmt: skip
    assert done.exit_code == 0, done.output
    found = json.loads(done.stdout)
    check(
        "yield of a swept design whose tip speed alone is limited",
        found["yield"]["share"],
        normal(0.8),
        absolute=2.0 / 400.0,
        why="stratified draws of the only source that matters: a machine or two of 400",
        source="normal distribution, closed form",
    )
    limited = found["limits"][0]
    assert limited["metric"] == "tip_speed_m_s"
    # The mean of 400 stratified draws is off by less than a thousandth, their deviation and the
    # shares by a per cent or two; the slope of a linear metric is exact but for rounding.
    assert limited["mean"] == pytest.approx(radius * 1e-3 * speed, rel=1e-3)
    assert limited["standard_deviation"] == pytest.approx(sigma * 1e-3 * speed, rel=0.02)
    assert limited["change_per_unit"]["rotor_radius_mm"] == pytest.approx(1e-3 * speed, rel=1e-6)
    assert limited["variance_share"]["rotor_radius_mm"] == pytest.approx(1.0, abs=0.02)
    assert limited["variance_share"]["bore_radius_mm"] < 0.01
    with Path("out/machines.csv").open(newline="") as stream:
        rows = list(csv.DictReader(stream))
    assert len(rows) == 400
    passed = sum(row["meets_all_limits"] == "True" for row in rows)
    assert passed == round(400 * found["yield"]["share"])
    by_hand = sum(float(row["tip_speed_m_s"]) <= 70.0 for row in rows)
    assert by_hand == passed


def test_machines_that_cannot_be_evaluated_count_as_lost(hovergap: Run, write_study: Write) -> None:
    from studies.stored.layout import open_results

    write_study(
        ('name = "toy"', 'name = "toy"\nsettings = { invalid_above_mm = 20.0 }'),
        ("at_most = 70.0", "at_most = 500.0"),
    )
    hovergap("sweep", "small.toml", "--budget", "40", "--workers", "1", "--family", "Q6p2s1")
    stored = stored_family(open_results(Path("results/small")), "Q6p2s1")
    row = stored.front_row(0)
    sigma = 20.0 - row["rotor_radius_mm"]  # so that Phi(1) of the machines can be evaluated
    done = hovergap(
        "tolerance", "results/small", stored.front_ids[0], "--machines", "300", "--only",
        "--scatter", f"rotor_radius_mm={3.0 * sigma:.9f}", "--json",
    )  # fmt: skip
    found = json.loads(done.stdout)
    assert found["failed"] == pytest.approx(300.0 * (1.0 - normal(1.0)), abs=1.5)
    assert found["yield"]["share"] == pytest.approx(1.0 - found["failed"] / 300.0)


def test_analytic_machines_keep_length_and_turns(hovergap: Run, write_study: Write) -> None:
    write_study(('name = "toy"', 'name = "analytic"'), ("at_most = 70.0", "at_most = 500.0"))
    done = hovergap(
        "sweep", "small.toml", "--budget", "12", "--workers", "1", "--family", "Q12p4s5"
    )
    assert done.exit_code == 0, done.output
    from studies.stored.layout import open_results

    folder = Path("results/small")
    stored = stored_family(open_results(folder), "Q12p4s5")
    row = stored.front_row(0)
    done = hovergap(
        "tolerance", folder, stored.front_ids[0], "--machines", "20", "--lots", "4", "--output",
        "out",
    )  # fmt: skip
    assert done.exit_code == 0, done.output
    assert "20 machines in 4 lots" in done.output
    assert max(map(len, done.output.splitlines())) <= WIDEST
    with Path("out/machines.csv").open(newline="") as stream:
        rows = [item for item in csv.DictReader(stream) if item["status"] == "ok"]
    assert len(rows) == 20
    for item in rows:
        # Three rounds of a nearly proportional law.
        assert float(item["stack_length_mm"]) == pytest.approx(row["stack_length_mm"], rel=1e-4)
        assert float(item["turns_per_coil"]) == row["turns_per_coil"]
    # More remanence is more flux: the EMF of a lot follows it, all else being scattered little.
    lots: dict[str, list[tuple[float, float]]] = {}
    for item in rows:
        pair = float(item["deviation:magnet_remanence"]), float(item["back_emf_V"])
        lots.setdefault(item["lot"], []).append(pair)
    means = sorted(tuple(np.mean(pairs, axis=0)) for pairs in lots.values())
    assert means[-1][1] > means[0][1]
