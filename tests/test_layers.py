"""The file list tells the physics: every module has a layer, imports point one way, and --help stays light."""

from __future__ import annotations

import ast
import subprocess
import sys
from graphlib import CycleError, TopologicalSorter
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parents[1] / "pertcalc"

# A module or package may import what stands before it, never what stands after it. Add a new one at its place.
LAYERS = [
    "errors",
    "names",
    "shipped",
    "constants",
    "units",  # words -> numbers
    "angular",
    "quadrature",
    "parallel",
    "species",  # data
    "measured",
    "results",  # what is handed to the user
    "thermal",  # averages of tabulated cross sections; knows no collision
    "curves",
    "one_electron",
    "collisions",
    "closed",
    "model_error",
    "rates",
    "sampling",
    "spread",
    "ensemble_result",
    "ensemble",
    "molecules",
    "vapour",
    "validation",
    "report",
    "cli_options",  # words only
    "cli_curves",
    "cli_molecule",
    "cli_verdict",
    "cli",
    "__main__",
]
# Heavy libraries that nothing on the way to `pertcalc --help` may load.
HEAVY = ("numpy", "scipy", "matplotlib", "pandas", "pint")

FILES = sorted(path for path in PACKAGE.rglob("*.py") if path != PACKAGE / "__init__.py")


def module_name(path: Path) -> str:
    parts = path.relative_to(PACKAGE.parent).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


MODULES = {module_name(path) for path in FILES} | {"pertcalc"}


def imported_modules(tree: ast.AST, path: Path) -> set[str]:
    """Dotted names of the pertcalc modules a file imports, at its top or inside a function."""
    found: set[str] = set()
    package = [*path.relative_to(PACKAGE.parent).parent.parts]
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            base = package[: len(package) - node.level + 1] if node.level else []
            origin = ".".join([*base, *([node.module] if node.module else [])])
            for alias in node.names:
                below = f"{origin}.{alias.name}"
                found.add(below if below in MODULES else origin)
    return {name for name in found if name.split(".")[0] == "pertcalc"}


def layer(module: str) -> str:
    return module.split(".")[1]


def test_every_module_has_a_layer_and_every_layer_a_module():
    present = {layer(module_name(path)) for path in FILES}
    assert present <= set(LAYERS), f"add {sorted(present - set(LAYERS))} to LAYERS at the right place"
    missing = set(LAYERS) - present
    assert not missing, f"LAYERS names modules that do not exist: {sorted(missing)}"


@pytest.mark.parametrize("path", FILES, ids=lambda path: module_name(path))
def test_imports_point_one_way(path):
    here = layer(module_name(path))
    for used in imported_modules(ast.parse(path.read_text(encoding="utf-8")), path):
        if used == "pertcalc":  # the facade: only its version may be read from inside
            continue
        there = layer(used)
        assert used in MODULES, f"{module_name(path)} imports {used}, which does not exist"
        assert there == here or LAYERS.index(there) < LAYERS.index(here), f"{module_name(path)} must not import {used}"


@pytest.mark.parametrize("path", FILES, ids=lambda path: module_name(path))
def test_only_the_version_is_taken_from_the_facade(path):
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.ImportFrom) and node.module == "pertcalc" and not node.level:
            names = {alias.name for alias in node.names if f"pertcalc.{alias.name}" not in MODULES}
            assert names <= {"__version__"}, f"{module_name(path)}: import {names} from its own module"


def test_no_circle_inside_a_package():
    graph = {module_name(path): imported_modules(ast.parse(path.read_text(encoding="utf-8")), path) for path in FILES}
    graph = {module: {used for used in uses if used != module} for module, uses in graph.items()}
    try:
        tuple(TopologicalSorter(graph).static_order())
    except CycleError as circle:
        pytest.fail(f"modules import each other in a circle: {' -> '.join(circle.args[1])}")


def test_the_checker_sees_what_it_must():
    """The rules above are only worth something if imports of every spelling are found."""
    source = (
        "import pertcalc.report.tables\nfrom pertcalc import rates\nfrom . import forms\nfrom ..species import alkali\n"
        "def f():\n    from pertcalc.cli import main\n"
    )
    found = imported_modules(ast.parse(source), PACKAGE / "curves" / "example.py")
    expected = {"pertcalc.report.tables", "pertcalc.rates", "pertcalc.curves.forms", "pertcalc.species", "pertcalc.cli"}
    assert found == expected


@pytest.mark.parametrize("module", ["pertcalc", "pertcalc.cli", "pertcalc.errors"])
def test_the_way_to_help_loads_nothing_heavy(module):
    code = f"import sys, {module}; print(*[name for name in {HEAVY!r} if name in sys.modules])"
    ran = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, cwd=PACKAGE.parent)
    assert ran.stdout.split() == [], f"import {module} loads {ran.stdout.strip()}: import it inside the function"
