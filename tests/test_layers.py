"""Imports only point down: each layer may use those above it in the list, never those below."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from pathlib import Path

import pytest

import wavejob

PACKAGE = Path(wavejob.__file__).parent
LAYERS = (
    "version",
    "reference",
    "problems",
    "results",
    "reading",
    "models",
    "particles",
    "grid",
    "tabulated",
    "shapes",
    "time_shapes",
    "hamiltonian",
    "levels",
    "newton",
    "wigner",
    "potentials",
    "edges",
    "packets",
    "state",
    "observables",
    "kinds",
    "settings",
    "job",
    "misfit_terms",
    "misfits",
    "loading",
    "families",
    "evolve",
    "classical",
    "machine",
    "limits",
    "on_grid",
    "points",
    "endings",
    "timetable",
    "plan",
    "recording",
    "checks",
    "simulate",
    "ensemble",
    "classical_companion",
    "evidence",
    "outputs",
    "forecast",
    "doubts",
    "reader",
    "variants",
    "standing",
    "run",
    "api",
    "night",
    "report",
    "cli",
    "__init__",
    "__main__",
)
MODULES = sorted(path.relative_to(PACKAGE).as_posix() for path in PACKAGE.rglob("*.py"))


def _layer(module: str) -> str:
    """The layer of a file or name: that of its folder in the package, or its own."""
    first = module.partition("/")[0].removesuffix(".py")
    if first not in LAYERS and ((PACKAGE / first).is_dir() or (PACKAGE / f"{first}.py").is_file()):
        pytest.fail(f"{module} has no layer: give `{first}` a place in LAYERS")
    return first if first in LAYERS else "__init__"  # a name that the package itself offers


def _imports(module: str, text: str) -> Iterator[str]:
    """The layers a module imports from, also inside functions; its own layer left out."""
    parents = ["wavejob", *module.split("/")[:-1]]
    for node in ast.walk(ast.parse(text)):
        if isinstance(node, ast.Import):
            names = [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            above = parents[: len(parents) - node.level + 1] if node.level else []
            base = ".".join([*above, *([node.module] if node.module else [])])
            names = [f"{base}.{alias.name}" for alias in node.names] if base == "wavejob" else [base]
        else:
            continue
        for name in names:
            top, _, rest = name.partition(".")
            if top == "wavejob":
                yield rest.partition(".")[0] or "__init__"


def _upward(module: str, text: str) -> list[str]:
    rank = LAYERS.index(_layer(module))
    own = {_layer(module)} if "/" in module else set()
    layers = (_layer(name) for name in _imports(module, text))
    return [name for name in layers if name not in own and LAYERS.index(name) >= rank]


@pytest.mark.parametrize("module", MODULES)
def test_imports_only_point_down(module: str) -> None:
    assert _upward(module, (PACKAGE / module).read_text(encoding="utf-8")) == []


@pytest.mark.parametrize(
    ("module", "text", "found"),
    [
        ("grid.py", "from .job import Job", ["job"]),
        ("grid.py", "from . import job", ["job"]),
        ("grid.py", "from . import load", ["__init__"]),
        ("grid.py", "from wavejob import cli", ["cli"]),
        ("grid.py", "import wavejob.cli.main", ["cli"]),
        ("grid.py", "import wavejob", ["__init__"]),
        ("evolve/loop.py", "from ..run import simulate", ["run"]),
        ("evolve/loop.py", "def f():\n    from .. import run", ["run"]),
        ("evolve/loop.py", "from ..grid import Grid\nfrom . import plans\nfrom .plans import plan", []),
        ("run.py", "import numpy\nfrom . import job, results", []),
    ],
)
def test_the_test_sees_what_points_up(module: str, text: str, found: list[str]) -> None:
    assert _upward(module, text) == found
