"""All files of one design, and all of a front, with the notes that go beside them."""

from __future__ import annotations

from evaluators.machine.geometry.dxf import dxf_bytes
from evaluators.machine.geometry.outlines import outlines
from studies.drawing.cross_section import cross_section_svg
from studies.drawing.winding_diagram import winding_svg
from studies.export.files import ExportedFile, svg_file
from studies.export.front_table import FrontTable
from studies.export.machine import machine_file
from studies.export.materials import material_files
from studies.export.suspension import suspension_files, suspension_known
from studies.export.winding import winding_files
from studies.inspection.chosen import Chosen
from studies.inspection.design import SHORT_CAUTIONS
from studies.stored.layout import Results

DRAWING = "cross_section.dxf"
PICTURE = "cross_section.svg"
DIAGRAM = "winding.svg"


def design_files(chosen: Chosen) -> list[ExportedFile]:
    """Everything there is to hand over of one design."""
    parts = outlines(chosen.sections, 0, chosen.task.winding)
    facts = {
        "hovergap design": chosen.design,
        "hovergap study": chosen.results.study.name,
        "hovergap stack length mm": f"{chosen.metric('stack_length_mm'):.6g}",
    }
    title = f"{chosen.results.study.name} {chosen.design}, rotor at angle 0, mm"
    files = [
        ExportedFile(
            DRAWING,
            dxf_bytes(parts, title, facts, "Read README.txt beside this file.", SHORT_CAUTIONS),
            "cross-section to scale in mm, a layer for each part, closed outlines; the dimension "
            "on the layer scale must read the stator's outer diameter",
        ),
        svg_file(
            PICTURE,
            cross_section_svg(chosen.sections, 0, chosen.task.winding, chosen.design, "part"),
            "the same as a picture with a scale bar, coil sides by phase",
        ),
        svg_file(DIAGRAM, winding_svg(chosen.task.winding), "the winding unrolled"),
        machine_file(chosen, parts),
        *winding_files(chosen.task.winding, int(chosen.metric("turns_per_coil"))),
        *material_files(chosen.task),
    ]
    if suspension_known(chosen):
        files += suspension_files(chosen)
    return files


def design_notes(chosen: Chosen) -> list[str]:
    """Paragraphs of the README beside one design."""
    row = chosen.found.row
    notes = [
        f"Evaluated by {row['evaluator']} {row['evaluator_version']}; waveforms by "
        f"{chosen.problem.evaluator_name} {chosen.problem.evaluator.version}.",
        "Coordinates: x along the axis of tooth 1, counter-clockwise positive, z out of the "
        "drawing; rotor angle 0 has a north magnet on x. Slots, coils and magnets are counted "
        "from 1. Units stand in the names: mm, N_A is N/A. Insulation, wedges, fillets and "
        "fastening are not drawn.",
    ]
    broken = chosen.broken_limits
    if broken:
        notes.insert(0, f"THIS DESIGN BREAKS A LIMIT OF ITS STUDY: {'; '.join(broken)}.")
    if not suspension_known(chosen):
        notes.append(
            "The evaluator gives no waveforms of the suspension, so the controller's data are left "
            "out; export with --evaluator analytic to have them."
        )
    return notes


def front_notes(results: Results, front: FrontTable) -> list[str]:
    """Paragraphs of the README beside the fronts."""
    notes = [
        f"Study {results.study.name}: {results.study.description}",
        "Columns objective:... hold the minimised value (sign turned where the objective is "
        "maximised); columns margin:... are the distance to a limit over its size, met at 0 or "
        "below.",
    ]
    if front.damaged:
        notes.insert(0, f"Rows are missing: damaged parts {', '.join(front.damaged)}.")
    return notes
