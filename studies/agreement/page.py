"""The page that tabulates how far the evaluators agree."""

from __future__ import annotations

import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime
from importlib.metadata import version
from pathlib import Path
from textwrap import fill

import click
import numpy as np

from evaluators.machine.metrics import METRIC
from optimizer.archive.durable import write_durably
from optimizer.workers.dispatch import Dispatcher, Serial
from optimizer.workers.pool import Pool
from studies.agreement.measure import (
    FIRST,
    SECOND,
    FamilyAgreement,
    family_agreement,
    unaffected,
)
from studies.inspection.chosen import with_evaluator
from studies.problem import machine_problem
from studies.running.progress import duration
from studies.shipped.library import find_study, shipped
from studies.stored.layout import program_version

PAGE = Path("evaluators") / "AGREEMENT.md"
GOOD, FAIR = 0.9, 0.8  # rank correlation in the worst family

NOTES = (
    "Turns are whole numbers and coil groups are in series or in parallel, so a voltage that "
    "differs by a part in a hundred can change turns, strands, wire, currents of one terminal and "
    "inductances by a half or by a factor of four, while most designs agree exactly. Losses, "
    "torque and force do not jump with them.",
    "`phase_voltage_V` and `voltage_use` are what is left after the turns were chosen to use the "
    "inverter: nearly the same in all designs, so their ranks say little.",
    "`sleeve_radial_tension_MPa` is zero in most designs, `parallel_groups` has two values, and "
    "`copper_fill` hardly varies: their ranks say little too.",
    "Force is least sure in families with ps = p - 1. There the main force is the small "
    "difference of two parts of Maxwell's stress (coth - 1 in the closed form, against "
    "coth + 1 for ps = p + 1), so a few per cent of field become twice as much of force, and "
    "a two-pole suspension field closes through the whole yoke. Up to some 1.6 T the circuit "
    "knows the yoke, which bulges into the teeth; beyond, in designs that no limit of a study "
    "would let pass, it knows one flux a slot pitch and no more.",
    "With linear iron both agree in force, its error and the ripple to a per cent; what differs "
    "is saturation. The tips of half-closed teeth saturate first, by the leakage of the torque "
    "current on top of what they collect from the gap, and shake the force where teeth and "
    "yoke are far from it. The analytic circuit gives a tip one flux and one voltage; a search "
    "that smooths the force by it still finds designs with two or three times the error that "
    "it promises, at levels of a per cent or two.",
    "`loss_magnet_W` is least sure with many poles and saturated stators: the analytic evaluator "
    "lets orders of one frequency mix in each magnet, but takes the reaction of the currents of "
    "every order by itself and the field of a stator saturated alike in all teeth. Warmer magnets "
    "carry less flux, so total loss, efficiency, torque and force per length differ with it; where "
    "that loss is large the ranks of efficiency and of `torque_Nm`, which holds its drag, suffer.",
    "Cogging is taken from teeth and yoke of one permeability each and is a tiny difference "
    "besides where slots and poles have a large common multiple: do not rank designs by it.",
    "`magnet_flux_density_T` is a sum of harmonics that rings at the edges of the magnets; both "
    "sum as many, six to a slot pitch. With more of them it moves by about 0.1 T, upwards in "
    "most families but downwards with six slots: keep a margin.",
    "The median tells of ordinary designs; the ninth decile mostly of saturated ones, which the "
    "analytic evaluator treats by a circuit of teeth and yoke. Verify what a search has chosen: "
    "`hovergap verify RESULTS/STUDY --front`.",
)


@dataclass(frozen=True)
class Goal:
    """What the analytic evaluator should reach in every family."""

    metric: str
    what: str
    wanted: float

    def worst(self, families: Sequence[FamilyAgreement]) -> tuple[float, FamilyAgreement]:
        """Value farthest from the goal, and where."""
        values = [(getattr(item.metrics[self.metric], self.what), item) for item in families]
        choose: Callable[..., tuple[float, FamilyAgreement]] = min if self.what == "rank" else max
        return choose(values, key=lambda pair: pair[0])

    def reached(self, value: float) -> bool:
        """Whether a value is good enough."""
        return value >= self.wanted if self.what == "rank" else value <= self.wanted


GOALS = (
    Goal("torque_per_length_Nm_m", "median", 0.03),
    Goal("force_per_length_N_m", "median", 0.05),
    Goal("loss_iron_W", "median", 0.15),
    Goal("efficiency", "rank", 0.9),
    Goal("cost", "rank", 0.9),
    Goal("torque_ripple", "rank", 0.8),
    Goal("force_error_magnitude", "rank", 0.8),
    Goal("force_error_angle_deg", "rank", 0.8),
)


def page(families: Sequence[FamilyAgreement], command: str, versions: Sequence[str]) -> str:
    """The whole page in Markdown."""
    same = unaffected(families)
    names = [name for name in families[0].metrics if name not in same]
    studies = dict.fromkeys(item.study for item in families)
    parts = [
        "# Agreement of the evaluators",
        _filled(
            f"How far `{FIRST}` lies from `{SECOND}` (static) over random designs of the shipped "
            f"studies, at least {min(item.compared for item in families)} a family, drawn evenly "
            "from the study's box: most of them are worse designs than a search keeps. Generated "
            f"by `{command}`; do not edit."
        ),
        f"{datetime.now(UTC):%Y-%m-%d}: {', '.join(versions)}.",
        _filled(
            "Deviation: size of the difference over the size of the finite-element value; for "
            "metrics that may be negative, marked ±, over the span between first and ninth decile "
            "of the finite-element values. Rank: Spearman's rank correlation. Both evaluators hand "
            "their field to the same losses, heat, mechanics and costs, so what differs below is "
            "the field and what follows from it."
        ),
        "## Goals\n\n" + _goals(families),
        "## Summary\n\n"
        + _filled(
            "Medians over the families, and the worst family. Screening: *good* if designs rank as "
            f"by finite elements (rank at least {GOOD:g} in every family), *fair* from {FAIR:g}, "
            "*poor* below: verify what you choose by it."
        )
        + "\n\n"
        + _summary(families, names),
        "## Reading it\n\n" + "\n".join(_filled(f"- {text}", "  ") for text in NOTES),
        "## Designs\n\n" + _counts(families),
        *(
            f"## {study}\n\nMedian deviation, ninth decile, rank.\n\n"
            + _study([item for item in families if item.study == study], names)
            for study in studies
        ),
        "## The same with both\n\n"
        + _filled(", ".join(f"`{name}`" for name in same) + ": geometry and duty alone."),
    ]
    return "\n\n".join(parts) + "\n"


def _filled(text: str, indent: str = "") -> str:
    return fill(text, 100, subsequent_indent=indent, break_long_words=False, break_on_hyphens=False)


def _rows(head: Sequence[str], rows: Sequence[Sequence[str]], left: int = 1) -> str:
    rule = ["---" if k < left else "--:" for k in range(len(head))]
    return "\n".join(f"| {' | '.join(cells)} |" for cells in (head, rule, *rows))


def _percent(value: float) -> str:
    if np.isnan(value):
        return "–"
    return f"{100.0 * value:.1f} %" if value < 1.0 else f"{100.0 * value:.0f} %"


def _rank(value: float) -> str:
    return "–" if np.isnan(value) else f"{value:.3f}"


def _name(name: str) -> str:
    return f"`{name}`{' ±' if name in METRIC and METRIC[name].signed else ''}"


def _goals(families: Sequence[FamilyAgreement]) -> str:
    rows = []
    for goal in GOALS:
        value, where = goal.worst(families)
        shown = _rank if goal.what == "rank" else _percent
        wanted = f"{'at least' if goal.what == 'rank' else 'at most'} {shown(goal.wanted)}"
        missed = sum(
            not goal.reached(getattr(item.metrics[goal.metric], goal.what)) for item in families
        )
        verdict = "reached" if not missed else f"missed in {missed} of {len(families)}"
        what = "rank" if goal.what == "rank" else "median deviation"
        rows.append([_name(goal.metric), what, wanted, shown(value), where.label, verdict])
    return _rows(["metric", "what", "goal in every family", "worst", "where", ""], rows, 6)


def _summary(families: Sequence[FamilyAgreement], names: Sequence[str]) -> str:
    rows = []
    for name in names:
        found = [item.metrics[name] for item in families]
        ranks = np.array([item.rank for item in found])
        worst = float(np.nanmin(ranks)) if np.isfinite(ranks).any() else np.nan
        where = families[int(np.nanargmin(ranks))].label if np.isfinite(worst) else ""
        quality = "–"
        if np.isfinite(worst):
            quality = "good" if worst >= GOOD else "fair" if worst >= FAIR else "poor"
        rows.append(
            [
                _name(name),
                _percent(float(np.nanmedian([item.median for item in found]))),
                _percent(float(np.nanmax([item.median for item in found]))),
                _percent(float(np.nanmax([item.ninth_decile for item in found]))),
                _rank(float(np.nanmedian(ranks)) if np.isfinite(worst) else np.nan),
                _rank(worst),
                where,
                quality,
            ]
        )
    head = ["metric", "median", "worst median", "worst ninth decile", "rank", "worst rank"]
    return _rows([*head, "in", "screening"], rows)


def _counts(families: Sequence[FamilyAgreement]) -> str:
    rows = [
        [
            item.label,
            str(item.drawn),
            str(item.compared),
            str(item.only_first),
            str(item.only_second),
        ]
        for item in families
    ]
    head = ["family", "drawn", "compared", f"only {FIRST}", f"only {SECOND}"]
    return _rows(head, rows)


def _study(families: Sequence[FamilyAgreement], names: Sequence[str]) -> str:
    rows = []
    for name in names:
        cells = [_name(name)]
        for item in families:
            found = item.metrics[name]
            values = (_percent(found.median), _percent(found.ninth_decile), _rank(found.rank))
            cells.append(", ".join(values))
        rows.append(cells)
    return _rows(["metric", *(item.family for item in families)], rows)


@click.command()
@click.option("--designs", type=click.IntRange(10, 10_000), default=200, show_default=True)
@click.option("--study", "studies", multiple=True, help="Only this study; repeatable.")
@click.option("--family", "wanted", multiple=True, help="Only this family; repeatable.")
@click.option("--workers", type=click.IntRange(1, 256), default=1, show_default=True)
@click.option(
    "--keep",
    type=click.Path(file_okay=False),
    help="Keep finite-element values in this folder; empty it when the machine model changes.",
)
@click.option("--output", type=click.Path(dir_okay=False), default=str(PAGE), show_default=True)
def main(
    designs: int,
    studies: tuple[str, ...],
    wanted: tuple[str, ...],
    workers: int,
    keep: str | None,
    output: str,
) -> None:
    """Tabulate how far the analytic evaluator lies from the finite-element one."""
    found: list[FamilyAgreement] = []
    begin = time.monotonic()
    dispatcher: Dispatcher = Serial() if workers == 1 else Pool(workers)
    chosen = [find_study(name) for name in studies or tuple(shipped())]
    with dispatcher:
        for study in chosen:
            for family in study.families:
                if wanted and family not in wanted:
                    continue
                folder = Path(keep) if keep else None
                found.append(family_agreement(study, family, designs, dispatcher, folder))
                click.echo(f"{found[-1].label}: {duration(time.monotonic() - begin)}")
    if not found:
        msg = f"no study has a family {', '.join(wanted)}"
        raise click.UsageError(msg)
    problem = machine_problem(chosen[0], chosen[0].families[0])
    evaluators = [
        f"{name} {with_evaluator(problem, name).evaluator.version}" for name in (FIRST, SECOND)
    ]
    versions = [
        f"hovergap {program_version()}",
        *evaluators,
        *(f"{name} {version(name)}" for name in ("numpy", "scipy", "numba")),
    ]
    command = f"python -m studies.agreement --designs {designs}"
    write_durably(Path(output), page(found, command, versions).encode())
    click.echo(f"wrote {output}")
