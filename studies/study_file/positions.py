"""Line of every key and list element of a TOML text."""

from __future__ import annotations

import tomllib

from tree_sitter import Language, Node, Parser
from tree_sitter_toml import language

from studies.errors import Path

Positions = dict[Path, int]


def positions(text: str) -> Positions:
    """Map each path of a valid TOML text to its line, counted from 1.

    Tables count from their first header or dotted key, elements of lists from themselves. The
    walk keeps its own stack, so a deeply nested file does not exhaust Python's.
    """
    source = text.encode()
    root = Parser(Language(language())).parse(source).root_node
    found: Positions = {}
    lengths: dict[Path, int] = {}  # of arrays of tables

    def note(path: Path, node: Node) -> None:
        for end in range(1, len(path) + 1):
            found.setdefault(path[:end], node.start_point[0] + 1)

    def absolute(keys: tuple[str, ...]) -> Path:
        """Header keys with the position of the last element of each array of tables passed."""
        path: Path = ()
        for key in keys:
            path = (*path, key)
            if path in lengths:
                path = (*path, lengths[path] - 1)
        return path

    stack: list[tuple[Node, Path]] = []
    for child in root.named_children:
        path: Path = ()
        if child.type == "table_array_element":
            *parents, last = _keys(child.named_children[0])
            array = (*absolute(tuple(parents)), last)
            lengths[array] = lengths.get(array, 0) + 1
            path = (*array, lengths[array] - 1)
            note(path, child)
        elif child.type == "table":
            path = absolute(_keys(child.named_children[0]))
            note(path, child)
        pairs = [child] if child.type == "pair" else child.named_children[1:]
        stack += [(pair, path) for pair in reversed(pairs)]
        while stack:
            node, base = stack.pop()
            if node.type == "pair":
                inner = (*base, *_keys(node.named_children[0]))
                note(inner, node)
                stack.append((node.named_children[-1], inner))
            elif node.type == "inline_table":
                stack += [(item, base) for item in reversed(node.named_children)]
            elif node.type == "array":
                items = [item for item in node.named_children if item.type != "comment"]
                for index, item in enumerate(items):
                    note((*base, index), item)
                    stack.append((item, (*base, index)))
    return found


def line_of(found: Positions, path: Path) -> int | None:
    """Line of `path`, or of the nearest enclosing key that stands in the file."""
    for end in range(len(path), 0, -1):
        if path[:end] in found:
            return found[path[:end]]
    return None


def _keys(node: Node) -> tuple[str, ...]:
    """Parts of a bare, quoted or dotted key, in order."""
    parts: list[str] = []
    stack = [node]
    while stack:
        item = stack.pop()
        if item.type == "dotted_key":
            stack += reversed(item.named_children)
            continue
        word = (item.text or b"").decode()
        if item.type == "quoted_key":
            # The TOML reader itself knows the escapes.
            word = next(iter(tomllib.loads(f"{word} = 0")))
        parts.append(word)
    return tuple(parts)
