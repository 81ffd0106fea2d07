"""readings.csv with the use and the note of some rows changed, and every other character as it was.

Blanks, quotes, comments, line ends and the byte-order mark stay; a column `use` or `note` that is missing is added
behind the last one.
"""

from __future__ import annotations

import re
from collections.abc import Mapping

from plumbwell.files.collected import Collected
from plumbwell.files.known_columns import match_columns
from plumbwell.files.readings_table import COLUMNS
from plumbwell.files.text_table import read_table

BOM = b"\xef\xbb\xbf"
_LINE_END = re.compile("(\r\n|\n|\r)")
_BLANKS = " \t"

Changes = Mapping[int, str]
"""Text of a cell by row of the table."""


def edited_readings(data: bytes, *, uses: Changes, notes: Changes) -> bytes:
    """The bytes of a table of readings with some cells of the columns `use` and `note` changed.

    Parameters
    ----------
    data : bytes
        Of a table that can be read.
    uses, notes : mapping of int to str
        The new cells, by row of the table, the first being 0.

    Raises
    ------
    ValueError
        When the table cannot be read.
    """
    table = read_table(data, file="readings", rows_are="readings", collected=Collected())
    if table is None:
        raise ValueError("the table of readings cannot be read")
    matched = match_columns(table, COLUMNS, Collected())
    width = len(table.raw.headings)
    bom, text = (BOM, data[len(BOM) :]) if data.startswith(BOM) else (b"", data)
    pieces = _LINE_END.split(text.decode("utf-8"))
    headings: list[str] = []
    places: dict[str, int] = {}
    for name, changes in (("use", uses), ("note", notes)):
        if changes:
            places[name] = matched.places.get(name, width + len(headings))
            if name not in matched.places:
                headings.append(name)
    if headings:
        header = 2 * (table.header_line - 1)
        pieces[header] = _lengthened(pieces[header], width, headings)
    lines = (2 * (table.lines - 1)).tolist()
    empty = [""] * len(headings)
    rows = range(len(lines)) if headings else sorted({*uses, *notes})
    for row in rows:
        line = pieces[lines[row]]
        if headings:
            line = _lengthened(line, width, empty)
        if row in uses:
            line = _with_cell(line, places["use"], uses[row])
        if row in notes:
            line = _with_cell(line, places["note"], notes[row])
        pieces[lines[row]] = line
    return bom + "".join(pieces).encode("utf-8")


def cell_spans(line: str) -> list[tuple[int, int]]:
    """Where the cells of a line begin and end, between its commas; the quotes of the line are right."""
    if '"' not in line:
        spans, at = [], 0
        for cell in line.split(","):
            spans.append((at, at + len(cell)))
            at += len(cell) + 1
        return spans
    spans, at = [], 0
    while True:
        start = at
        while start < len(line) and line[start] in _BLANKS:
            start += 1
        end = start
        if line[start : start + 1] == '"':
            end = start + 1
            while True:
                end = line.index('"', end) + 1
                if line[end : end + 1] != '"':
                    break
                end += 1
        comma = line.find(",", end)
        spans.append((at, len(line) if comma < 0 else comma))
        if comma < 0:
            return spans
        at = comma + 1


def _lengthened(line: str, width: int, cells: list[str]) -> str:
    """A line with cells added behind its own, in place of the empty one that a comma at its end makes."""
    own = line.count(",") + 1
    if own != width or '"' in line:
        line = line[: cell_spans(line)[width - 1][1]]
    return ",".join((line, *cells))


def _with_cell(line: str, place: int, text: str) -> str:
    start, end = cell_spans(line)[place]
    return line[:start] + _cell(text, first=place == 0) + line[end:]


def _cell(text: str, *, first: bool) -> str:
    """A text as a cell; one that would be taken for something else stands in quotes."""
    if "," in text or '"' in text or (first and text.startswith("#")):
        quoted = text.replace('"', '""')
        return f'"{quoted}"'
    return text
