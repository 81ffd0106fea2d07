"""Orders of a ledger's rows: sorted by a column, and whether rows go down the hole.

An order is an array of table rows. Sorting is stable, and rows without a value come last whichever way it goes.
"""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from plumbwell.desk.ledger.ledger_words import ColumnWords
from plumbwell.survey.column import Array

Rows = NDArray[np.intp]

NUMBERS_IN_TEXT = re.compile(r"(\d+)")


def sorted_rows(words: ColumnWords, *, descending: bool) -> Rows:
    """All rows of a table sorted by one column; equal ones keep the order of the table."""
    values = _ranks(words.texts) if words.is_text else np.where(np.isfinite(words.values), words.values, np.nan)
    return np.argsort(-values if descending else values, kind="stable")


def _ranks(texts: tuple[str, ...]) -> Array:
    """Places of texts among each other: numbers in them by size, no text NaN."""
    different = sorted({text for text in texts if text}, key=_natural)
    rank = {text: float(place) for place, text in enumerate(different)}
    return np.fromiter((rank.get(text, np.nan) for text in texts), dtype=np.float64, count=len(texts))


def _natural(text: str) -> tuple[list[tuple[int, int, str]], str]:
    parts = (one for one in NUMBERS_IN_TEXT.split(text.casefold()) if one)
    # A figure such as a superscript is a digit for str.isdigit but no number; decimal ones alone are.
    key = [(0, int(one[:400]), "") if one.isdecimal() else (1, 0, one) for one in parts]
    return key, text


def rises(values: Array) -> bool:
    """Whether numbers never fall, are not all the same, and at most half are missing."""
    known = values[np.isfinite(values)]
    if known.size < 2 or 2 * known.size < values.size:
        return False
    return bool(np.all(np.diff(known) >= 0) and known[-1] > known[0])


def downward(top: Array, base: Array) -> bool:
    """Whether rows that have a depth go down the hole; False when none has."""
    known = np.isfinite(top) & np.isfinite(base)
    if not known.any():
        return False
    return bool(np.all(np.diff(top[known]) >= 0) and np.all(np.diff(base[known]) >= 0))


def runs(rows: Rows) -> tuple[Rows, Rows]:
    """First and last of each unbroken run of rising whole numbers."""
    if not rows.size:
        return rows, rows
    breaks = np.flatnonzero(np.diff(rows) != 1)
    firsts = np.concatenate([[0], breaks + 1])
    lasts = np.concatenate([breaks, [rows.size - 1]])
    return rows[firsts], rows[lasts]
