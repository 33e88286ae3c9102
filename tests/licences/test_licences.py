"""The list of licences names every dependency, and none that would bind those who use hovergap."""

from __future__ import annotations

import ast
import re
import sys
from importlib.metadata import packages_distributions

import pytest
from licence_page import PROJECT, PURPOSES, closure, direct, listed
from packaging.utils import canonicalize_name

PERMISSIVE = re.compile(
    r"(MIT|MIT-0|MIT-CMU|BSD|[023]BSD|0BSD|BSD-[23]-Clause|Apache-2\.0( WITH LLVM-exception)?|Zlib"
    r"|CC0-1\.0|PSF-2\.0|Matplotlib licence \(based on PSF-2\.0\)|ISC|Unlicense)"
)


def test_every_direct_dependency_is_listed_with_its_purpose() -> None:
    assert set(direct()) == set(PURPOSES)
    assert set(direct()) <= set(listed())


@pytest.mark.parametrize("source", ["page", "installed"])
def test_all_licences_are_known_and_permissive_but_one(source: str) -> None:
    found = listed()
    if source == "installed":
        found = {name: package.licence for name, package in closure().items()}
    assert len(found) >= len(direct())
    others = {
        name: kind
        for name, kind in found.items()
        if not all(PERMISSIVE.fullmatch(part) for part in re.split(r" AND | OR | or ", kind))
    }
    assert others == {"moocore": "LGPL-2.1-or-later"}


def test_every_import_is_of_a_declared_dependency() -> None:
    imported = set()
    for room in ("optimizer", "evaluators", "studies"):
        for file in (PROJECT / room).rglob("*.py"):
            for node in ast.walk(ast.parse(file.read_text())):
                if isinstance(node, ast.Import):
                    imported |= {item.name.split(".")[0] for item in node.names}
                elif isinstance(node, ast.ImportFrom) and node.level == 0:
                    imported.add(str(node.module).split(".")[0])
    imported -= {*sys.stdlib_module_names, "optimizer", "evaluators", "studies"}
    known = packages_distributions()
    names = {canonicalize_name(name) for module in imported for name in known.get(module, [module])}
    assert names <= set(direct())
