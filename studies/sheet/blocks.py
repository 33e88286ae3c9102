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
    """A table; the first `words` and the last `tail` columns are set to the left, others right.

    `weights` are the relative widths of the columns on paper, all alike if empty.
    """

    head: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    words: int = 1
    tail: int = 0
    weights: tuple[float, ...] = ()

    def left(self, column: int) -> bool:
        """Whether a column holds words."""
        return column < self.words or column >= len(self.head) - self.tail


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
