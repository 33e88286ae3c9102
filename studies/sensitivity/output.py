"""The files of a sensitivity study."""

from __future__ import annotations

from studies.export.files import ExportedFile, text_file
from studies.sensitivity.plots import index_picture, line_pictures
from studies.sensitivity.study import Sensitivity
from studies.sensitivity.tables import counts_text, indices_csv, lines_csv

PICTURES = {
    "objective_lines.svg": "the objectives along each variable, grey where a limit is broken",
    "limit_lines.svg": "the limits nearest to being broken along each variable",
}


def sensitivity_files(found: Sensitivity) -> list[ExportedFile]:
    """Tables as CSV, pictures as SVG."""
    files = [
        text_file(
            "lines.csv",
            lines_csv(found),
            "every point of every line with status, metrics and margins (met at 0 or below)",
        ),
        *(
            ExportedFile(name, content, PICTURES[name])
            for name, content in line_pictures(found).items()
        ),
    ]
    if found.indices is not None:
        files += [
            text_file(
                "indices.csv",
                indices_csv(found.indices),
                "global indices of every objective and limited metric with the half-width of "
                "their 95 % confidence interval",
            ),
            ExportedFile("indices.svg", index_picture(found.indices), "the same as a picture"),
        ]
    return files


def sensitivity_notes(found: Sensitivity) -> list[str]:
    """Paragraphs of the README beside them."""
    evaluator = found.chosen.problem.evaluator
    points = sum(len(line.values) for line in found.lines)
    notes = [
        f"Evaluated by {evaluator.name} {evaluator.version}. Each line moves one variable over the "
        "study's bounds (a fixed one by 10 % to both sides) and keeps all others. The stack "
        "length and the turns follow from the duty at every point, as in the search.",
        f"{found.failed} of {points} points of the lines could not be evaluated; they stand in "
        "lines.csv with their reason and are left out of the pictures.",
    ]
    if found.indices is not None:
        notes.append(
            f"Global indices ({found.indices.method}): {found.indices.basis}. "
            + counts_text(found.indices)
        )
    return notes
