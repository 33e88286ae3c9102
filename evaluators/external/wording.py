"""Foreign text made fit for a reason: one line, printable, not endless."""

from __future__ import annotations

LONGEST_QUOTE = 80
LONGEST_REASON = 500


def plain(text: str, longest: int) -> str:
    """`text` on one line without control characters or lone surrogates, cut to `longest`."""
    line = " ".join("".join(sign if sign.isprintable() else " " for sign in text).split())
    return line if len(line) <= longest else f"{line[: longest - 3]}..."


def quoted(value: object) -> str:
    """`value` of a reply for a message."""
    try:
        text = repr(value)
    except ValueError:  # an integer of more digits than Python prints
        text = "an integer of thousands of digits"
    return plain(text, LONGEST_QUOTE)
