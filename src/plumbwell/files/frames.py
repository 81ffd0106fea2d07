"""Output tables as pandas data frames, for those who work on in Python.

Columns, headings and units are those of the CSV files; values keep their full precision.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pandas as pd

from plumbwell.study.alternative_columns import COLUMNS
from plumbwell.study.alternatives import Alternative
from plumbwell.study.results import Results
from plumbwell.study.tables import TABLES, TEXT, TIME, Values


def frame(results: Results, name: str) -> pd.DataFrame:
    """One output table as a data frame, a row a station, interval, layer, reading, repeat or visit.

    Parameters
    ----------
    results : Results
    name : str
        "stations", "intervals", "layers", "readings_reduced", "repeats" or "visits".

    Returns
    -------
    pandas.DataFrame
        Columns by the headings of the CSV file, e.g. "density [g/cm3]"; numbers as float64 with NaN for not
        known, times as UTC timestamps. Columns of the raw readings stand as they were written, as texts.

    Raises
    ------
    ValueError
        There is no such table, or the survey has none of it; the text says which there are.
    """
    there = [one for one, table in TABLES.items() if table.rows(results) is not None]
    if name not in there:
        raise ValueError(f"there is no table {name!r} in these results; there are {', '.join(there)}")
    table = TABLES[name]
    columns = {heading: pd.Series(texts, dtype=object) for heading, texts in table.leading(results)}
    for one in table.columns:
        columns[one.heading] = _series(one.kind, one.values(results))
    return pd.DataFrame(columns)


def _series(kind: str, values: Values) -> pd.Series:
    """Values of one column, in the unit of its heading; times as UTC timestamps, NaT where there is none."""
    if kind != TIME:
        return pd.Series(values, dtype=object if kind == TEXT else np.float64)
    seconds = np.asarray(values, dtype=np.float64)
    known = np.isfinite(seconds)
    moments = np.full(len(seconds), np.datetime64("NaT", "ms"))
    milliseconds = np.round(seconds[known] * 1000.0).astype("timedelta64[ms]")
    moments[known] = np.datetime64("2000-01-01", "ms") + milliseconds
    return pd.Series(moments).dt.tz_localize("UTC")


def alternatives_frame(rows: Sequence[Alternative]) -> pd.DataFrame:
    """What else could have been done, as a data frame with the columns of alternatives.csv.

    Parameters
    ----------
    rows : sequence of Alternative
        As `plumbwell.alternatives` gives them.
    """
    return pd.DataFrame({one.heading: _series(one.kind, one.values(rows)) for one in COLUMNS})


def frames(results: Results) -> dict[str, pd.DataFrame]:
    """All output tables of a reduction as data frames, by name."""
    return {name: frame(results, name) for name, table in TABLES.items() if table.rows(results) is not None}
