"""Rows of a ledger as tab-separated text for a spreadsheet: what is shown, with every figure it has.

One heading line; standard deviations in columns of their own; times in ISO 8601; nothing where there is no value.
"""

from __future__ import annotations

import re
from collections.abc import Sequence

import numpy as np

from plumbwell.desk.ledger.ledger_order import Rows
from plumbwell.desk.ledger.ledger_words import ColumnWords
from plumbwell.survey.column import Array

EPOCH = np.datetime64("2000-01-01T00:00:00")
BREAKS = re.compile(r"[\t\r\n\v\f\x85\u2028\u2029]+")


def copied(columns: Sequence[ColumnWords], rows: Rows) -> str:
    """The text of some rows of a table.

    Parameters
    ----------
    columns : sequence of ColumnWords
        In the order of the view, the first with the rows' numbers included.
    rows : (m,) int array
        Table rows, in the order of the view.
    """
    headings: list[str] = []
    cells: list[list[str]] = []
    for column in columns:
        heading = _heading(column)
        headings.append(heading)
        if column.is_text:
            cells.append([BREAKS.sub(" ", column.texts[row]) for row in rows.tolist()])
        elif column.is_time:
            cells.append(_times(column.values[rows]))
        else:
            cells.append(_numbers(column.values[rows]))
        if column.sds is not None:
            headings.append(_sd_heading(heading))
            cells.append(_numbers(column.sds[rows]))
    lines = ["\t".join(headings), *map("\t".join, zip(*cells, strict=True))]
    return "\n".join(lines) + "\n"


def _heading(column: ColumnWords) -> str:
    told = column.column
    made = f"{told.name} [{told.unit}]" if told.unit else told.name
    return BREAKS.sub(" ", told.heading or made or told.key)


def _sd_heading(heading: str) -> str:
    """The heading of the standard deviation: "density [g/cm3]" gives "density_sd [g/cm3]"."""
    name, bracket, unit = heading.partition(" [")
    return f"{name}_sd{bracket}{unit}"


def _numbers(values: Array) -> list[str]:
    texts = list(map(repr, values.tolist()))
    for row in np.flatnonzero(~np.isfinite(values)).tolist():
        texts[row] = ""
    return texts


def _times(values: Array) -> list[str]:
    """Times in UTC, to the second or, where any has a part of one, to the millisecond."""
    known = np.isfinite(values)
    thousandths = np.rint(np.where(known, values, 0.0) * 1e3).astype(np.int64)
    moments = EPOCH + thousandths.astype("timedelta64[ms]")
    if np.any(thousandths % 1000):
        written = np.datetime_as_string(moments, unit="ms")
    else:
        written = np.datetime_as_string(moments, unit="s")
    texts = [f"{text}Z" for text in written.tolist()]
    for row in np.flatnonzero(~known).tolist():
        texts[row] = ""
    return texts
