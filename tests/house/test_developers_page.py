"""DEVELOPERS.md tells the truth: its map names every file, its finder leads to what exists."""

import importlib
import re
from pathlib import Path

CHECKOUT = Path(__file__).resolve().parents[2]
PACKAGE = CHECKOUT / "src" / "plumbwell"
REFERENCE = re.compile(r"^(?P<module>[A-Za-z_][\w.]*):(?P<name>[A-Za-z_][\w.]*)$")
COLUMN = re.compile(r"^(?P<table>[a-z_]+)(?:\.csv)?: (?P<heading>.+)$")


def section(heading: str) -> str:
    """Text of DEVELOPERS.md below a heading of the second level."""
    text = (CHECKOUT / "DEVELOPERS.md").read_text("utf-8")
    parts = re.split(rf"^## {heading}\s*$", text, flags=re.MULTILINE)
    assert len(parts) == 2, f"DEVELOPERS.md has no heading, or several: ## {heading}"
    return re.split(r"^## ", parts[1], flags=re.MULTILINE)[0]


def finder_rows() -> list[list[str]]:
    """Cells of each row of the finder table."""
    lines = [line.strip() for line in section("Finder").splitlines() if line.strip().startswith("|")]
    rows = [[cell.strip() for cell in line.strip("|").split("|")] for line in lines]
    return [row for row in rows[1:] if not set("".join(row)) <= set("-: ")]


def code(cell: str) -> list[str]:
    """What stands in backticks in a cell; the whole cell when nothing does."""
    return re.findall(r"`([^`]+)`", cell) or ([] if cell in ("", "-") else [cell])


def resolved(reference: str) -> object:
    """The object that `module:function` names; the module as seen from the package."""
    match = REFERENCE.match(reference)
    assert match, f"{reference!r} is not of the form module:function"
    module = match["module"].removeprefix("plumbwell.")
    value: object = importlib.import_module(f"plumbwell.{module}")
    for name in match["name"].split("."):
        value = getattr(value, name)
    return value


def test_the_finder_leads_to_functions_that_exist():
    rows = finder_rows()
    assert rows
    lost = []
    for row in rows:
        assert len(row) == 4, row
        assert code(row[1]) or code(row[2]), f"{row[0]!r} leads to no function"
        for reference in code(row[1]) + code(row[2]):
            try:
                assert callable(resolved(reference)), reference
            except (ImportError, AttributeError) as error:
                lost.append(f"{row[0]}: {reference}: {error}")
    assert not lost, "\n".join(lost)


def test_the_finder_leads_to_columns_that_are_written():
    tables = importlib.import_module("plumbwell.study.tables").TABLES
    headings = {
        name.removesuffix(".csv"): {column.heading for column in table.columns}
        for name, table in tables.items()
    }
    lost = []
    for row in finder_rows():
        for reference in code(row[3]):
            match = COLUMN.match(reference)
            assert match, f"{reference!r} is not of the form table: column"
            if match["heading"] not in headings.get(match["table"], set()):
                lost.append(f"{row[0]}: {reference}")
    assert not lost, "\n".join(lost)


def test_the_map_names_every_room_and_every_file():
    text = section("Map")
    named = set(re.findall(r"\b(\w+\.py)\b", text))
    files = {path.name for path in PACKAGE.rglob("*.py") if path.name != "__init__.py"}
    rooms = {path.parent.name for path in PACKAGE.glob("*/__init__.py")}
    assert sorted(files - named) == []
    assert sorted(room for room in rooms if not re.search(rf"\b{room}/", text)) == []


def test_the_map_names_no_file_that_is_gone():
    named = set(re.findall(r"\b(\w+\.py)\b", section("Map")))
    known = {path.name for folder in ("src", "tests") for path in (CHECKOUT / folder).rglob("*.py")}
    assert sorted(named - known - {"bootstrap.py"}) == []
