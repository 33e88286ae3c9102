"""What a sheet consists of, whatever it is printed with."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Heading:
    """Title of a section."""

    text: str


@dataclass(frozen=True)
class Text:
    """A paragraph."""

    text: str


@dataclass(frozen=True)
class Cautions:
    """Sentences that must be read."""

    items: tuple[str, ...]


@dataclass(frozen=True)
class Grid:
    """A table; the first `words` columns are set to the left, numbers to the right.

    `weights` are the relative widths of the columns on paper, all alike if empty.
    """

    head: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    words: int = 1
    weights: tuple[float, ...] = ()


@dataclass(frozen=True)
class Drawing:
    """An SVG picture with a caption; `width` is a share of the page's."""

    svg: str
    caption: str
    width: float = 0.7


Block = Heading | Text | Cautions | Grid | Drawing


@dataclass(frozen=True)
class Sheet:
    """A whole sheet."""

    title: str
    subtitle: str
    footer: str
    blocks: tuple[Block, ...]
