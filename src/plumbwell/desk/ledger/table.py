"""What a ledger shows: columns of numbers and texts in the units of people, as plain values.

The stages make these from results; the ledger shows, sorts, filters and copies them. No Qt.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from plumbwell.survey.column import Array

NUMBER, TEXT, TIME = "number", "text", "time"


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class LedgerColumn:
    """One column of a ledger.

    Parameters
    ----------
    key : str
        Its name inside the program, the same in every survey; what column choice remembers.
    name, unit : str
        The two lines of its head; `unit` may be any small words ("to sd", "15 Oct, UTC").
    heading : str
        The one-line heading when copied: "density [g/cm3]".
    values : (n,) float array or tuple of str
        NaN and "" mean no value. Times are s since 2000-01-01 UTC. Never rounded.
    sds : (n,) float array or None
        Standard deviations in the same unit; shown in the same cell, copied as a column of their own.
    kind : str
        "number", "text" or "time".
    decimals : int or None
        None: they follow the standard deviations (`plates.numbers.column_decimals`), three without any.
    signed : bool
        A plus before positive numbers.
    amber_from : float or None
        From this absolute value a number wants a look.
    italic : bool
        For interpreted names and quoted notes.
    what : str
        Meaning and sign in a line, for the tool tip.
    shown : bool
        Shown unless the person chose otherwise.
    narrow : bool
        Shown in a window under 1300 px too.
    """

    key: str
    name: str
    unit: str = ""
    heading: str = ""
    values: Array | tuple[str, ...]
    sds: Array | None = None
    kind: str = NUMBER
    decimals: int | None = None
    signed: bool = False
    amber_from: float | None = None
    italic: bool = False
    what: str = ""
    shown: bool = True
    narrow: bool = True


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class LedgerTable:
    """The table of a stage.

    Parameters
    ----------
    stage : str
        Stage it belongs to: what column choice, widths and sorting are remembered by.
    level : str
        What a row is: "reading", "visit", "station", "interval" or "file".
    numbers : tuple of str
        The first, frozen column: number or label of each row.
    number_name, number_unit : str
        Its head, e.g. "No" over "visit".
    columns : tuple of LedgerColumn
    marks : tuple of (str or None)
        "look", "error", "note", "changed", "excluded" or None, one a row.
    hints : tuple of str
        What hovering over the mark tells, one a row.
    excluded : (n,) bool array
        Rows that are struck through.
    top, base : (n,) float array
        Depths of each row, downward, in the unit of the depth axis; equal for a station, NaN where it has none.
    density : (n,) float array
        g/cm3 of each row, for the fan; of a station that of the rock below it. NaN where unknown.
    """

    stage: str
    level: str
    numbers: tuple[str, ...]
    number_name: str = "No"
    number_unit: str = ""
    columns: tuple[LedgerColumn, ...]
    marks: tuple[str | None, ...]
    hints: tuple[str, ...]
    excluded: NDArray[np.bool_]
    top: Array
    base: Array
    density: Array

    def __len__(self) -> int:
        return len(self.numbers)
