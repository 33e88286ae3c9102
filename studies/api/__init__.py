"""The package from Python: what the command line does, as functions that return Arrow tables.

Every table is a `pyarrow.Table`; ``table.to_pandas()`` makes a pandas DataFrame of it where pandas
is installed. Columns carry unit and description as metadata of their fields where they have any.
Errors are those of the command line, raised as `studies.errors.StudiesError`,
`optimizer.errors.OptimizerError` or `evaluators.interface.EvaluatorError` with the same words.

A study whose evaluator starts a program is only evaluated with ``allow_program=True``.

Examples
--------
A small search of a shipped study, read again as tables:

>>> import tempfile
>>> from studies import api
>>> root = tempfile.mkdtemp()
>>> summary = api.sweep("blower", root, families=["Q12p4s5"], evaluations=60, workers=1)
>>> summary.select(["family", "evaluations"]).to_pylist()
[{'family': 'Q12p4s5', 'evaluations': 60}]
>>> folder = f"{root}/blower"
>>> rows = api.evaluations(folder, columns=["rotor_radius_mm", "loss_total_W", "status"])
>>> rows.num_rows
60
>>> rows.schema.field("loss_total_W").metadata[b"unit"]
b'W'
>>> set(rows["status"].to_pylist()) <= {"ok", "invalid geometry", "failed"}
True

It goes on where it stopped:

>>> api.resume(folder, evaluations=80, workers=1)["new"].to_pylist()
[20]
>>> "complete" in api.status(folder)["state"].to_pylist()
True

What a study may name:

>>> api.metrics().num_rows > 40
True
>>> api.families([6, 12], [1, 2])["family"].to_pylist()
['Q6p1s2', 'Q6p2s1', 'Q12p1s2', 'Q12p2s1']
"""

from studies.api.judging import choose, sensitivity, tolerance, verify
from studies.api.listing import families, materials, metrics, variables
from studies.api.reading import (
    compare,
    compare_searches,
    evaluations,
    front,
    inspect,
    open_study,
    order_certainty,
    status,
    verified,
)
from studies.api.searching import load_study, new_study, resume, sweep
from studies.api.writing import export_design, export_fronts, report, sheet

__all__ = [
    "choose",
    "compare",
    "compare_searches",
    "evaluations",
    "export_design",
    "export_fronts",
    "families",
    "front",
    "inspect",
    "load_study",
    "materials",
    "metrics",
    "new_study",
    "open_study",
    "order_certainty",
    "report",
    "resume",
    "sensitivity",
    "sheet",
    "status",
    "sweep",
    "tolerance",
    "variables",
    "verified",
    "verify",
]
