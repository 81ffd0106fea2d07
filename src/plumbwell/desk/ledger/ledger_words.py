"""How the cells of a ledger's column read: decimals, times, standard deviations, and how wide they are.

Only what is asked for is formatted: a column of a million rows costs as much as the cells that are in view. Sorting,
searching and painting are left to others.
"""

from __future__ import annotations

from datetime import datetime, timedelta
from functools import cached_property
from math import floor, isfinite

import numpy as np
from numpy.typing import NDArray

from plumbwell.desk.ledger.table import NUMBER, TEXT, TIME, LedgerColumn, LedgerTable
from plumbwell.plates.lettering import text_width
from plumbwell.plates.numbers import NO_BREAK_SPACE, NO_VALUE, PLUS_MINUS, column_decimals, number
from plumbwell.plates.theme import Theme
from plumbwell.survey.column import Array

EPOCH = datetime(2000, 1, 1)
DAY = 86400
MONTHS = ("Jan", "Feb", "Mar", "Apr", "May", "Jun", "Jul", "Aug", "Sep", "Oct", "Nov", "Dec")
SAMPLE = 200
DEFAULT_DECIMALS = 3
FIGURE_SPACE = "\u2007"
# Times a hair below a full second are full seconds that lost a bit on their way.
SLACK = 1e-3


def whole_seconds(times: Array) -> NDArray[np.int64]:
    """The full seconds of finite times, s since 2000-01-01."""
    return np.floor(times + SLACK).astype(np.int64)


def _finite(values: Array) -> Array:
    return values[np.isfinite(values)]


def _sampled(n: int) -> NDArray[np.intp]:
    """Up to 200 rows spread evenly over a column."""
    return np.unique(np.linspace(0, n - 1, min(n, SAMPLE)).astype(np.intp))


class ColumnWords:
    """The cells of one column as they are shown.

    Parameters
    ----------
    column : LedgerColumn
    """

    def __init__(self, column: LedgerColumn) -> None:
        self.column = column
        self.is_text = column.kind == TEXT
        self.is_time = column.kind == TIME
        self.texts: tuple[str, ...] = ()
        self.values: Array = np.empty(0)
        self.sds: Array | None = None
        if self.is_text:
            self.texts = tuple(column.values)  # type: ignore[arg-type]
        else:
            self.values = np.asarray(column.values, dtype=np.float64)
            if column.kind == NUMBER and column.sds is not None:
                self.sds = np.asarray(column.sds, dtype=np.float64)

    def __len__(self) -> int:
        return len(self.texts) if self.is_text else len(self.values)

    @property
    def name(self) -> str:
        """What the column is called where its head alone would not say it."""
        return self.column.name or self.column.heading.partition(" [")[0] or self.column.key

    @cached_property
    def decimals(self) -> int:
        """Decimals of all numbers of the column."""
        if self.column.decimals is not None:
            return self.column.decimals
        if self.sds is None:
            return DEFAULT_DECIMALS
        # Only the least and the largest have a say, and a million need not be walked for them.
        known = self.sds[np.isfinite(self.sds) & (self.sds > 0)]
        ends = [float(known.min()), float(known.max())] if known.size else []
        return column_decimals(ends, default=DEFAULT_DECIMALS)

    @cached_property
    def days(self) -> NDArray[np.int64]:
        """The days that times fall on, in d since 2000-01-01, rising, each once."""
        return np.unique(whole_seconds(_finite(self.values)) // DAY)

    @property
    def one_day(self) -> bool:
        """Whether all times are of one day, which then stands in the head."""
        return self.is_time and self.days.size == 1

    @cached_property
    def many_years(self) -> bool:
        """Whether times are of several years, so that each needs its own."""
        ends = [_day(int(day)).year for day in self.days[[0, -1]]] if self.days.size else []
        return len(set(ends)) > 1

    @cached_property
    def to_seconds(self) -> bool:
        """Whether minutes alone would leave different times alike."""
        seconds = np.unique(whole_seconds(_finite(self.values)))
        return bool(np.any(np.diff(seconds // 60) == 0))

    @property
    def unit(self) -> str:
        """Second line of the head: the unit, or the day of times that are all of one day."""
        if not self.one_day:
            return self.column.unit
        return f"{day_words(int(self.days[0]), year=True)}, UTC"

    def known(self, row: int) -> bool:
        """Whether the cell of a table row holds a value."""
        return bool(self.texts[row]) if self.is_text else isfinite(self.values.item(row))

    def value(self, row: int) -> str:
        """The value of a table row as shown; an em dash for none, nothing for an empty text."""
        if self.is_text:
            return self.texts[row]
        value = self.values.item(row)
        if self.is_time:
            return self.time_words(value)
        return number(value, self.decimals, signed=self.column.signed)

    def sd(self, row: int) -> str:
        """What follows the value: "± 0.012", or nothing.

        The number is filled up with spaces as wide as figures, so that the plus-minus signs of a column stand under
        one another.
        """
        if self.sds is None or not isfinite(self.values.item(row)):
            return ""
        sd = self.sds.item(row)
        if not isfinite(sd):
            return ""
        words = number(sd, self.decimals)
        lead = self._widest_sd[: len(self._widest_sd) - len(words)]
        fill = "".join(one if one == NO_BREAK_SPACE else FIGURE_SPACE for one in lead)
        return f"{PLUS_MINUS}{NO_BREAK_SPACE}{fill}{words}"

    @cached_property
    def _widest_sd(self) -> str:
        """The largest standard deviation that is shown, which is the longest."""
        if self.sds is None:
            return ""
        shown = self.sds[np.isfinite(self.sds) & np.isfinite(self.values)]
        return number(float(shown.max()), self.decimals) if shown.size else ""

    def wants_look(self, row: int) -> bool:
        """Whether the number of a table row is so large that it stands in amber."""
        least = self.column.amber_from
        return least is not None and not self.is_text and abs(self.values.item(row)) >= least

    def time_words(self, value: float) -> str:
        """A time as shown: "11:42", or "15 Oct 11:42" where the column has several days."""
        if not isfinite(value):
            return NO_VALUE
        day, second = divmod(floor(value + SLACK), DAY)
        clock = clock_words(second, to_seconds=self.to_seconds)
        return clock if self.one_day else f"{day_words(day, year=self.many_years)} {clock}"

    def spoken(self, row: int) -> str:
        """A cell in words: name, value, standard deviation, unit."""
        if not self.known(row):
            return f"{self.name}: no value"
        after = f" {self.sd(row).replace(FIGURE_SPACE, '')}" if self.sd(row) else ""
        unit = f" {self.unit}" if self.unit else ""
        return f"{self.name} {self.value(row)}{after}{unit}"

    def face(self, *, strong: bool) -> str:
        """Face of the value: italic is interpreted, Semibold the current cell and what wants a look."""
        return "name" if self.column.italic else "emphasis" if strong else "text"

    @cached_property
    def _telling_rows(self) -> list[int]:
        """Rows among which the widest value is.

        Figures are equally wide and a column has one number of decimals, so that of numbers the least or the greatest
        is the widest, or the dash of one that is missing. Texts and times are sampled.
        """
        n = len(self)
        if not n:
            return []
        if not self.is_text and not self.is_time:
            known = np.isfinite(self.values)
            rows = set() if known.all() else {int(np.argmin(known))}
            if known.any():
                rows |= {int(np.nanargmin(self._finite_values)), int(np.nanargmax(self._finite_values))}
            return sorted(rows)
        rows = set(_sampled(n).tolist())
        if self.is_text:
            lengths = list(map(len, self.texts))
            rows.add(lengths.index(max(lengths)))
        return sorted(rows)

    @property
    def _finite_values(self) -> Array:
        return np.where(np.isfinite(self.values), self.values, np.nan)

    def value_width(self, theme: Theme) -> float:
        """Width of the widest value in px, in the widest face it may take."""
        face = self.face(strong=True)
        return max((text_width(theme, face, self.value(row)) for row in self._telling_rows), default=0.0)

    def sd_width(self, theme: Theme) -> float:
        """Width in px of the slot for standard deviations; 0 for a column that has none."""
        if not self._widest_sd:
            return 0.0
        return text_width(theme, "text", f"{PLUS_MINUS}{NO_BREAK_SPACE}{self._widest_sd}")


def day_words(day: int, *, year: bool) -> str:
    """A day in d since 2000-01-01 as "15 Oct", with its year "15 Oct 2025"."""
    date = _day(day)
    return f"{date.day} {MONTHS[date.month - 1]}" + (f" {date.year}" if year else "")


def _day(day: int) -> datetime:
    return EPOCH + timedelta(days=day)


def clock_words(second: int, *, to_seconds: bool) -> str:
    """A second of the day as "11:42" or "11:42:07"."""
    minutes, seconds = divmod(second, 60)
    words = f"{minutes // 60:02d}:{minutes % 60:02d}"
    return f"{words}:{seconds:02d}" if to_seconds else words


def number_words(table: LedgerTable) -> ColumnWords:
    """The first column of a table, number or label of each row, as a column like the others."""
    return ColumnWords(
        LedgerColumn(
            key="number",
            name=table.number_name,
            unit=table.number_unit,
            heading=table.number_name,
            values=table.numbers,
            kind=TEXT,
        )
    )
