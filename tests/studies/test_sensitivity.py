"""Lines through a design and global indices, against closed forms."""

from __future__ import annotations

import csv
import xml.etree.ElementTree as ET
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from click.testing import Result
from outside import OutsideChecks

from optimizer.problem import Column, Outcome, Variable
from optimizer.workers.dispatch import Serial
from studies.sensitivity.indices import TooFewError, delta_indices, sobol_indices
from studies.sensitivity.lines import line_values, lines_through
from studies.stored.families import stored_family

Run = Callable[..., Result]
Write = Callable[..., Path]

PI_BOX = dict.fromkeys(("x1", "x2", "x3"), (-np.pi, np.pi))

check = OutsideChecks("studies")


def ishigami(x: np.ndarray) -> dict[str, np.ndarray]:
    """Ishigami and Homma 1990 with a = 7, b = 0.1."""
    a, b = 7.0, 0.1
    first = np.sin(x[:, 0])
    return {"y": first + a * np.sin(x[:, 1]) ** 2 + b * x[:, 2] ** 4 * first}


def exact_ishigami() -> tuple[list[float], list[float]]:
    """First-order and total indices (Saltelli et al., Sensitivity Analysis, 2000)."""
    a, b = 7.0, 0.1
    only_1 = 0.5 * (1.0 + b * np.pi**4 / 5.0) ** 2
    only_2 = a**2 / 8.0
    both = b**2 * np.pi**8 * (1.0 / 18.0 - 1.0 / 50.0)
    whole = only_1 + only_2 + both
    return [only_1 / whole, only_2 / whole, 0.0], [
        (only_1 + both) / whole,
        only_2 / whole,
        both / whole,
    ]


def test_sobol_indices_of_the_ishigami_function_are_the_exact_ones() -> None:
    first, total = exact_ishigami()
    assert first == pytest.approx([0.3139052, 0.4424111, 0.0], abs=1e-7)  # published values
    assert total == pytest.approx([0.5575889, 0.4424111, 0.2436837], abs=1e-7)
    found = sobol_indices(
        lambda x: (ishigami(x), np.ones(len(x), dtype=bool)), PI_BOX, ["y"], 4096, seed=3
    )
    check(
        "first-order and total Sobol indices of the Ishigami function",
        [found.first[0], found.other[0]],
        [first, total],
        absolute=5e-3,
        why="4096 base samples of a Sobol sequence",
        source="closed form in Saltelli et al., Sensitivity Analysis, 2000",
    )
    assert found.evaluations == 4096 * 5
    assert found.dropped == 0
    again = sobol_indices(
        lambda x: (ishigami(x), np.ones(len(x), dtype=bool)), PI_BOX, ["y"], 4096, seed=3
    )
    assert (again.other == found.other).all()
    assert (again.other_confidence == found.other_confidence).all()


def test_failed_rows_are_dropped_by_blocks_and_counted() -> None:
    calls = []

    def sometimes(x: np.ndarray) -> tuple[dict[str, np.ndarray], np.ndarray]:
        calls.append(len(x))
        usable = np.ones(len(x), dtype=bool)
        usable[[7, 8, 203]] = False  # blocks of 5: two of them, 1 and 40
        values = ishigami(x)
        values["y"][~usable] = np.nan
        return values, usable

    found = sobol_indices(sometimes, PI_BOX, ["y"], 1024, seed=1)
    assert calls == [5 * 1024]
    assert found.dropped == 10
    # Two blocks less of 1024 change nothing that the confidence does not cover.
    assert found.other[0] == pytest.approx(exact_ishigami()[1], abs=0.03)
    with pytest.raises(TooFewError, match=r"only 0 of 16 blocks"):
        sobol_indices(
            lambda x: (ishigami(x), np.zeros(len(x), dtype=bool)), PI_BOX, ["y"], 16, seed=1
        )


def test_a_constant_has_no_indices() -> None:
    found = sobol_indices(
        # Rounding must not be taken for variance.
        lambda x: ({"c": 2e6 + 1e-9 * x[:, 0]}, np.ones(len(x), dtype=bool)),
        PI_BOX,
        ["c"],
        16,
        seed=1,
    )
    assert not found.other.any()


def test_delta_finds_the_one_variable_that_matters() -> None:
    rng = np.random.default_rng(5)
    x = rng.uniform(size=(250, 3))
    usable = rng.uniform(size=250) < 0.9
    values = {"y": np.where(usable, x[:, 1], np.nan)}
    box = dict.fromkeys("abc", (0.0, 1.0))
    found = delta_indices(x, values, usable, box, seed=1, basis="drawn")
    assert found.dropped == np.count_nonzero(~usable)
    # y = b: delta of b is 1 in the limit, of the others 0. The densities of 250 rows in a few
    # classes are blurred, which takes about a third off the one and adds about 0.1 to the others.
    assert found.other[0, 1] > 0.5
    assert abs(found.other[0, 0]) < 0.2
    assert abs(found.other[0, 2]) < 0.2
    with pytest.raises(TooFewError):
        delta_indices(x, values, np.zeros(250, dtype=bool), box, seed=1, basis="drawn")


class PowerLaw:
    """y = x1^2 / sqrt(x2), with the region x1 > 3.5 failing."""

    variables = (Variable("rotor_radius_mm", 2.0, 4.0), Variable("clearance_mm", 0.5, 0.5))
    objectives = ("y",)
    constraints = ("big",)
    columns = (Column("y"),)
    evaluator_name = "law"

    def evaluate(self, x: np.ndarray) -> Outcome:
        y = x[:, 0] ** 2 / np.sqrt(x[:, 1])
        status = np.where(x[:, 0] > 3.5, "failed", "ok")
        return Outcome(y[:, None], (y - 20.0)[:, None], status, columns={"y": y})


def test_lines_pass_through_the_design_and_give_elasticities() -> None:
    design = {"rotor_radius_mm": 3.03, "clearance_mm": 0.5}
    problem = PowerLaw()
    free, fixed = lines_through(problem, design, 201, Serial())  # type: ignore[arg-type]
    assert free.values[free.at] == 3.03
    assert len(free.values) == 201
    assert (np.diff(free.values) > 0.0).all()
    assert fixed.fixed
    assert not free.fixed
    assert fixed.values[[0, -1]] == pytest.approx([0.45, 0.55])  # 10 % to both sides
    # Exponents 2 and -1/2; the second-order difference on steps of 0.3 % and 0.1 % is right to
    # its square.
    y = np.where(free.outcome.ok, free.outcome.columns["y"], np.nan)
    assert free.elasticity(y) == pytest.approx(2.0, abs=1e-4)
    assert fixed.elasticity(np.asarray(fixed.outcome.columns["y"])) == pytest.approx(-0.5, abs=1e-4)
    assert np.count_nonzero(~free.outcome.ok) == np.count_nonzero(free.values > 3.5)


def test_the_grid_keeps_its_size_and_its_ends() -> None:
    values, at = line_values(Variable("rotor_radius_mm", 2.0, 4.0), 2.0, 5)
    assert values.tolist() == [2.0, 2.5, 3.0, 3.5, 4.0]
    assert at == 0
    with pytest.raises(ValueError, match="at least 3"):
        lines_through(PowerLaw(), {"rotor_radius_mm": 3.0, "clearance_mm": 0.5}, 2, Serial())  # type: ignore[arg-type]


@pytest.fixture
def swept(hovergap: Run, write_study: Write) -> tuple[Path, str]:
    from studies.stored.layout import open_results

    write_study(('name = "toy"', 'name = "toy"\nsettings = { invalid_above_mm = 23.0 }'))
    done = hovergap("sweep", "small.toml", "--budget", "120", "--workers", "1")
    assert done.exit_code == 0, done.output
    folder = Path("results/small")
    return folder, stored_family(open_results(folder), "Q6p2s1").front_ids[0]


def test_command_writes_lines_indices_and_pictures(hovergap: Run, swept: tuple[Path, str]) -> None:
    folder, design = swept
    done = hovergap(
        "sensitivity", folder, design, "--points", "7", "--indices", "sobol", "--samples", "33",
        "--output", "out",
    )  # fmt: skip
    assert done.exit_code == 0, done.output
    assert "64 base samples" in done.output  # 33 rounded up
    assert "could not be evaluated and are left out" in done.output
    with Path("out/lines.csv").open(newline="") as stream:
        rows = list(csv.DictReader(stream))
    assert len(rows) == 7 * 13
    lines = {row["variable"] for row in rows}
    assert len(lines) == 13
    assert sum(row["is_design"] == "True" for row in rows) == 13
    failed = [row for row in rows if row["status"] != "ok"]
    assert {row["variable"] for row in failed} == {"rotor_radius_mm"}
    assert all(row["reason"] == "the rotor is too large for the toy" for row in failed)
    assert all(row["cost"] == "" for row in failed)
    with Path("out/indices.csv").open(newline="") as stream:
        indices = list(csv.DictReader(stream))
    cost = {row["variable"]: float(row["total"]) for row in indices if row["metric"] == "cost"}
    # The toy's cost is radius^2 / current density and depends on nothing else.
    assert cost["rotor_radius_mm"] > 0.2
    assert cost["current_density_A_mm2"] > 0.2
    assert cost["magnet_thickness_mm"] == pytest.approx(0.0, abs=1e-12)
    for name in ("objective_lines.svg", "limit_lines.svg", "indices.svg"):
        assert ET.parse(Path("out", name)).getroot().tag.endswith("svg")  # noqa: S314
    first = Path("out/objective_lines.svg").read_bytes()
    again = hovergap(
        "sensitivity", folder, design, "--points", "7", "--samples", "33", "--output", "out",
        "--force", "--indices", "none",
    )  # fmt: skip
    assert again.exit_code == 0
    assert Path("out/objective_lines.svg").read_bytes() == first


def test_delta_uses_what_is_stored_and_evaluates_the_lines_only(
    hovergap: Run, swept: tuple[Path, str]
) -> None:
    folder, design = swept
    done = hovergap("sensitivity", folder, design, "--points", "3", "--indices", "delta")
    assert done.exit_code == 0, done.output
    assert "designs stored of Q6p2s1" in done.output
    assert "120 stored designs" in done.output


def test_too_few_usable_samples_are_refused_in_one_sentence(
    hovergap: Run, write_study: Write
) -> None:
    write_study()
    hovergap("sweep", "small.toml", "--budget", "30", "--workers", "1", "--family", "Q6p2s1")
    done = hovergap("sensitivity", "results/small", "Q6p2s1-000003", "--indices", "delta")
    assert done.exit_code == 2
    assert "--indices none" in done.output
    assert "Traceback" not in done.output
