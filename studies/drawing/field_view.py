"""The field picture of a stored design."""

from __future__ import annotations

from dataclasses import dataclass, replace
from math import radians

from evaluators.finite_element.evaluator import FiniteElementEvaluator
from evaluators.finite_element.model import FieldModel
from evaluators.finite_element.picture.picture import Currents, field_picture
from studies.drawing.field_picture import field_image
from studies.errors import StudiesError
from studies.inspection.chosen import choose_design
from studies.stored.layout import Results

FINER = 2
"""Times the evaluator's cells in every direction: one position costs little, lines get smooth."""


@dataclass(frozen=True)
class DrawnField:
    """A picture file and the design it shows."""

    design: str
    content: bytes


def draw_field(
    results: Results,
    design: str,
    angle_deg: float,
    *,
    torque: bool = True,
    direction: float | None = None,
    kind: str = "png",
) -> DrawnField:
    """Solve and draw one design.

    Parameters
    ----------
    results : Results
    design : str
        Its id.
    angle_deg : float
        Rotor angle, degrees.
    torque : bool
        Whether the duty's torque current flows.
    direction : float or None
        Suspension current for a force in this direction, degrees; None for none.
    kind : str
        ``png`` or ``svg``.

    Raises
    ------
    ResultsError
        If the design is not stored or could not be evaluated.
    StudiesError
        If its field does not converge.
    """
    chosen = choose_design(results, design, FiniteElementEvaluator.name)
    evaluator = chosen.problem.evaluator
    if not isinstance(evaluator, FiniteElementEvaluator):
        msg = f"the evaluator called {evaluator.name!r} here is not the one that gives fields"
        raise StudiesError(msg)
    force = None if direction is None else radians(direction)
    discretisation = evaluator.model.discretisation
    finer = replace(discretisation, refinement=FINER * discretisation.refinement)
    try:
        picture = field_picture(
            FieldModel(chosen.task, finer),
            chosen.values,
            radians(angle_deg),
            Currents(torque, force),
        )
    except ValueError as error:
        msg = f"{chosen.design}: {error}"
        raise StudiesError(msg) from None
    flowing = "magnets and torque current of the duty" if torque else "magnets alone"
    if direction is not None:
        flowing += f", suspension current for a force towards {direction:g}°"
    title = f"{chosen.design} of study {results.study.name}, rotor at {angle_deg:g}°"
    warm = chosen.task.conditions.magnet_temperature
    note = (
        f"{flowing[0].upper()}{flowing[1:]}.\n"
        f"Magnets at the study's stated {warm:g} °C; {evaluator.name} {evaluator.version}."
    )
    return DrawnField(
        chosen.design,
        field_image(picture, chosen.task.winding, title, note, kind),
    )
