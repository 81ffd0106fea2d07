"""Which cells of a column contain a word, exactly as they are shown, without writing a million texts.

A number is searched in its digits: the shown number is a whole number of units of its last decimal, and whether that
contains some digits is a matter of dividing by powers of ten. Minus is written "-" here, and spaces between
thousands do not count.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence

import numpy as np
from numpy.typing import NDArray

from plumbwell.desk.ledger.ledger_words import DAY, ColumnWords, clock_words, day_words, whole_seconds
from plumbwell.plates.numbers import MINUS, NO_BREAK_SPACE, NO_VALUE, PLUS_MINUS, number
from plumbwell.survey.column import Array

Mask = NDArray[np.bool_]
Whole = NDArray[np.int64]

NUMBER_PART = re.compile(r"([+-]?)(\d*)(\.?)(\d*)")
SEPARATOR = "\0"
# So many numbers are searched at once: few enough to stay near the processor.
CHUNK = 32_768
# Beyond this many units of the last decimal a float no longer tells them apart.
LARGEST, MOST_DIGITS = 1e15, 15


def plain(words: str) -> str:
    """Words as they are compared: small letters, "-" for minus, no spaces between thousands."""
    return words.replace(MINUS, "-").replace(NO_BREAK_SPACE, "").casefold()


def cells_with(words: ColumnWords, wanted: str) -> Mask:
    """Rows whose cell, as shown, contains a word.

    Parameters
    ----------
    words : ColumnWords
    wanted : str
        Without spaces, as `plain` makes it.
    """
    if words.is_text:
        return texts_with(words.texts, wanted)
    known = np.isfinite(words.values)
    if wanted == NO_VALUE:
        return ~known
    if words.is_time:
        found = np.zeros(len(words), dtype=bool)
        found[known] = _times_with(words, words.values[known], wanted)
        return found
    if wanted != PLUS_MINUS and not NUMBER_PART.fullmatch(wanted):
        return np.zeros(len(words), dtype=bool)
    found = numbers_with(np.where(known, words.values, 0.0), wanted, words.decimals, signed=words.column.signed) & known
    if words.sds is not None:
        known &= np.isfinite(words.sds)
        if wanted == PLUS_MINUS:
            return known
        found |= numbers_with(np.where(known, words.sds, 0.0), wanted, words.decimals) & known
    return found


def texts_with(texts: Sequence[str], wanted: str) -> Mask:
    """Rows whose text contains a word."""
    different = set(texts)
    if len(different) < len(texts) // 4:
        # Many rows share few texts; each different one is looked at once.
        hits = {text for text in different if wanted in plain(text)}
        if not hits:
            return np.zeros(len(texts), dtype=bool)
        return np.fromiter((text in hits for text in texts), dtype=bool, count=len(texts))
    # One long text is made small at once, several times faster than a million short ones.
    small = plain(SEPARATOR.join(texts)).split(SEPARATOR)
    if len(small) != len(texts):
        small = [plain(text) for text in texts]
    return np.array([wanted in text for text in small], dtype=bool)


def _times_with(words: ColumnWords, times: Array, wanted: str) -> Mask:
    """Times whose day or clock, as shown, contains a word."""
    day, second = np.divmod(whole_seconds(times), DAY)
    step = 1 if words.to_seconds else 60
    table = _hits((clock_words(at, to_seconds=words.to_seconds) for at in range(0, DAY, step)), wanted)
    found = table[second // step]
    if not words.one_day:
        days = words.days.tolist()
        shown = (day_words(int(one), year=words.many_years).split() for one in days)
        in_day = np.array([any(wanted in plain(part) for part in parts) for parts in shown], dtype=bool)
        found |= in_day[np.searchsorted(words.days, day)]
    return found


def _hits(texts: Iterable[str], wanted: str) -> Mask:
    return np.array([wanted in text for text in texts], dtype=bool)


def numbers_with(values: Array, wanted: str, decimals: int, *, signed: bool = False) -> Mask:
    """Finite numbers that, as shown, contain a part of a number such as "-2.4", "16" or ".05"."""
    part = NUMBER_PART.fullmatch(wanted)
    found = np.zeros(len(values), dtype=bool)
    if part is None or not wanted:
        return found
    for start in range(0, len(values), CHUNK):
        piece = slice(start, start + CHUNK)
        found[piece] = _piece_with(values[piece], wanted, part, decimals, signed)
    return found


def _piece_with(values: Array, wanted: str, part: re.Match[str], decimals: int, signed: bool) -> Mask:
    sign, before, point, after = part.groups()
    units, unsure = _units(values, decimals)
    found = np.zeros(len(values), dtype=bool)
    possible = max(len(before), len(after)) <= MOST_DIGITS and not (point and (not decimals or (sign and not before)))
    if possible:
        whole = units // 10**decimals
        fraction = units - whole * 10**decimals
        if point:
            found = _across_point(whole, fraction, before, after, decimals, alone=bool(sign))
        elif before:
            found = _starting(whole, before) if sign else _inside(whole, fraction, before, decimals)
        else:
            found = np.ones(len(values), dtype=bool)
        if sign == "-":
            found &= (values < 0) & (units > 0)
        elif sign == "+":
            found &= (values > 0) & (units > 0) & signed
    for row in np.flatnonzero(unsure).tolist():
        found[row] = wanted in plain(number(values.item(row), decimals, signed=signed))
    return found


def _units(values: Array, decimals: int) -> tuple[Whole, Mask]:
    """Sizes in units of the last shown decimal, and where that is not sure: near a half, and too large."""
    scaled = np.abs(values) * 10.0**decimals
    unsure = scaled >= LARGEST
    scaled[unsure] = 0.0
    units = np.rint(scaled)
    unsure |= np.abs(np.abs(scaled - units) - 0.5) <= 1e-9 + 1e-15 * scaled
    return units.astype(np.int64), unsure


def _has_digits(whole: Whole, count: int) -> Mask:
    """Whether whole numbers have at least so many digits; nought has one."""
    return whole >= (10 ** (count - 1) if count > 1 else 0)


def _ends(whole: Whole, digits: str) -> Mask:
    """Whether the last digits of whole numbers are these."""
    # Dividing is several times faster than taking the remainder.
    step = 10 ** len(digits)
    return whole - whole // step * step == int(digits)


def _most_digits(whole: Whole) -> int:
    return len(str(int(whole.max()))) if whole.size else 1


def _inside(whole: Whole, fraction: Whole, digits: str, decimals: int) -> Mask:
    """Digits anywhere before the point, or anywhere after it."""
    length = len(digits)
    found = np.zeros(len(whole), dtype=bool)
    for right in range(_most_digits(whole) - length + 1):
        found |= _ends(whole // 10**right, digits) & _has_digits(whole, length + right)
    for right in range(decimals - length + 1):
        found |= _ends(fraction // 10**right, digits)
    return found


def _starting(whole: Whole, digits: str) -> Mask:
    """Digits right behind the sign."""
    wanted, length = int(digits), len(digits)
    found = np.zeros(len(whole), dtype=bool)
    for count in range(length, _most_digits(whole) + 1):
        found |= (whole // 10 ** (count - length) == wanted) & (whole < 10**count) & _has_digits(whole, count)
    return found


def _across_point(whole: Whole, fraction: Whole, before: str, after: str, decimals: int, *, alone: bool) -> Mask:
    """Digits on both sides of the point; `alone` when nothing stands before them but the sign."""
    if len(after) > decimals:
        return np.zeros(len(whole), dtype=bool)
    found = np.ones(len(whole), dtype=bool)
    if after:
        found &= fraction // 10 ** (decimals - len(after)) == int(after)
    if before:
        length = len(before)
        found &= _ends(whole, before) & _has_digits(whole, length)
        if alone:
            found &= whole < 10**length
    return found
