"""The timed readings of a survey, column by column, as measured."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from plumbwell.survey.column import Column, Index, Labels


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class RawTable:
    """The cells of a table as written: headings, and for each heading the text of each row.

    Parameters
    ----------
    file : str
    headings : tuple of str
        As written, in their order.
    cells : tuple of tuple of str
        One tuple of texts a heading.
    lines : (n,) int array
        Physical line of each row.
    """

    file: str
    headings: tuple[str, ...]
    cells: tuple[tuple[str, ...], ...]
    lines: Index


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Readings:
    """All rows of readings.csv in the order of the file, (n,) each. NaN or code -1: not given.

    Parameters
    ----------
    raw : RawTable
    time : Column
        As the instrument's clock gave it, brought to UTC, s since 2000-01-01.
    run, instrument, station, visit : Labels
        Every row has a run and an instrument; station and visit may be missing.
    depth : Column
        Measured depth from the datum, m, downward positive.
    reading : Column
        "m/s2", or "counts" when a calibration table is needed.
    reading_sd, tide_in_reading, sensor_offset, pressure, tilt_x, tilt_y, temperature : Column or None
        None: the file has no such column. m/s2, m/s2, m (sensor above the mark is positive), Pa, rad, rad, K.
    use : (n,) bool array
        False: `use=no`.
    note : tuple of str
    """

    raw: RawTable
    time: Column
    run: Labels
    instrument: Labels
    station: Labels
    visit: Labels
    depth: Column
    reading: Column
    reading_sd: Column | None = None
    tide_in_reading: Column | None = None
    sensor_offset: Column | None = None
    pressure: Column | None = None
    tilt_x: Column | None = None
    tilt_y: Column | None = None
    temperature: Column | None = None
    use: NDArray[np.bool_]
    note: tuple[str, ...]

    def __len__(self) -> int:
        return len(self.time)

    @property
    def in_counts(self) -> bool:
        """True when the readings are counter values."""
        return self.reading.unit == "counts"
