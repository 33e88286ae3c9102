"""Settings of the evaluator as a study gives them."""

from __future__ import annotations

from dataclasses import fields, replace

from evaluators.finite_element.mesh.lattice import Resolution
from evaluators.finite_element.model import Discretisation
from evaluators.interface import EvaluatorError

ANALYSES = ("static", "transient")
ROTORS = ("uniform", "separate")
KNOWN = (
    "analysis",
    "cells",
    "cogging_positions",
    "iron_rings",
    "orders_per_slot",
    "positions",
    "refinement",
    "rotor",
)


def read_settings(settings: dict[str, object]) -> Discretisation:
    """Discretisation from settings.

    Known are ``analysis`` (``static`` or ``transient``, the latter with currents induced in the
    rotor), ``positions``, ``cogging_positions``, ``orders_per_slot``, ``iron_rings`` (see
    `Discretisation`), ``refinement`` (cells and positions times this), ``cells`` (a table with
    the fields of `Resolution`) and ``rotor`` (``uniform`` or ``separate``: the spaces between the
    magnets as permeable as these, or non-magnetic, see `separate_magnets`). With ``separate``
    torque, forces, losses and linkages have the spaces; displacement stiffness, the nonlinear force
    curve and the field picture keep the uniform rotor. Every magnet segment conducts on its own in
    both analyses and with either rotor (`conducting_magnets`). The static one takes the static
    field's harmonics and lets the currents weaken them as under smooth perfect iron, which puts
    the losses of magnets and sleeve within 2 % of the transient analysis (16 random machines of
    each of the 15 families of the shipped studies, median 0.1 %); with a sleeve of titanium within
    8 % and 17 % (40 machines, median 0.1 and 0.3 %), far off only where the stator saturates: with
    a linear one the worst eight stay within 2 %.

    Raises
    ------
    EvaluatorError
        If a setting is unknown or has a value out of its range.
    """
    result = Discretisation()
    try:
        for name, value in settings.items():
            if name not in KNOWN:
                msg = (
                    f"the finite-element evaluator has no setting {name!r}; it has "
                    f"{', '.join(KNOWN)}"
                )
                raise EvaluatorError(msg)
            if name == "analysis":
                if value not in ANALYSES:
                    msg = f"setting analysis = {value!r} must be {' or '.join(ANALYSES)}"
                    raise EvaluatorError(msg)
                result = replace(result, transient=value == "transient")
            elif name == "rotor":
                if value not in ROTORS:
                    msg = f"setting rotor = {value!r} must be {' or '.join(ROTORS)}"
                    raise EvaluatorError(msg)
                result = replace(result, separate_magnets=value == "separate")
            elif name == "cells":
                result = replace(result, resolution=_cells(value))
            elif name == "positions":
                result = replace(result, positions=_whole(name, value))
            elif name == "cogging_positions":
                result = replace(result, cogging_positions=_whole(name, value))
            elif name == "orders_per_slot":
                result = replace(result, orders_per_slot=_whole(name, value))
            elif name == "iron_rings":
                result = replace(result, iron_rings=_whole(name, value))
        if "refinement" in settings:
            result = result.refined(_whole("refinement", settings["refinement"]))
    except ValueError as error:
        if isinstance(error, EvaluatorError):
            raise
        raise EvaluatorError(str(error)) from error
    return result


def _whole(name: str, value: object) -> int:
    if isinstance(value, bool) or not isinstance(value, int) or value < 1:
        msg = f"setting {name} = {value!r} must be a whole number of at least 1"
        raise EvaluatorError(msg)
    return value


def _cells(value: object) -> Resolution:
    known = [item.name for item in fields(Resolution)]
    if not isinstance(value, dict) or not set(value) <= set(known):
        msg = f"setting cells = {value!r} must be a table with some of {', '.join(known)}"
        raise EvaluatorError(msg)
    return replace(Resolution(), **{name: _whole(name, item) for name, item in value.items()})
