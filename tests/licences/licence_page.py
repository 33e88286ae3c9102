"""Write `studies/LICENCES.md`: licences of what hovergap needs at run time.

    python tests/licences/licence_page.py

reads pyproject.toml and what is installed; `packaging` comes with pytest.
"""

from __future__ import annotations

import platform
import re
import tomllib
from dataclasses import dataclass, field
from datetime import UTC, datetime
from importlib.metadata import PackageMetadata, metadata, requires
from pathlib import Path

from packaging.requirements import Requirement
from packaging.utils import canonicalize_name

PROJECT = Path(__file__).parents[2]
PAGE = PROJECT / "studies" / "LICENCES.md"

PURPOSES = {
    "numpy": "arrays, linear algebra",
    "scipy": "special functions, sparse matrices, statistics",
    "pyarrow": "archive and tables: Parquet, Arrow",
    "pymoo": "weights of the search",
    "moocore": "hypervolume and non-dominated sets",
    "joblib": "worker processes",
    "cloudpickle": "sending problems to worker processes",
    "threadpoolctl": "one thread of linear algebra in each worker",
    "filelock": "one search to a folder",
    "click": "command line",
    "numba": "compiled kernels of the finite-element solver",
    "pydantic": "checking study files",
    "tree-sitter": "line numbers and syntax errors of study files",
    "tree-sitter-toml": "the grammar of TOML for it",
    "salib": "Sobol and delta indices",
    "ezdxf": "DXF drawings",
    "xlsxwriter": "spreadsheets of fronts",
    "matplotlib": "field pictures, curves of sensitivity",
    "bokeh": "the HTML report",
    "typst": "the PDF sheet",
    "distributed": "evaluating on a cluster (optional: extra `cluster`)",
}

# Read from the licence texts, where the metadata hold no expression that says which one it is.
READ = {
    "contourpy": "BSD-3-Clause",
    "cycler": "BSD-3-Clause",
    "graphemeu": "MIT",
    "jinja2": "BSD-3-Clause",
    "kiwisolver": "BSD-3-Clause",
    "matplotlib": "Matplotlib licence (based on PSF-2.0)",
    "numba": "BSD-2-Clause",
    "scipy": "BSD-3-Clause",
    "sortedcontainers": "Apache-2.0",
}

INTRODUCTION = """\
# Licences of the dependencies

What hovergap needs at run time, with everything these packages need in turn, as installed on
{date} on {system}; written by `python tests/licences/licence_page.py`, do not edit. Hovergap itself
is Apache-2.0 and contains none of them. All are permissive but moocore, whose LGPL leaves programs
that import it as they are. Wheels may carry libraries under licences of their own, which their
`dist-info` folders list: OpenBLAS (BSD-3-Clause) and the run-time library of GCC (GPL-3.0 with its
run-time exception) in numpy and scipy, LLVM in llvmlite, Arrow's parts in pyarrow.

What leaves the program carries parts of two: the HTML report holds BokehJS (BSD-3-Clause, its
notice inside), the PDF sheet the letters it uses of Libertinus Serif (OFL-1.1) and DejaVu Sans Mono
(Bitstream Vera licence), which may be embedded in documents.

| package | licence | what for |
| --- | --- | --- |
"""


@dataclass
class Package:
    """One distribution: how it is licensed, and which others asked for it."""

    name: str
    licence: str
    purpose: str = ""
    needed_by: list[str] = field(default_factory=list)


def direct() -> list[str]:
    """Names of the run-time dependencies in pyproject.toml, those of the cluster included."""
    project = tomllib.loads((PROJECT / "pyproject.toml").read_text())["project"]
    lines = [*project["dependencies"], *project["optional-dependencies"]["cluster"]]
    return [canonicalize_name(Requirement(line).name) for line in lines]


def closure() -> dict[str, Package]:
    """All installed distributions that the run-time dependencies lead to."""
    found: dict[str, Package] = {}
    waiting = [(name, "") for name in direct()]
    while waiting:
        name, parent = waiting.pop(0)
        if name not in found:
            found[name] = Package(name, licence(name, metadata(name)), PURPOSES.get(name, ""))
            for line in requires(name) or []:
                wanted = Requirement(line)
                if wanted.marker is None or wanted.marker.evaluate({"extra": ""}):
                    waiting.append((canonicalize_name(wanted.name), name))
        if parent and parent not in found[name].needed_by:
            found[name].needed_by.append(parent)
    return found


def licence(name: str, entry: PackageMetadata) -> str:
    """The SPDX expression; else what was read, a short licence line or the classifier."""
    expression, line = entry.get("License-Expression"), (entry.get("License") or "").strip()
    if expression or name in READ:
        return expression or READ[name]
    if line and "\n" not in line and len(line) < 40:
        return line
    named = [
        item.rsplit(" :: ", 1)[1].removesuffix(" License")
        for item in entry.get_all("Classifier") or []
        if item.startswith("License :: OSI Approved :: ")
    ]
    return " or ".join(named) or "unknown"


def page() -> str:
    """The whole page."""
    text = INTRODUCTION.format(date=datetime.now(UTC).date().isoformat(), system=platform.system())
    rows = sorted(closure().values(), key=lambda item: (not item.purpose, item.name))
    for item in rows:
        purpose = item.purpose or f"needed by {', '.join(sorted(item.needed_by))}"
        text += f"| {item.name} | {item.licence} | {purpose} |\n"
    return text


def listed() -> dict[str, str]:
    """Licence of every package on the page as it is."""
    rows = re.findall(r"^\| ([a-z][a-z0-9-]*) \| (.+?) \| .+ \|$", PAGE.read_text(), re.MULTILINE)
    return {name: kind for name, kind in rows if name != "package"}


if __name__ == "__main__":
    PAGE.write_text(page())
