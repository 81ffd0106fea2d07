"""The filter of a ledger: words that rows must show, and comparisons such as `density > 2.4`, joined by "and".

`parsed` turns what a person wrote into conditions or says in a sentence what is wrong; the conditions then tell which
rows stay.
"""

from __future__ import annotations

import operator
import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta
from math import isfinite

import numpy as np

from plumbwell.desk.ledger.ledger_search import Mask, cells_with, plain
from plumbwell.desk.ledger.ledger_words import EPOCH, MONTHS, ColumnWords
from plumbwell.plates.numbers import MINUS, NO_BREAK_SPACE
from plumbwell.survey.column import Array

COMPARISON = re.compile(r"(.*?)\s*(<=|>=|!=|≤|≥|≠|<|>|=)\s*(.*)", re.DOTALL)
SAME_SIGN = {"≤": "<=", "≥": ">=", "≠": "!="}
ORDERED: dict[str, Callable[[Array, float], Mask]] = {
    "<": operator.lt,
    "<=": operator.le,
    ">": operator.gt,
    ">=": operator.ge,
}
CLOCK = r"(?P<hour>\d{1,2}):(?P<minute>\d\d)(?::(?P<second>\d\d))?"
ISO_TIME = re.compile(rf"(?P<year>\d{{4}})-(?P<month>\d\d)-(?P<day>\d\d)(?:[T ]+{CLOCK})?\s*Z?", re.IGNORECASE)
DAY_TIME = re.compile(rf"(?P<day>\d{{1,2}}) +(?P<name>[A-Za-z]{{3}})(?: +(?P<year>\d{{4}}))?(?: +{CLOCK})?")
CLOCK_TIME = re.compile(CLOCK)


class FilterError(ValueError):
    """What is wrong with a filter, as a sentence for the person who wrote it."""


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Condition:
    """One part of a filter.

    Parameters
    ----------
    column : ColumnWords or None
        The column that is compared; None for words that any shown cell may hold.
    test : callable or None
        Comparison: which rows of `column` meet it.
    words : tuple of str
        Words that must all be shown in a row.
    """

    column: ColumnWords | None = None
    test: Callable[[ColumnWords], Mask] | None = None
    words: tuple[str, ...] = ()


def parsed(text: str, columns: Sequence[ColumnWords]) -> tuple[Condition, ...]:
    """The conditions of a filter as written.

    Parameters
    ----------
    text : str
        Parts joined by "and".
    columns : sequence of ColumnWords
        All columns that can be compared, the first with the rows' numbers included.

    Raises
    ------
    FilterError
        It cannot be understood; the text says why.
    """
    text = text.strip()
    if not text:
        return ()
    parts = re.split(r"\s+and(?=\s|$)", f" {text}", flags=re.IGNORECASE)
    found = []
    for part in (one.strip() for one in parts):
        if not part:
            raise FilterError('something must stand on both sides of "and"')
        compared = COMPARISON.fullmatch(part)
        if compared is None:
            found.append(Condition(words=tuple(plain(word) for word in part.split(" ") if word)))
            continue
        name, sign, value = compared.groups()
        found.append(_comparison(name.strip(), SAME_SIGN.get(sign, sign), value.strip(), columns))
    return tuple(found)


def kept_rows(conditions: Sequence[Condition], shown: Sequence[ColumnWords], n: int) -> Mask:
    """Which of `n` rows meet all conditions; words are looked for in the `shown` columns."""
    kept = np.ones(n, dtype=bool)
    for condition in conditions:
        if condition.column is not None and condition.test is not None:
            kept &= condition.test(condition.column)
        for word in condition.words:
            held = np.zeros(n, dtype=bool)
            for column in shown:
                held |= cells_with(column, word)
            kept &= held
    return kept


def _comparison(name: str, sign: str, value: str, columns: Sequence[ColumnWords]) -> Condition:
    if not name:
        raise FilterError(f'a column must stand before "{sign}"')
    column, of_sd = _named(name, columns)
    if not value:
        raise FilterError(f'a value must stand after "{sign}"')
    if column.is_text:
        return Condition(column=column, test=_text_test(column, sign, value))
    if column.is_time:
        return Condition(column=column, test=_time_test(column, sign, value))
    wanted, places = _number(value)
    if sign in ORDERED:
        compare = ORDERED[sign]
        return Condition(column=column, test=lambda words: compare(_numbers(words, of_sd), wanted))
    # As many decimals as are shown or written: what reads alike is alike.
    near = 0.5 * 10.0 ** -max(column.decimals, places) * (1 + 1e-9)
    return Condition(column=column, test=lambda words: _alike(_numbers(words, of_sd), wanted, near, sign))


def _numbers(words: ColumnWords, of_sd: bool) -> Array:
    if not of_sd:
        return words.values
    return np.full(len(words), np.nan) if words.sds is None else words.sds


def _alike(values: Array, wanted: float, near: float, sign: str) -> Mask:
    known = np.isfinite(values)
    alike = np.abs(values - wanted) <= near
    return known & (alike if sign == "=" else ~alike)


def _named(name: str, columns: Sequence[ColumnWords]) -> tuple[ColumnWords, bool]:
    """The column of a name, key or heading, and whether its standard deviation is meant."""
    wanted = " ".join(name.casefold().split())
    for column in columns:
        names = {column.name, column.column.key, column.column.heading.partition(" [")[0]}
        known = {one.casefold() for one in names if one}
        if wanted in known:
            return column, False
        if column.sds is not None and wanted in {f"{one}{end}" for one in known for end in (" sd", "_sd")}:
            return column, True
    there = ", ".join(dict.fromkeys(column.name for column in columns))
    raise FilterError(f'there is no column "{name}"; there are {there}')


def _number(text: str) -> tuple[float, int]:
    """A number as a person writes it, and its decimals."""
    written = re.sub(r"(?<=\d)[ \u00a0](?=\d{3}(?!\d))", "", text.replace(MINUS, "-").replace(NO_BREAK_SPACE, " "))
    try:
        value = float(written)
    except ValueError:
        value = float("nan")
    if not isfinite(value) or "_" in written:
        if re.fullmatch(r"[+-]?\d+,\d+", written):
            raise FilterError(f"write the decimal point: {written.replace(',', '.')}")
        raise FilterError(f'"{text}" is not a number')
    return value, len(written.partition(".")[2]) if "e" not in written.lower() else 0


def _text_test(column: ColumnWords, sign: str, value: str) -> Callable[[ColumnWords], Mask]:
    """A comparison of texts: alike or not; by size where they are numbers, such as row numbers."""
    if sign in ORDERED:
        wanted, _ = _number(value)
        texts = sorted(set(column.texts))
        sizes = np.array([_size(text) for text in texts], dtype=np.float64)
        if not np.isfinite(sizes).any():
            raise FilterError(f'"{column.name}" holds texts; compare it with = or !=')
        passing = {texts[place] for place in np.flatnonzero(ORDERED[sign](sizes, wanted)).tolist()}
        return lambda words: _members(words.texts, passing)
    same = {text for text in set(column.texts) if plain(text) == plain(value)}
    if sign == "=":
        return lambda words: _members(words.texts, same)
    return lambda words: ~_members(words.texts, same)


def _members(texts: Sequence[str], among: set[str]) -> Mask:
    return np.fromiter((text in among for text in texts), dtype=bool, count=len(texts))


def _size(text: str) -> float:
    try:
        return float(text)
    except (TypeError, ValueError):
        return float("nan")


def _time_test(column: ColumnWords, sign: str, value: str) -> Callable[[ColumnWords], Mask]:
    """A comparison of times; what is alike within the minute or second as written is equal."""
    start, length = _time(column, value)
    if sign == "<":
        return lambda words: words.values < start
    if sign == "<=":
        return lambda words: words.values < start + length
    if sign == ">":
        return lambda words: words.values >= start + length
    if sign == ">=":
        return lambda words: words.values >= start
    if sign == "=":
        return lambda words: (words.values >= start) & (words.values < start + length)
    return lambda words: (words.values < start) | (words.values >= start + length)


def _time(column: ColumnWords, text: str) -> tuple[float, float]:
    """Start of a time as written, s since 2000-01-01, and how long what is written lasts."""
    clock = CLOCK_TIME.fullmatch(text)
    named = DAY_TIME.fullmatch(text)
    full = ISO_TIME.fullmatch(text)
    found = full or named or clock
    if found is None:
        raise FilterError(f'"{text}" is not a time; write 11:42, 15 Oct 11:42 or 2025-10-15 11:42')
    given = {key: one for key, one in found.groupdict().items() if one is not None}
    if clock is not None and not column.one_day:
        raise FilterError("there are several days; write 15 Oct 11:42 or 2025-10-15 11:42")
    if "year" not in given and not column.days.size:
        raise FilterError(f'"{column.name}" holds no times')
    first = EPOCH + timedelta(days=int(column.days[0])) if column.days.size else EPOCH
    if "year" not in given and named is not None and column.many_years:
        raise FilterError("there are several years; write 15 Oct 2025 11:42 or 2025-10-15 11:42")
    try:
        month = MONTHS.index(given["name"].capitalize()) + 1 if named else int(given.get("month", first.month))
        day = datetime(int(given.get("year", first.year)), month, int(given.get("day", first.day)))
        moment = day.replace(
            hour=int(given.get("hour", 0)), minute=int(given.get("minute", 0)), second=int(given.get("second", 0))
        )
    except ValueError:
        raise FilterError(f'there is no time "{text}"') from None
    length = 86400.0 if "hour" not in given else 1.0 if "second" in given else 60.0
    return (moment - EPOCH).total_seconds(), length
