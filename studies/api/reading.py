"""What is stored of a study, as tables."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import pyarrow as pa

from studies.api.tables import Folder, Folders, described, opened, table_of, table_of_csv
from studies.comparison.certainty import order_certainty as order_certainty_of
from studies.comparison.certainty import pair_rows, search_rows
from studies.comparison.numbers import compare_families
from studies.comparison.text import summary_csv
from studies.export.front_table import front_table
from studies.inspection.design import inspect_design
from studies.running.status import study_status
from studies.stored.families import stored_families, stored_family
from studies.stored.layout import Results, open_results
from studies.stored.naming import design_id
from studies.stored.verified import evaluator_for, read_verified, verified_evaluators


def open_study(folder: Folder) -> Results:
    """A results folder: its frozen study and what was asked for.

    Raises
    ------
    ResultsError
        If it is none.
    """
    return open_results(Path(folder))


def status(folders: Folders) -> pa.Table:
    """How far each search is: one row a search of a family, with study, folder and seed.

    ``damaged_parts`` counts parts of the study that cannot be read; `resume` evaluates them again.
    """
    rows = []
    for results in opened(folders):
        entry = study_status(results)
        common = {
            "study": entry["study"],
            "folder": entry["folder"],
            "study_state": entry["state"],
            "seed": entry["seed"],
            "damaged_parts": len(entry["damaged_parts"]),
        }
        rows += [{**common, **family} for family in entry["families"]]
    return table_of(rows)


def evaluations(
    folder: Folder, families: Sequence[str] = (), columns: Sequence[str] | None = None
) -> pa.Table:
    """Every evaluation stored, search by search in the order in which they were asked for.

    Parameters
    ----------
    folder : path
        Results folder of the study.
    families : sequence of str
        Empty for all that are stored.
    columns : sequence of str, optional
        Columns of the archive to read; by default all. Reading few is quicker.

    Returns
    -------
    pyarrow.Table
        ``design`` (which names the search from the second on) and ``family`` first, then the
        columns: variables, metrics, ``status`` and ``reason``, ``objective:...`` (minimised),
        ``margin:...`` (met at 0 or below).

    Raises
    ------
    ResultsError, optimizer.errors.ArchiveError
        If nothing is stored of a family, or a column does not exist.
    """
    results = open_study(folder)
    if families:
        found = [stored_family(results, family) for family in families]
    else:
        found = stored_families(results)
    parts = []
    for stored in [search for family in found for search in family.searches]:
        wanted = None if columns is None else list(dict.fromkeys(["evaluation", *columns]))
        table = stored.reader.table(wanted).replace_schema_metadata(None)
        numbers = table["evaluation"].to_pylist()
        ids = pa.array([design_id(stored.name, number) for number in numbers], pa.string())
        names = pa.array([stored.family] * len(numbers), pa.string())
        if columns is not None and "evaluation" not in columns:
            table = table.drop_columns(["evaluation"])
        parts.append(table.add_column(0, "family", names).add_column(0, "design", ids))
    if not parts:
        return table_of([], ["design", "family"])
    return described(pa.concat_tables(parts, promote_options="default"))


def front(folder: Folder, families: Sequence[str] = ()) -> pa.Table:
    """Feasible designs that no other of their family beats in every objective, all columns.

    Raises
    ------
    ResultsError
        If there are none.
    """
    table = front_table(open_study(folder)).table
    if families:
        keep = [family in set(families) for family in table["family"].to_pylist()]
        table = table.filter(pa.array(keep, pa.bool_()))
    return table


def compare(
    folders: Folders, verified_by: str | None = None, verified_only: bool = False
) -> pa.Table:
    """Families against each other on one scale: one row a family.

    Parameters
    ----------
    folders : path or sequence of paths
        Of one or several studies with the same objectives.
    verified_by : str, optional
        Evaluator whose verified values count where there are any; empty for the only one.
    verified_only : bool
        Compare verified designs alone.

    Returns
    -------
    pyarrow.Table
        study, family, evaluations, feasible, failed, front_size, hypervolume (share of the common
        box), joint_front_share, ``best:...`` of each objective in its own sense, the compromise
        design and its metrics. Where families were searched several times also searches,
        ``hypervolume_smallest``, ``_median``, ``_largest`` and ``hypervolume:1`` and so on, each
        search's own.

    Raises
    ------
    ResultsError
        If the studies have different objectives, or nothing is stored.
    """
    results = opened(folders)
    wanted = verified_by is not None or verified_only
    name = evaluator_for(results, verified_by or "") if wanted else ""
    return table_of_csv(summary_csv(compare_families(results, name, verified_only=verified_only)))


def compare_searches(folders: Folders) -> pa.Table:
    """Every search by itself on the common scale of `compare`: one row a search.

    Columns label (of the family), search, seed, evaluations, front_size, hypervolume; the family
    with the largest median first. Empty if every family was searched once.
    """
    certainty = order_certainty_of(compare_families(opened(folders)))
    return table_of(search_rows(certainty) if certainty else [], ["label", "search"])


def order_certainty(folders: Folders) -> pa.Table:
    """How sure the order of the families is: one row a pair of families.

    Columns first (the one with the larger median) and second, pairs_of_searches, first_ahead,
    equal, probability that a search of the first reaches the larger hypervolume, p of the exact
    two-sided rank-sum test, p_corrected for all pairs. Empty if every family was searched once.
    """
    certainty = order_certainty_of(compare_families(opened(folders)))
    return table_of(pair_rows(certainty) if certainty else [], ["first", "second"])


def inspect(folder: Folder, design: str) -> pa.Table:
    """One stored design: the row of the archive, its dimensions in mm, and whether on the front.

    Raises
    ------
    ResultsError
        If there is no such design.
    """
    found = inspect_design(open_study(folder), design)
    return table_of(
        [{"design": found.design, "on_front": found.on_front, **found.row, **found.lengths_mm}]
    )


def verified(folder: Folder, evaluator: str = "") -> pa.Table:
    """Designs evaluated again by another evaluator, with the archive's values beside.

    Columns ``stored:...`` hold the archive's value and ``deviation:...`` verified minus stored
    over the size of the stored; empty if nothing was verified. `evaluator` names one of several.
    """
    results = open_study(folder)
    rows = []
    for stored in [search for family in stored_families(results) for search in family.searches]:
        for name in verified_evaluators(stored.folder):
            if evaluator in ("", name):
                rows += [
                    {"design": design_id(stored.name, number), "family": stored.family}
                    | dict(row.values)
                    for number, row in sorted(read_verified(stored.folder, name).rows.items())
                ]
    return table_of(rows, ["design", "family"])
