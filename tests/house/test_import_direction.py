"""Imports run one way only, and each room uses the outside libraries that it may, also inside functions."""

import ast
import sys
from pathlib import Path

import pytest

SOURCE = Path(__file__).resolve().parents[2] / "src"
ROOMS = ("earth", "masses", "survey", "reduction", "density", "study", "files", "plates", "desk", "cli")
# The package's own top: what every room may take from it.
OPEN_TO_ALL = {"plumbwell.resources", "plumbwell.__version__"}
# Outside libraries of each room, as prefixes of dotted names.
OUTSIDE = {
    "earth": {"numpy", "erfa"},
    "masses": {"numpy", "numba"},
    "survey": {"numpy"},
    "reduction": {"numpy"},
    "density": {"numpy"},
    "study": {"numpy"},
    "files": {"numpy", "openpyxl", "defusedxml"},
    "plates": {"numpy", "PySide6.QtCore", "PySide6.QtGui", "PySide6.QtSvg"},
    "desk": {"numpy", "PySide6"},
    "cli": set(),
}
# The same for single files, and for what may only be imported inside a function.
IN_FILE = {
    "plumbwell.files.frames": {"pandas"},
    "plumbwell.files.grids": {"tifffile", "pyproj"},
    "plumbwell.files.survey_toml_edits": {"tomlkit"},
}
IN_FUNCTION = {
    "reduction": {"scipy"},
    "density": {"scipy"},
    "plumbwell.survey.units": {"pint"},
}
# Too slow to load for what they would give; F, chi-square and t come from scipy.special.
NEVER = ("scipy.interpolate", "scipy.stats")


def module_name(path: Path) -> str:
    """Dotted name of a source file."""
    parts = path.relative_to(SOURCE).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


def imported_names(source: str, module: str, is_package: bool) -> list[tuple[str, int, bool]]:
    """Every imported dotted name with its line and whether it stands inside a function."""
    found = []

    def visit(node: ast.AST, inside: bool) -> None:
        if isinstance(node, ast.Import):
            found.extend((alias.name, node.lineno, inside) for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            base = node.module or ""
            if node.level:
                package = module.split(".") if is_package else module.split(".")[:-1]
                package = package[: len(package) - node.level + 1]
                base = ".".join([*package, base] if base else package)
            found.extend((f"{base}.{alias.name}", node.lineno, inside) for alias in node.names)
        inside = inside or isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef | ast.Lambda)
        for child in ast.iter_child_nodes(node):
            visit(child, inside)

    visit(ast.parse(source), False)
    return found


def starts_with(name: str, prefixes: set[str]) -> bool:
    """Whether a dotted name is one of the prefixes or lies below one."""
    return any(name == prefix or name.startswith(prefix + ".") for prefix in prefixes)


def breaches(source: str, module: str, is_package: bool = False) -> list[str]:
    """What a file imports against the rules, as sentences."""
    room = module.split(".")[1] if "." in module else ""
    if room not in ROOMS:
        return []
    left = {f"plumbwell.{other}" for other in ROOMS[: ROOMS.index(room) + 1]}
    always = OUTSIDE[room] | IN_FILE.get(module, set())
    inside_only = IN_FUNCTION.get(room, set()) | IN_FUNCTION.get(module, set())
    found = []
    for name, line, inside in imported_names(source, module, is_package):
        top = name.split(".")[0]
        if top == "plumbwell":
            if not starts_with(name, left) and not starts_with(name, OPEN_TO_ALL):
                found.append(f"{module}:{line} imports {name}, which stands to its right")
        elif starts_with(name, set(NEVER)):
            found.append(f"{module}:{line} imports {name}, which is never used")
        elif top not in sys.stdlib_module_names and not starts_with(name, always):
            if not starts_with(name, inside_only):
                found.append(f"{module}:{line} imports {name}, which {room} may not use")
            elif not inside:
                found.append(f"{module}:{line} imports {name} outside a function")
    return found


def test_every_room_imports_only_what_stands_to_its_left_and_what_it_may():
    found = []
    for path in sorted((SOURCE / "plumbwell").rglob("*.py")):
        found += breaches(path.read_text("utf-8"), module_name(path), path.name == "__init__.py")
    assert not found, "\n".join(found)


def test_there_is_no_room_without_a_place_in_the_line():
    folders = {path.parent.name for path in (SOURCE / "plumbwell").glob("*/__init__.py")}
    assert folders <= set(ROOMS)


@pytest.mark.parametrize(
    ("module", "line"),
    [
        ("plumbwell.earth.tide", "from plumbwell.survey.units import si"),
        ("plumbwell.earth.tide", "def f():\n    import plumbwell.files.las"),
        ("plumbwell.density.layers", "from ..study import reduce"),
        ("plumbwell.density.layers", "from .. import study"),
        ("plumbwell.density.layers", "import scipy.linalg"),
        ("plumbwell.density.layers", "def f():\n    from scipy import stats"),
        ("plumbwell.study.reduce", "def f():\n    from scipy import linalg"),
        ("plumbwell.study.reduce", "from PySide6 import QtCore"),
        ("plumbwell.plates.track", "from PySide6 import QtWidgets"),
        ("plumbwell.plates.track", "from PySide6.QtWidgets import QWidget"),
        ("plumbwell.plates.track", "import pyqtgraph"),
        ("plumbwell.files.las", "import pandas as pd"),
        ("plumbwell.survey.units", "import pint"),
        ("plumbwell.survey.column", "def f():\n    import pint"),
        ("plumbwell.study.reduce", "from plumbwell import reduce"),
    ],
)
def test_a_forbidden_import_is_seen(module, line):
    assert len(breaches(line, module)) == 1


@pytest.mark.parametrize(
    ("module", "line"),
    [
        ("plumbwell.density.layers", "def f():\n    from scipy.linalg import solve_banded"),
        ("plumbwell.density.layers", "from plumbwell.earth import constants"),
        ("plumbwell.survey.units", "def f():\n    import pint"),
        ("plumbwell.files.frames", "import pandas as pd"),
        ("plumbwell.plates.track", "from PySide6.QtGui import QPainter"),
        ("plumbwell.study.reduce", "from plumbwell import __version__"),
        ("plumbwell.plates.theme", "from plumbwell.resources import resource"),
        ("plumbwell.cli", "def f():\n    from plumbwell.plates.figure import write_figure"),
    ],
)
def test_an_allowed_import_passes(module, line):
    assert breaches(line, module) == []
