"""The errors that Plumbwell raises, and the problem in five parts that an input error carries.

Readers collect problems and go on, so that a person sees all of them at once. Nothing here
computes; nothing is repaired in silence.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace

MAXIMUM_SHOWN = 80
MAXIMUM_RANGES = 8
"""Ranges of rows that a gathered problem lists."""


def shown(text: object, most: int = MAXIMUM_SHOWN) -> str:
    """Text of a cell as it may stand in a message: control characters escaped, at most 80 characters."""
    escaped = str(text)
    if not escaped.isprintable():
        escaped = "".join(c if c.isprintable() else c.encode("unicode_escape").decode() for c in escaped)
    return escaped if len(escaped) <= most else escaped[: most - 1] + "…"


@dataclass(frozen=True, slots=True, kw_only=True)
class Problem:
    """One thing that is wrong with an input.

    Parameters
    ----------
    file : str
        Name of the file, relative to the survey folder.
    row : int or None
        Physical line, as a text editor counts them; None when the whole file is meant.
    column : str or None
        Heading of the column, or the key in survey.toml.
    found : str
        What stands there.
    expected : str
        What should stand there.
    mend : str
        What the person can do about it.
    """

    file: str
    row: int | None
    column: str | None
    found: str
    expected: str
    mend: str

    def __str__(self) -> str:
        place = self.file
        if self.row is not None:
            place += f", row {self.row}"
        if self.column is not None:
            place += f", {self.column}"
        return f"{place}: found {self.found}; expected {self.expected}; to mend: {self.mend}"


def gathered(problems: Iterable[Problem]) -> tuple[Problem, ...]:
    """Problems as they are shown: those of one cause as one, in the place of the first of them.

    Problems with a row and the same file, column, expectation and mend have one cause. What was found in
    the first row stands for all, and the other rows are counted and named.
    """
    causes: dict[object, list[Problem]] = {}
    for number, one in enumerate(problems):
        cause = number if one.row is None else (one.file, one.column, one.expected, one.mend)
        causes.setdefault(cause, []).append(one)
    return tuple(_as_one(members) for members in causes.values())


def _as_one(members: list[Problem]) -> Problem:
    first = members[0]
    rows = sorted({one.row for one in members if one.row is not None} - {first.row})
    if not rows:
        return first
    more = f"{len(rows)} more row{'' if len(rows) == 1 else 's'}: {row_ranges(rows)}"
    return replace(first, found=f"{first.found}, and {more}")


def row_ranges(rows: list[int], most: int = MAXIMUM_RANGES) -> str:
    """Rising row numbers as ranges, the first few of many: "9-12, 17, 20-77"."""
    ranges: list[tuple[int, int]] = []
    for row in rows:
        if ranges and row == ranges[-1][1] + 1:
            ranges[-1] = (ranges[-1][0], row)
        else:
            ranges.append((row, row))
    words = [str(low) if low == high else f"{low}-{high}" for low, high in ranges[:most]]
    return ", ".join(words) + (" …" if len(ranges) > most else "")


class PlumbwellError(Exception):
    """Any error that Plumbwell raises on purpose; its text is written for the person at the desk."""


class InputError(PlumbwellError):
    """The input is wrong; `problems` says all that is wrong with it.

    Its text, and `blocks`, hold the problems gathered by cause.

    Parameters
    ----------
    problems : iterable of Problem
    """

    def __init__(self, problems: tuple[Problem, ...] | list[Problem]) -> None:
        self.problems = tuple(problems)
        self.blocks = gathered(self.problems)
        super().__init__("\n".join(str(problem) for problem in self.blocks))


class SurveyError(PlumbwellError):
    """The survey can be read but not reduced."""


class NumericalError(PlumbwellError):
    """A computation lost its footing (rank, convergence) where no finding can stand for it."""


class DossierError(PlumbwellError):
    """A project file cannot be read or written."""
