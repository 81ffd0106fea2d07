"""Words of the history: which readings an act is about, when they were taken, and values of settings."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import UTC, datetime, timedelta
from typing import Any

import numpy as np

from plumbwell.study.docket.wording import amount, counted, listed
from plumbwell.survey.errors import shown
from plumbwell.survey.readings import Readings
from plumbwell.survey.recipe import KEYS, Recipe, as_written

MILLIGAL = 1e-5
NAMED = 3
"""Stations or runs that are named before they are only counted."""
# Not from the system's language: the whole program speaks one.
MONTHS = (
    "January", "February", "March", "April", "May", "June", "July", "August", "September", "October", "November",
    "December",
)  # fmt: skip
UNITS = {"g/cm3": "g/cm³", "uGal": "µGal", "uGal/hPa": "µGal/hPa"}


def _moment(seconds: float) -> datetime:
    return datetime(2000, 1, 1, tzinfo=UTC) + timedelta(seconds=seconds)


def clock(seconds: float, *, exact: bool = False) -> str:
    """The time of day, UTC, of s since 2000-01-01: "09:13"; where asked, with the seconds that it has."""
    moment = _moment(round(seconds) if exact else seconds)
    return f"{moment:%H:%M:%S}" if exact and moment.second else f"{moment:%H:%M}"


def day(seconds: float) -> str:
    """The day, UTC, of s since 2000-01-01: "4 May 2026"."""
    moment = _moment(seconds)
    return f"{moment.day} {MONTHS[moment.month - 1]} {moment.year}"


def readings_words(readings: Readings, rows: Sequence[int]) -> str:
    """How many readings, of which stations, and when: "3 readings of station S12, 09:13 to 09:15 UTC on 4 May 2026"."""
    words = f"{counted(len(rows), 'reading')}{_place(readings, rows)}"
    times = readings.time.values[np.asarray(rows, dtype=np.intp)]
    times = times[np.isfinite(times)]
    if not len(times):
        return words
    first, last = float(times.min()), float(times.max())
    if day(first) != day(last):
        return f"{words}, {clock(first)} UTC on {day(first)} to {clock(last)} UTC on {day(last)}"
    span = clock(first) if clock(first) == clock(last) else f"{clock(first)} to {clock(last)}"
    return f"{words}, {span} UTC on {day(first)}"


def _place(readings: Readings, rows: Sequence[int]) -> str:
    """Of which stations some readings are; where they have no labels, from which depths."""
    at = np.asarray(rows, dtype=np.intp)
    codes = list(dict.fromkeys(readings.station.code[at].tolist()))
    if -1 not in codes:
        if len(codes) > NAMED:
            return f" of {counted(len(codes), 'station')}"
        names = [shown(readings.station.names[code]) for code in codes]
        return f" of station{'' if len(names) == 1 else 's'} {listed(names)}"
    depths = readings.depth.values[at]
    if np.isnan(depths).any():
        return ""
    low, high = amount(float(depths.min()), 2), amount(float(depths.max()), 2)
    return f" at {low} m" if low == high else f" between {low} and {high} m"


def tare_words(run: str, time: float) -> str:
    """A tare by its run and time: "run 2 at 11:42 UTC on 4 May 2026"."""
    return f"run {shown(run)} at {clock(time, exact=True)} UTC on {day(time)}"


def size_words(size: float | None, size_sd: float | None) -> str:
    """What is known of a tare's size (m/s2), as it stands behind its time; empty for nothing."""
    if size is None:
        return ""
    held = f", {_plain(size / MILLIGAL, signed=True)} mGal"
    return f"{held}, held" if size_sd is None else f"{held} with an sd of {_plain(size_sd / MILLIGAL)} mGal"


def _plain(value: float, *, signed: bool = False) -> str:
    return f"{float(f'{value:.12g}'):{'+' if signed else ''}.9g}".replace("-", "\u2212")


def setting_words(recipe: Recipe, key: str) -> str:
    """The value of a key of a recipe as people read it: "2.67 g/cm³", "as given", "0.3072 ± 0.0004 mGal/m"."""
    return value_words(key, as_written(recipe)[key])


def value_words(key: str, value: Any) -> str:
    """A written value of a key as people read it."""
    unit = KEYS[key].unit
    behind = f" {UNITS.get(unit, unit)}" if unit else ""
    if value is None:
        return "the highest station"
    if isinstance(value, dict) and all(isinstance(value.get(name), int | float) for name in ("gradient", "sd")):
        return f"{_plain(value['gradient'])} ± {_plain(value['sd'])}{behind}"
    if isinstance(value, str):
        return value.replace("_", " ") if value in KEYS[key].words else shown(value)
    if isinstance(value, bool) or not isinstance(value, int | float):
        return shown(value)
    if value in KEYS[key].words:
        return f"{value:g}"
    return f"{_plain(value)}{behind}"
