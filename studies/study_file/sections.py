"""One table of a study file through its model, mistakes turned into findings a user can act on."""

from __future__ import annotations

import types
from typing import Any, Literal, TypeVar, Union, get_args, get_origin

from pydantic import BaseModel, ValidationError
from pydantic.fields import FieldInfo

from studies.errors import Finding, Path, quoted
from studies.suggestions import suffix, suggest, unknown

Model = TypeVar("Model", bound=BaseModel)

UNIT_TEXT = {
    "rpm": "r/min",
    "C": "°C",
    "um": "µm",
    "mm_s": "mm/s",
    "A_mm2": "A/mm2",
    "Nm": "N m",
    "m_s": "m/s",
    "L_min": "L/min",
    "L_s": "L/s",
    "W_m2K": "W/(m2 K)",
    "W_mK": "W/(m K)",
    "kg_cm2": "kg cm2",
    "N_mm": "N/mm",
    "kg_m3": "kg/m3",
    "uPa_s": "uPa s",
    "J_kgK": "J/(kg K)",
}
TYPE_TEXT = {
    "float_type": "a number",
    "int_type": "a whole number",
    "int_from_float": "a whole number",
    "string_type": "text in quotes",
    "dict_type": "a table",
    "model_type": "a table",
    "list_type": "a list",
    "bool_type": "true or false",
}


def validated(model: type[Model], table: object, path: Path) -> tuple[Model | None, list[Finding]]:
    """Read `table` as `model`.

    Returns
    -------
    model or None, list of Finding
        None exactly if there are findings, all of them below `path`.
    """
    if not isinstance(table, dict):
        problem = f"must be a table (got {quoted(table)})"
        return None, [Finding(path, problem, f"write {', '.join(model.model_fields)} below it")]
    try:
        return model.model_validate(table), []
    except ValidationError as error:
        return None, [
            _finding(model, item["type"], item["loc"], item["input"], item.get("ctx", {}), path)
            for item in error.errors(include_url=False)
        ]


def unit_of(key: str) -> str:
    """Unit that the suffix of `key` states, empty if it has none."""
    return UNIT_TEXT.get(suffix(key), suffix(key))


def range_text(key: str, field: FieldInfo) -> str:
    """What may stand behind `key`, in words: kind, range and unit."""
    choices = _choices(field.annotation)
    if choices:
        return "one of " + ", ".join(quoted(choice) for choice in choices)
    low = next((item.ge for item in field.metadata if hasattr(item, "ge")), None)
    high = next((item.le for item in field.metadata if hasattr(item, "le")), None)
    unit = f" {unit_of(key)}" if unit_of(key) else ""
    number = "a whole number" if int in _kinds(field.annotation) else "a number"
    if low is not None and high is not None:
        return f"{number} from {low:,} to {high:,}{unit}"
    return "text in quotes" if str in _kinds(field.annotation) else f"{number}{unit}"


def _finding(
    model: type[BaseModel],
    kind: str,
    place: tuple[int | str, ...],
    value: object,
    context: dict[str, Any],
    path: Path,
) -> Finding:
    fields = model.model_fields
    here = (*path, *(part for part in place if not str(part).startswith("function-")))
    key = str(place[0]) if place else ""
    if kind == "extra_forbidden":
        problem = f"{unknown('key', key)} in this section (got {quoted(value)})"
        return Finding(here, problem, suggest(key, fields))
    if key not in fields:
        return Finding(here, f"must be a table (got {quoted(value)})")
    field = fields[key]
    wanted = range_text(key, field)
    if kind == "missing":
        return Finding(here, "is missing", f"give {field.description}: {wanted}")
    if kind == "literal_error":
        known = [str(choice) for choice in _choices(field.annotation)]
        remedy = suggest(value, known) if isinstance(value, str) else f"give {wanted}"
        return Finding(here, f"is no such choice (got {quoted(value)})", remedy)
    if kind == "string_too_long":
        most = context.get("max_length")
        return Finding(here, f"has {len(str(value)):,} characters", f"at most {most} will do")
    if kind in TYPE_TEXT and len(place) > 1:
        return Finding(here, f"must be {TYPE_TEXT[kind]} (got {quoted(value)})")
    if kind in TYPE_TEXT:
        problem = f"must be {TYPE_TEXT[kind]} (got {quoted(value)})"
        return Finding(here, problem, f"give {field.description}: {wanted}")
    if kind in ("greater_than_equal", "less_than_equal"):
        side = "too small" if kind == "greater_than_equal" else "too large"
        remedy = f"give {field.description}: {wanted}"
        return Finding(here, f"is {side} (got {quoted(value)})", remedy)
    return Finding(here, f"cannot be used (got {quoted(value)})", f"give {wanted}")


def _kinds(annotation: Any) -> tuple[Any, ...]:
    if get_origin(annotation) in (Union, types.UnionType):
        return get_args(annotation)
    return (annotation,)


def _choices(annotation: Any) -> tuple[Any, ...]:
    return get_args(annotation) if get_origin(annotation) is Literal else ()
