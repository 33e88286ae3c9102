"""Hostile study files for the fuzz tests, and a watch over what is written meanwhile."""

from __future__ import annotations

import copy
import json
import os
import sys
import tomllib
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from hypothesis import strategies as st

TEXTS = (
    "../../escaped",
    "/etc/escaped",
    "..\\escaped",
    "con",
    ".",
    "a" * 300,
    "=1+1",
    "@SUM(A1:A9)",
    "+cmd|' /C calc'!A0",
    "<script>alert(1)</script>",
    "\x1b[31mred\x1b[0m",
    "line\nbreak\ttab\rreturn",
    "nul\0nul",
    "\u202eoverride",
    "$(touch escaped)",
    "`touch escaped`",
    "%s%n{0}{x!r}",
    "",
)
ENDLESS = 10**41
"""Stands for an integer of more digits than Python itself would write."""
texts = st.sampled_from(TEXTS) | st.text(st.characters(exclude_categories=["Cs"]), max_size=20)
numbers = st.sampled_from(
    [0, -1, 1, 2**53 + 1, 10**30, ENDLESS, float("nan"), float("inf"), -0.0, 1e308, 1e-308]
) | st.floats(-1e6, 1e6)
values = st.recursive(
    texts | numbers | st.booleans(),
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(texts, inner, max_size=3),
    max_leaves=6,
)
deep = st.integers(5, 300).map(lambda depth: json.loads("[" * depth + "]" * depth))
programs = st.sampled_from(
    [
        {"name": "external", "settings": {"program": ["touch", "escaped"], "folder": "escaped"}},
        {"name": "external", "settings": {"program": [], "folder": "/"}},
        {"name": "external"},
        {"name": "analytic", "settings": {"slot_modes": 10**9}},
        {"name": "os:system"},
        {"name": "finite_element", "settings": {"refinement": 10**9}},
        {"name": "finite_element", "settings": {"cells": [[]]}},
    ]
)


def places(table: Any, path: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    """Paths of everything in nested tables and lists."""
    items: Any = ()
    if isinstance(table, dict):
        items = list(table.items())
    elif isinstance(table, list):
        items = list(enumerate(table))
    found = [path] if path else []
    for key, value in items:
        found += places(value, (*path, key))
    return found


@st.composite
def hostile_studies(draw: st.DrawFn, text: str) -> bytes:
    """A good study with one to three values replaced, taken out or added."""
    table = tomllib.loads(text)
    for _ in range(draw(st.integers(1, 3))):
        spots = places(table)
        path = draw(st.sampled_from(spots))
        holder = table
        for key in path[:-1]:
            holder = holder[key]
        action = draw(st.sampled_from(["replace", "remove", "add", "evaluator", "name"]))
        if action == "replace":
            holder[path[-1]] = draw(values | deep)
        elif action == "remove":
            del holder[path[-1]]
        elif action == "add" and isinstance(holder, dict):
            holder[draw(texts)] = draw(values)
        elif action == "evaluator":
            table["evaluator"] = copy.deepcopy(draw(programs))  # changed further below
        elif isinstance(table.get("study"), dict):
            table["study"][draw(st.sampled_from(["name", "description"]))] = draw(texts)
        if not places(table):
            break
    return toml(table).encode()


def toml(table: dict[str, Any]) -> str:
    """The table as TOML, every value inline."""
    return "".join(f"{quoted(key)} = {inline(value)}\n" for key, value in table.items())


def quoted(text: str) -> str:
    return json.dumps(text).replace("\x7f", "\\u007f")


def inline(value: Any) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, dict):
        return "{" + ", ".join(f"{quoted(k)} = {inline(v)}" for k, v in value.items()) + "}"
    if isinstance(value, list):
        return "[" + ", ".join(map(inline, value)) + "]"
    if isinstance(value, str):
        text = json.dumps(value, ensure_ascii=False)
        # TOML has no \ud83d pairs, so characters stand as they are but for the control ones.
        return "".join(f"\\u{ord(sign):04x}" if ord(sign) == 0x7F else sign for sign in text)
    if value == ENDLESS:
        return "9" * 5000
    return repr(value)


class Writes:
    """Paths this process has opened for writing, made, moved or linked since `begin`."""

    def __init__(self) -> None:
        self.active = False
        self.paths: list[str] = []
        sys.addaudithook(self._hook)

    def _hook(self, event: str, arguments: Sequence[Any]) -> None:
        if not self.active:
            return
        if event == "open":
            path, _, flags = arguments
            writing = os.O_WRONLY | os.O_RDWR | os.O_CREAT | os.O_TRUNC | os.O_APPEND
            if isinstance(flags, int) and flags & writing and isinstance(path, str | bytes):
                self.paths.append(os.fsdecode(path))
        elif event in ("os.mkdir", "os.remove", "os.rmdir", "os.truncate", "os.chmod"):
            self.paths.append(os.fsdecode(arguments[0]))
        elif event in ("os.rename", "os.link", "os.symlink"):
            self.paths += [os.fsdecode(item) for item in arguments[:2]]
        elif event in ("subprocess.Popen", "os.system", "os.exec", "os.posix_spawn"):
            self.paths.append(f"started {arguments[0]}")

    @contextmanager
    def watched(self) -> Iterator[list[str]]:
        """What is written inside the block."""
        self.paths = []
        self.active = True
        try:
            yield self.paths
        finally:
            self.active = False


def outside(paths: list[str], folder: Path) -> list[str]:
    """Paths that do not lie in `folder`."""
    root = folder.resolve()
    return [
        item
        for item in paths
        if item != os.devnull
        and "__pycache__" not in Path(item).parts  # compiled code of the package itself
        and not (Path(item).resolve() == root or Path(item).resolve().is_relative_to(root))
    ]
