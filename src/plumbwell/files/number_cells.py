"""Cells of a table as numbers: a strict grammar, checked on a whole column at once.

ASCII digits with an optional sign, decimal point and exponent; an empty cell is missing; nothing
else is a number here, and each thing that is not says how to mend it.
"""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from plumbwell.survey.column import Array
from plumbwell.survey.errors import shown

_NUMBER = r"[+-]?[0-9]+(?:\.[0-9]+)?(?:[eE][+-]?[0-9]{1,3})?"
_ONE = re.compile(_NUMBER)
_COLUMN = re.compile(rf"(?:(?:{_NUMBER})?+\n)*+")

MEND_TEXT = "write a number, or leave the cell empty"
MEND_MISSING = "leave the cell empty where there is no value"

# What a cell that is no number looks like, and what its writer can do about it.
_MENDS = (
    (
        re.compile(r"[+-]?[1-9]\d{0,2},\d{3}"),
        "write it without the comma if that marks thousands, with a point if it is the decimal mark",
    ),
    (
        re.compile(r"[+-]?\d{1,3}(?:[,'\u2019 \u00a0\u202f]\d{3})+(?:\.\d+)?"),
        "write the number without thousands marks",
    ),
    (re.compile(r"[+-]?\d+,\d+"), "write the decimal mark as a point"),
    (
        re.compile(r"[+-]?\d{1,3}(?:[. ]\d{3})+,\d+"),
        "write the number without thousands marks, the decimal mark as a point",
    ),
    (re.compile(r"[+-]?\d+_\d[\d_]*(?:\.\d+)?"), "write the number without underscores"),
    (re.compile(r"[+-]?\.\d+.*"), "write a digit before the decimal point"),
    (re.compile(r"[+-]?\d+\."), "write a digit after the decimal point, or no point"),
    (re.compile(r"(?i)[+-]?(?:nan|na|n/a|none|null|nil|-+|inf|infinity|1\.#\w+)"), MEND_MISSING),
    (re.compile(r"\*+"), "leave the cell empty; the number was too wide for the program that wrote it"),
    (re.compile(r"'[+-]?\d.*"), "remove the apostrophe"),
    (re.compile(r"(?i)[+-]?\d+(?:\.\d+)?d[+-]?\d+"), "write the exponent with e"),
    (
        re.compile(r"[+-]?\d+(?:[.]\d+)?\s*[A-Za-z\u00b0\u00b5\u03bc%].*", re.ASCII),
        "write the number alone; the unit stands once, in the heading",
    ),
    (re.compile(r"=.*", re.DOTALL), "write the value, not a formula"),
)


@dataclass(frozen=True, slots=True)
class BadCell:
    """A cell that is no number: its row in the table, what was found and how to mend it."""

    row: int
    found: str
    mend: str


def mend_of(cell: str) -> str:
    """How to mend a cell that should be a number."""
    if not cell.isascii() and any(c.isdigit() for c in cell if not c.isascii()):
        return "write the number with the digits 0 to 9"
    return next((mend for pattern, mend in _MENDS if pattern.fullmatch(cell)), MEND_TEXT)


def numbers_of(cells: Sequence[str]) -> tuple[Array, list[BadCell], int]:
    """Numbers of a column of cells, NaN where a cell is empty or bad.

    Returns
    -------
    values : (n,) float64 array
    bad : list of BadCell
    minuses : int
        How many cells had a typographic minus or dash, which is taken as a minus.
    """
    joined = "\n".join(cells) + "\n"
    minuses = 0
    if "\u2212" in joined or "\u2013" in joined:
        mended = [re.sub("^[\u2212\u2013](?=[0-9])", "-", cell) for cell in cells]
        minuses = sum(new != old for new, old in zip(mended, cells, strict=True))
        cells, joined = mended, "\n".join(mended) + "\n"
    bad: list[BadCell] = []
    if _COLUMN.fullmatch(joined):
        if "\n\n" in joined or joined.startswith("\n"):
            cells = [cell or "nan" for cell in cells]
        values = np.array(list(map(float, cells)), dtype=np.float64)
    else:
        values = np.empty(len(cells))
        for row, cell in enumerate(cells):
            if _ONE.fullmatch(cell):
                values[row] = float(cell)
            else:
                values[row] = math.nan
                if cell:
                    bad.append(BadCell(row, f'"{shown(cell)}"', mend_of(cell)))
    for row in np.flatnonzero(np.isinf(values)).tolist():
        bad.append(
            BadCell(row, f'"{shown(cells[row])}"', "write a number that a computer can hold (under 1e308)")
        )
        values[row] = math.nan
    return values, bad, minuses
