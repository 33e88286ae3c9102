"""How frozen data refuse a number: one sentence with owner, name, value and limits."""

from __future__ import annotations


def require(owner: str, name: str, value: float, low: float, high: float) -> None:
    """Raise unless `value` lies between `low` and `high`, both allowed.

    Raises
    ------
    ValueError
        Naming owner, quantity, value and limits; also for a value that is not a number.
    """
    if not low <= value <= high:
        msg = f"{owner}: {name} = {value:g} must lie between {low:g} and {high:g}"
        raise ValueError(msg)


def require_choice(owner: str, name: str, value: str, choices: tuple[str, ...]) -> None:
    """Raise unless `value` is one of `choices`.

    Raises
    ------
    ValueError
        Naming owner, quantity, value and choices.
    """
    if value not in choices:
        listed = f"{', '.join(choices[:-1])} or {choices[-1]}" if len(choices) > 1 else choices[0]
        msg = f"{owner}: {name} = {value!r} must be {listed}"
        raise ValueError(msg)
