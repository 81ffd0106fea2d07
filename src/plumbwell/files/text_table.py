"""Comma-separated text tables, read strictly: bytes to columns of cells that know their physical line.

UTF-8 only; `#` lines are comments; a cell never holds a line end; a row that does not fit the
header is a problem, never padded, shifted or guessed at. What the cells mean is left to others.
"""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass

import numpy as np

from plumbwell.files.collected import Collected
from plumbwell.files.paths import UnfitFile, text_of
from plumbwell.survey.column import Index, frozen_index
from plumbwell.survey.errors import shown
from plumbwell.survey.readings import RawTable

FORMULA_MARKS = ("=", "+", "-", "@", "\t", "\r")
"""A label that starts so would run as a formula in a spreadsheet."""

EMPTY_ROW = ',; \t"'
"""A row of these characters only has no value."""

MAXIMUM_COLUMNS = 1000
MAXIMUM_CELLS = 20_000_000  # some 2 GiB once every cell is a text of its own

_HEADING = re.compile(r"\s*(.*?)\s*(?:\[\s*([^\[\]]*?)\s*\])?\s*", re.DOTALL)
_BLANK = re.compile(r"\s")


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class TextTable:
    """A table as written.

    Parameters
    ----------
    raw : RawTable
        Headings, cells (blanks around them gone) and physical lines.
    header_line : int
    physical, comments, blanks : int
        Physical lines of the file, and how many of them are comments and blank or without a value:
        rows + comments + blanks + 1 header = physical.
    """

    raw: RawTable
    header_line: int
    physical: int
    comments: int
    blanks: int

    @property
    def file(self) -> str:
        """Name of the file in the survey folder."""
        return self.raw.file

    @property
    def lines(self) -> Index:
        """Physical line of each row."""
        return self.raw.lines

    def __len__(self) -> int:
        return len(self.raw.lines)


def heading_parts(heading: str) -> tuple[str, str | None]:
    """Name and unit of a heading `name [unit]`; the unit is None where there are no brackets."""
    match = _HEADING.fullmatch(heading)
    return (match[1], match[2]) if match else (heading.strip(), None)


def plain_name(name: str) -> str:
    """A name without what must not tell two columns apart: case, blanks, accents."""
    decomposed = unicodedata.normalize("NFKD", name.casefold())
    return "".join(c for c in decomposed if not unicodedata.combining(c) and not c.isspace())


def physical_lines(text: str) -> list[str]:
    """Lines of a text as an editor counts them (LF, CRLF or CR), without what follows a last line end."""
    if "\r" in text:
        text = text.replace("\r\n", "\n").replace("\r", "\n")
    lines = text.split("\n")
    if lines[-1] == "":
        lines.pop()
    return lines


def read_table(data: bytes, *, file: str, rows_are: str, collected: Collected) -> TextTable | None:
    """The table that the bytes of a file hold, or None where it cannot be used.

    Parameters
    ----------
    data : bytes
    file : str
        Name for messages.
    rows_are : str
        What a row is, for the message of an empty table: "readings", "places" ...
    collected : Collected
        Takes every problem: encoding, ragged rows, stray quotes, duplicate headings, no header, no rows.
    """
    try:
        text = text_of(data)
    except UnfitFile as unfit:
        collected.problem(file, unfit.row, None, found=unfit.found, expected=unfit.expected, mend=unfit.mend)
        return None
    if (cells := data.count(b",") + data.count(b"\n") + data.count(b"\r")) > MAXIMUM_CELLS:
        collected.problem(
            file,
            None,
            None,
            found=f"a table of {cells / 1e6:.0f} million cells",
            expected=f"at most {MAXIMUM_CELLS / 1e6:.0f} million",
            mend="thin the rows, or remove the columns that are not needed",
        )
        return None
    lines = physical_lines(text)
    numbers, kept, comments, blanks = _rows_of(lines)
    if not kept:
        found = "an empty file" if not text.strip() else "only comments"
        collected.problem(
            file,
            None,
            None,
            found=f"{found}: no header",
            expected="a first row with the names of the columns",
            mend="write the column names, each measured one with its unit: depth [m]",
        )
        return None
    header = _cells_of(kept[0], file=file, number=numbers[0], collected=collected)
    if header is None:
        return None
    headings = [cell.strip() for cell in header]
    if len(headings) > MAXIMUM_COLUMNS:
        collected.problem(
            file,
            numbers[0],
            None,
            found=f"{len(headings)} columns",
            expected=f"at most {MAXIMUM_COLUMNS}",
            mend="remove the columns that are not needed",
        )
        return None
    if len(kept) == 1:
        collected.problem(
            file,
            numbers[0],
            None,
            found=f"a header and no {rows_are}",
            expected=f"a row for each of the {rows_are}",
            mend="write the rows under the header, or name the file that holds them",
        )
        return None
    rows_before = len(kept)
    numbers, kept = _without_empty(numbers, kept, file=file, collected=collected)
    blanks += rows_before - len(kept)
    if len(kept) == 1:
        return None
    cut = not text.endswith(("\n", "\r"))
    width = len(headings)
    if width == 1 and (mark := next((one for one in (";", "\t") if one in headings[0]), None)):
        collected.problem(
            file,
            numbers[0],
            None,
            found=f"cells parted by {'semicolons' if mark == ';' else 'tabs'}",
            expected="commas between cells",
            mend="export the table with commas between the cells and points as decimal marks",
        )
        return None
    columns = _even_columns(kept[1:], width)
    if columns is None:
        rows = _split_rows(kept[1:], numbers[1:], file=file, collected=collected)
        if rows is None:
            return None
        headings, rows = _without_trailing(headings, rows, file=file, collected=collected)
        if not _fits(headings, rows, numbers, cut=cut, file=file, collected=collected):
            return None
        columns = [_stripped(column) for column in zip(*rows, strict=True)]
    elif not _fits(headings, [], numbers, cut=cut, file=file, collected=collected):
        return None
    if cut:
        collected.note(
            "no_last_line_end",
            "note",
            f"{file}, row {len(lines)}",
            f"the last line of {file} has no line end; if the file was cut there, its last cell may be short",
            "compare the last row with the field log",
        )
    raw = RawTable(
        file=file,
        headings=tuple(headings),
        cells=tuple(columns),
        lines=frozen_index(np.array(numbers[1:], dtype=np.intp)),
    )
    return TextTable(raw=raw, header_line=numbers[0], physical=len(lines), comments=comments, blanks=blanks)


def _rows_of(lines: list[str]) -> tuple[list[int], list[str], int, int]:
    """Physical numbers and texts of the lines that hold cells; how many are comments, how many blank."""
    numbers: list[int] = []
    kept: list[str] = []
    comments = blanks = 0
    for number, line in enumerate(lines, start=1):
        first = line[:1]
        if first <= " " or first >= "\x7f":
            start = line.lstrip()
            if not start:
                blanks += 1
                continue
            first = start[0]
        if first == "#":
            comments += 1
            continue
        numbers.append(number)
        kept.append(line)
    return numbers, kept, comments, blanks


def _without_empty(
    numbers: list[int], kept: list[str], *, file: str, collected: Collected
) -> tuple[list[int], list[str]]:
    """Numbers and texts of the rows without those that hold nothing but commas, each of which is a problem."""
    empty = {
        place
        for place, line in enumerate(kept)
        if place and line[0] in EMPTY_ROW and not line.strip(EMPTY_ROW)
    }
    for place in sorted(empty):
        collected.problem(
            file,
            numbers[place],
            None,
            found="an empty row, commas without values",
            expected="a value in each row",
            mend="remove the row",
        )
    if not empty:
        return numbers, kept
    left = [place for place in range(len(kept)) if place not in empty]
    return [numbers[place] for place in left], [kept[place] for place in left]


def _even_columns(kept: list[str], width: int) -> list[tuple[str, ...]] | None:
    """Columns of rows without quotes that all have as many cells as the header, at once; else None."""
    if {line.count(",") for line in kept} != {width - 1}:
        return None
    joined = ",".join(kept)
    if '"' in joined:
        return None
    cells = joined.split(",")
    if width > 1 and not any(cells[width - 1 :: width]):
        return None  # an empty last column: perhaps commas at the ends of the rows
    columns = [tuple(cells[place::width]) for place in range(width)]
    return [_stripped(column) for column in columns] if _BLANK.search(joined) else columns


def _stripped(column: tuple[str, ...]) -> tuple[str, ...]:
    """A column without blanks around its cells."""
    return tuple(cell.strip() for cell in column) if _BLANK.search("".join(column)) else column


def _split_rows(
    kept: list[str], numbers: list[int], *, file: str, collected: Collected
) -> list[list[str]] | None:
    """Cells of every row, of any number; None when a row's quotes are wrong."""
    rows: list[list[str]] = []
    whole = True
    for line, number in zip(kept, numbers, strict=True):
        if '"' not in line:
            rows.append(line.split(","))
            continue
        cells = _cells_of(line, file=file, number=number, collected=collected)
        if cells is None:
            whole = False
            if collected.full(file):
                return None
        else:
            rows.append(cells)
    return rows if whole else None


def _cells_of(line: str, *, file: str, number: int, collected: Collected) -> list[str] | None:
    """Cells of one line with `"` quoting; None with a problem when a quote is wrong."""
    if '"' not in line:
        return line.split(",")
    cells: list[str] = []
    at = 0
    while True:
        start = at
        while start < len(line) and line[start] in " \t":
            start += 1
        if start < len(line) and line[start] == '"':
            end, parts = start + 1, []
            while True:
                close = line.find('"', end)
                if close < 0:
                    collected.problem(
                        file,
                        number,
                        None,
                        found=f"a quote that is opened and never closed: {shown(line[start:])}",
                        expected="a quoted cell that ends on its own line",
                        mend='close the quote, or write a quote inside a cell twice ("")',
                    )
                    return None
                parts.append(line[end:close])
                if line[close + 1 : close + 2] != '"':
                    break
                parts.append('"')
                end = close + 2
            after = line[close + 1 :].lstrip(" \t")
            if after and not after.startswith(","):
                collected.problem(
                    file,
                    number,
                    None,
                    found=f"text after a closing quote: {shown(line[start:])}",
                    expected="a comma or the end of the line",
                    mend='write a quote inside a cell twice (""), not with a backslash',
                )
                return None
            cells.append("".join(parts))
            comma = line.find(",", close + 1)
        else:
            comma = line.find(",", at)
            cell = line[at : comma if comma >= 0 else len(line)]
            if '"' in cell:
                collected.problem(
                    file,
                    number,
                    None,
                    found=f"a quote inside a cell: {shown(cell.strip())}",
                    expected="quotes around the whole cell, or none",
                    mend='put the whole cell in quotes and write the quote inside it twice ("")',
                )
                return None
            cells.append(cell)
        if comma < 0:
            return cells
        at = comma + 1


def _without_trailing(
    headings: list[str], rows: list[list[str]], *, file: str, collected: Collected
) -> tuple[list[str], list[list[str]]]:
    """Headings and rows without the empty last cell that a comma at the end of every row makes."""
    width = len(headings) - 1 if headings[-1] == "" else len(headings)
    if width and all(len(row) == width + 1 and not row[-1].strip() for row in rows):
        collected.note(
            "trailing_comma",
            "note",
            file,
            f"every row of {file} ends with a comma; the empty last column is left out",
            "remove the commas at the ends of the rows",
        )
        return headings[:width], [row[:width] for row in rows]
    return headings, rows


def _fits(
    headings: list[str],
    rows: list[list[str]],
    numbers: list[int],
    *,
    cut: bool,
    file: str,
    collected: Collected,
) -> bool:
    """True when headings are named and different and every row has as many cells as the header.

    `cut`: the last line of the file has no line end, so that a short last row may be half a row.
    """
    width, fits = len(headings), True
    seen: dict[str, int] = {}
    for position, heading in enumerate(headings, start=1):
        if not heading:
            fits = False
            collected.problem(
                file,
                numbers[0],
                f"column {position}",
                found="a column without a name",
                expected="a name for every column",
                mend="write the name, or remove the column",
            )
            continue
        first = seen.setdefault(plain_name(heading), position)
        if first != position:
            fits = False
            collected.problem(
                file,
                numbers[0],
                shown(heading),
                found=f"the same column twice (columns {first} and {position})",
                expected="every column name once",
                mend="rename or remove one of the two",
            )
    if any(len(row) != width for row in rows):
        fits = False
        for row, number in zip(rows, numbers[1:], strict=True):
            if len(row) != width:
                half = cut and len(row) < width and number == numbers[-1]
                collected.problem(
                    file,
                    number,
                    None,
                    found=f"{len(row)} cell{'s' if len(row) != 1 else ''}"
                    + (" and no line end" if half else ""),
                    expected=f"{width}, as the header has",
                    mend="the file may be cut off or still being written: copy it anew, or complete the last row"
                    if half
                    else _ragged_mend(row, width),
                )
                if collected.full(file):
                    break
    return fits


def _ragged_mend(row: list[str], width: int) -> str:
    text = ",".join(row)
    if ";" in text and len(row) < width or "\t" in text and len(row) < width:
        return "separate the cells by commas, with points as decimal marks"
    if len(row) > width:
        return "put a cell that holds a comma in quotes, and write decimal marks as points"
    return "write the missing cells; an unknown one stays empty between its commas"
