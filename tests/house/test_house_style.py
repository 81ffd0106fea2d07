"""Sizes, names, words and docstrings that the whole project keeps to."""

import ast
import re
from pathlib import Path

CHECKOUT = Path(__file__).resolve().parents[2]
PACKAGE = CHECKOUT / "src" / "plumbwell"
SOURCES = sorted(PACKAGE.rglob("*.py"))
TESTS = sorted((CHECKOUT / "tests").rglob("*.py"))
LONGEST = 500
NAMELESS = {"utils", "util", "helpers", "helper", "common", "misc", "manager", "core"}
# Put together from halves, so that this file does not hold them.
UNFINISHED = re.compile(
    r"\b(?:" + "|".join(a + b for a, b in (("TO", "DO"), ("FIX", "ME"), ("XX", "X"), ("HA", "CK"))) + r")\b"
    r"|\bplace" + r"holder(?!Text)|\bfor " + r"now\b|\bnot " + r"implemented\b|\bNotImpl" + r"ementedError\b",
    re.IGNORECASE,
)


def shown(path: Path) -> str:
    """Path as seen from the checkout."""
    return path.relative_to(CHECKOUT).as_posix()


def without_docstring(tree: ast.AST, owner: str) -> list[str]:
    """Public functions, classes and methods below a node that say nothing about themselves."""
    found = []
    for node in getattr(tree, "body", []):
        if not isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef | ast.ClassDef):
            continue
        # Qt's events are overridden under Qt's own names, and Qt describes them.
        if node.name.startswith("_") or re.match(r"[a-z]+[A-Z]", node.name):
            continue
        if not ast.get_docstring(node):
            found.append(f"{owner}:{node.lineno} {node.name}")
        if isinstance(node, ast.ClassDef):
            found += without_docstring(node, owner)
    return found


def test_no_file_is_longer_than_500_lines():
    long = [
        f"{shown(path)}: {count}"
        for path in [*SOURCES, *TESTS, CHECKOUT / "bootstrap.py"]
        if (count := len(path.read_text("utf-8").splitlines())) > LONGEST
    ]
    assert not long, "\n".join(long)


def test_each_room_opens_with_its_docstring_and_nothing_else():
    for path in PACKAGE.glob("*/__init__.py"):
        body = ast.parse(path.read_text("utf-8")).body
        assert len(body) == 1 and ast.get_docstring(ast.Module(body, [])), shown(path)


def test_no_file_or_folder_has_a_name_that_says_nothing():
    found = [shown(path) for path in [*SOURCES, *TESTS] if NAMELESS & set(re.split(r"[_.]", path.name))]
    found += [shown(path) for path in PACKAGE.rglob("*") if path.is_dir() and path.name in NAMELESS]
    assert not found, "\n".join(found)


def test_nothing_is_left_unfinished():
    found = []
    for path in [*SOURCES, *TESTS, CHECKOUT / "bootstrap.py", CHECKOUT / "pyproject.toml"]:
        for number, line in enumerate(path.read_text("utf-8").splitlines(), 1):
            if UNFINISHED.search(line):
                found.append(f"{shown(path)}:{number}: {line.strip()}")
    assert not found, "\n".join(found)


def test_every_module_and_everything_public_says_what_it_is():
    found = []
    for path in SOURCES:
        tree = ast.parse(path.read_text("utf-8"))
        if not ast.get_docstring(tree):
            found.append(f"{shown(path)} has no docstring")
        found += without_docstring(tree, shown(path))
    assert not found, "\n".join(found)


def test_test_files_have_names_of_their_own():
    names = [path.name for path in TESTS if path.name.startswith("test_")]
    assert sorted(names) == sorted(set(names))


def test_no_widget_overrides_event():
    """With such an override an error in a paintEvent ends the process; see `desk/parts/hints.py`."""
    found = [
        shown(path)
        for path in SOURCES
        if re.search(r"def (event|viewportEvent)\(self", path.read_text("utf-8"))
    ]
    assert not found, "\n".join(found)
