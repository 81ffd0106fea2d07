"""Words of the docket: numbers with their units, places, and lists that end before they tire."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from datetime import UTC, datetime, timedelta

import numpy as np

from plumbwell.study.results import Results
from plumbwell.survey.column import Index
from plumbwell.survey.errors import shown

MICROGAL = 1e-8
MILLIGAL = 1e-5
GRAM_PER_CM3 = 1000.0
HECTOPASCAL = 100.0
HOUR = 3600.0
LISTED = 6
"""Names in a list before the rest is counted."""


def amount(value: float, decimals: int, *, signed: bool = False) -> str:
    """A number with a true minus and no-break spaces between thousands."""
    text = f"{value:+,.{decimals}f}" if signed else f"{value:,.{decimals}f}"
    return text.replace(",", "\u00a0").replace("-", "\u2212")


def gravity(value: float, *, signed: bool = False) -> str:
    """A difference of gravity (m/s2) in microgal with one decimal, from 1000 on in milligal with three."""
    if abs(value) >= 999.95 * MICROGAL:
        return amount(value / MILLIGAL, 3, signed=signed) + " mGal"
    return amount(value / MICROGAL, 1, signed=signed) + " µGal"


def rate(value: float) -> str:
    """A drift rate (m/s3) in mGal/h, without the unit."""
    return f"{value / MILLIGAL * HOUR:g}".replace("-", "\u2212")


def density(value: float, decimals: int = 3) -> str:
    """A density (kg/m3) in g/cm3."""
    return amount(value / GRAM_PER_CM3, decimals) + " g/cm³"


def moment(seconds: float) -> str:
    """A time in s since 2000-01-01 as date and time of day, UTC."""
    return f"{datetime(2000, 1, 1, tzinfo=UTC) + timedelta(seconds=round(seconds)):%Y-%m-%d %H:%M:%S} UTC"


def counted(number: int, one: str, many: str = "") -> str:
    """A number with its noun: 1 station, 3 stations."""
    return f"{amount(number, 0)} {one if number == 1 else many or one + 's'}"


def listed(names: Sequence[str], most: int = LISTED) -> str:
    """Names parted by commas, the last by "and"; what is too much is counted."""
    words = list(names[:most])
    if len(names) > most:
        words.append(f"{amount(len(names) - most, 0)} more")
    return words[0] if len(words) == 1 else ", ".join(words[:-1]) + " and " + words[-1]


def numbers(of: Iterable[int] | Index) -> tuple[int, ...]:
    """Indices as plain whole numbers."""
    return tuple(of.tolist()) if isinstance(of, np.ndarray) else tuple(of)


def depth(results: Results, station: int) -> str:
    """The depth of a station's mark, or the elevation of a surveyed place, in m."""
    mark = float(results.stations.located.mark_depth.values[station])
    if np.isfinite(mark):
        return f"{amount(mark, 1)} m"
    return f"elevation {amount(float(results.stations.located.positions.elevation.values[station]), 1)} m"


def label(results: Results, number: int) -> str:
    """The label of a station, fit for a message."""
    return shown(results.stations.label[number])


def station(results: Results, number: int) -> str:
    """A station with its depth: `TB-03, 66.0 m`."""
    return f"{label(results, number)}, {depth(results, number)}"


def stations(results: Results, of: Index | Sequence[int], most: int = LISTED) -> str:
    """The labels of stations, the first few by name."""
    return listed([label(results, int(one)) for one in of[:most]] + [""] * (len(of) - most), most)


def interval(results: Results, number: int) -> str:
    """An interval with its depths: `TB-03 to TB-04, 66.0 m to 91.0 m`."""
    pairs = results.intervals.densities.pairs
    top, base = int(pairs.top[number]), int(pairs.base[number])
    return f"{interval_names(results, number)}, {depth(results, top)} to {depth(results, base)}"


def interval_names(results: Results, number: int) -> str:
    """The stations of an interval: `TB-03 to TB-04`."""
    return f"{shown(results.intervals.from_station[number])} to {shown(results.intervals.to_station[number])}"


def line(results: Results, row: int) -> int:
    """The physical line of a reading in its file."""
    return int(results.survey.readings.raw.lines[row])


def lines(results: Results, rows: Index | Sequence[int]) -> str:
    """Rows of the readings by file and physical line: `readings.csv, rows 12 and 13`."""
    first = [str(line(results, int(row))) for row in rows[:LISTED]] + [""] * (len(rows) - LISTED)
    return f"{results.survey.readings.raw.file}, {'row' if len(rows) == 1 else 'rows'} {listed(first)}"


def run(results: Results, code: int) -> str:
    """The label of a run."""
    return shown(results.survey.readings.run.names[code])
