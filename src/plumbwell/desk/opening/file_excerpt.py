"""A few lines of a survey's file as they stand on the disk at this moment, with one cell marked.

Read only. Any bytes can be shown: what is not UTF-8 and what cannot be printed is written as its code. Lines are
counted as a text editor counts them, as in the messages about problems.
"""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from plumbwell.files.text_table import plain_name
from plumbwell.survey.errors import Problem

ELLIPSIS = "\u2026"
AROUND = 3
"""Lines shown before and after the wrong one."""

LONGEST_LINE = 1 << 16
"""Characters of a line that are looked at; files without line ends would fill the memory."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ExcerptLine:
    """A line of a file.

    Parameters
    ----------
    number : int
        Physical line, from 1.
    text : str
        As it can be shown.
    marked : tuple of int or None
        First character of the wrong cell in `text`, and the one behind its last; None in the other lines.
    """

    number: int
    text: str
    marked: tuple[int, int] | None = None


def visible(text: str) -> str:
    """Return a text with the codes of what cannot be printed; tabs become spaces."""
    if text.isprintable():
        return text
    plain = text.replace("\t", "    ")
    return "".join(c if c.isprintable() else c.encode("unicode_escape", "backslashreplace").decode() for c in plain)


def file_excerpt(folder: Path, problem: Problem) -> tuple[ExcerptLine, ...]:
    """Return the lines around the row of a problem, read from the disk at this moment.

    Parameters
    ----------
    folder : Path
        The survey folder, to which `problem.file` is relative.
    problem : Problem

    Returns
    -------
    tuple of ExcerptLine
        Empty where the problem has no row, or the file has become shorter.

    Raises
    ------
    OSError
        The file cannot be opened or read.
    """
    if problem.row is None:
        return ()
    path = folder / problem.file
    if not path.is_file():
        raise FileNotFoundError(2, "there is no such file", str(path))
    with path.open("rb") as file:
        start = file.read(4)
    encoding = "utf-16" if start[:2] in (b"\xff\xfe", b"\xfe\xff") else "utf-8-sig"
    header: str | None = None
    found: list[ExcerptLine] = []
    first, last = problem.row - AROUND, problem.row + AROUND
    with path.open(encoding=encoding, errors="backslashreplace", newline=None) as file:
        number = 0
        while number < last and (line := file.readline(LONGEST_LINE)):
            number += 1
            whole = line.endswith("\n")
            text = line.rstrip("\n")
            while not whole and (rest := file.readline(LONGEST_LINE)):
                whole = rest.endswith("\n")
            if header is None and text.strip() and not text.lstrip().startswith("#"):
                header = text
            if number >= first:
                marked = cell_span(text, header, problem.column) if number == problem.row else None
                if marked is not None:
                    before, cell = visible(text[: marked[0]]), visible(text[marked[0] : marked[1]])
                    marked = (len(before), len(before) + len(cell))
                found.append(ExcerptLine(number=number, text=visible(text), marked=marked))
    return tuple(found) if any(line.number == problem.row for line in found) else ()


def cell_span(line: str, header: str | None, column: str | None) -> tuple[int, int]:
    """Return where in a line the cell of a column stands; the whole line where that cannot be told.

    Parameters
    ----------
    line : str
    header : str or None
        First line of the file that is no comment: the headings, if the file is a table.
    column : str or None
        Heading, "column N", or a key of survey.toml such as "[site] latitude".
    """
    everything = (len(line) - len(line.lstrip()), len(line.rstrip()))
    if column is None:
        return everything
    if column.startswith("[") or "=" in line:
        return _value_span(line, column) or everything
    if header is None:
        return everything
    names = [plain_name(header[low:high].strip('" ')) for low, high in _cells(header)]
    counted = column.removeprefix("column ")
    if plain_name(column) in names:
        index = names.index(plain_name(column))
    elif counted != column and counted.isdigit():
        index = int(counted) - 1
    else:
        return everything
    cells = _cells(line)
    if index >= len(cells):
        return everything
    low, high = cells[index]
    # An empty cell is shown with the comma before it: there is nothing of its own to see.
    return (low, high) if high > low else (max(low - 1, 0), max(high, 1))


def _cells(line: str) -> list[tuple[int, int]]:
    """Where the cells of a comma-separated line begin and end; commas inside quotes part nothing."""
    spans: list[tuple[int, int]] = []
    start, quoted = 0, False
    for at, character in enumerate(line + ","):
        if character == '"':
            quoted = not quoted
        if (character == "," and not quoted) or at == len(line):
            text = line[start:at]
            left = start + len(text) - len(text.lstrip())
            spans.append((left, max(start + len(text.rstrip()), left)))
            start = at + 1
    return spans


def _value_span(line: str, column: str) -> tuple[int, int] | None:
    """Where the value of a key stands in a line `key = value # comment`; the key where it is the key that is wrong."""
    key = column.split("] ")[-1].split(".")[-1]
    name, equals, value = line.partition("=")
    if not equals or key not in name:
        return None
    start = len(name) + 1 + len(value) - len(value.lstrip())
    text, quote = "", ""
    for character in value.strip():
        if character == "#" and not quote:
            break
        if character in "\"'":
            quote = "" if quote == character else quote or character
        text += character
    return (start, start + len(text.rstrip())) if text.strip() else None


def elided_around(text: str, span: tuple[int, int], most: int) -> tuple[str, str, str]:
    """Return what stands before a span of a text, the span, and what follows, together at most `most` characters.

    What is left out is told by an ellipsis; the span stays in view.
    """
    before, cell, after = text[: span[0]], text[span[0] : span[1]], text[span[1] :]
    if len(cell) > most:
        cell = cell[: max(most - 1, 0)] + ELLIPSIS
    room = max(most - len(cell), 0)
    left = min(len(before), max(room // 2, room - len(after)))
    right = min(len(after), room - left)
    if left < len(before):
        before = ELLIPSIS + before[len(before) - left + 1 :] if left > 1 else ELLIPSIS
    if right < len(after):
        after = after[: right - 1] + ELLIPSIS if right > 1 else ELLIPSIS
    return before, cell, after
