"""Every public formula of the machine says in its docstring where it comes from."""

from __future__ import annotations

import ast
import re
from pathlib import Path

import pytest

import evaluators.machine

ROOMS = ("losses", "thermal", "mechanics", "drive")
ROOT = Path(evaluators.machine.__file__).parent
# A year, a standard, a *Title*, a law, an admission, or the `function` that says it.
SOURCE = re.compile(
    r"\b(1[89]|20)\d\d\b|\b(IEC|ISO|DIN|API) |\*[A-Z][^*]+\*|`[\w.]+`"
    r"|from memory|common practice|closed form|[Dd]efinition|\w+'s law|IAPWS"
)


def formulas() -> list[tuple[str, str]]:
    """Name and docstring (that of the file included) of every public function."""
    found = []
    for file in sorted(path for room in ROOMS for path in (ROOT / room).glob("*.py")):
        tree = ast.parse(file.read_text())
        found += [
            (
                f"{file.parent.name}/{file.name}: {node.name}",
                f"{ast.get_docstring(tree)}\n{ast.get_docstring(node)}",
            )
            for node in tree.body
            if isinstance(node, ast.FunctionDef) and not node.name.startswith("_")
        ]
    return found


@pytest.mark.parametrize(("name", "text"), formulas(), ids=lambda item: item.partition("\n")[0])
def test_a_formula_names_its_source(name: str, text: str) -> None:
    assert SOURCE.search(text), name


def test_there_are_formulas() -> None:
    assert len(formulas()) > 50  # or the rooms have moved
