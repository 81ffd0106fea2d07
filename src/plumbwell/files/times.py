"""Times of a table: ISO 8601 texts to UTC seconds since 2000-01-01T00:00:00Z, or what is wrong with them.

Days have 86 400 s here (no leap seconds). A time without a zone needs the zone that the survey
states; a local time that a clock change makes double or impossible is refused, never guessed.
"""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass, field
from datetime import UTC, date, datetime, timedelta, timezone, tzinfo
from functools import lru_cache

import numpy as np

from plumbwell.files.number_cells import BadCell
from plumbwell.survey.column import Array
from plumbwell.survey.errors import shown

EXPECTED = "a time such as 2026-05-04T09:13:20Z or 2026-05-04T11:13:20+02:00"
EPOCH_DAY = date(2000, 1, 1).toordinal()
FIRST_YEAR, LAST_YEAR = 1950, 2100

_TIME = re.compile(
    r"(\d{4})-(\d\d)-(\d\d)[T ](\d\d):(\d\d)(?::(\d\d)(?:[.,](\d{1,9}))?)?\s?(Z|[+-]\d\d(?::?\d\d)?)?",
    re.ASCII | re.IGNORECASE,
)
_OFFSET = re.compile(r"(?:UTC|GMT)?([+-])(\d{1,2})(?::?(\d\d))?", re.ASCII | re.IGNORECASE)
_ENDING = re.compile(r"[Zz]|[+-]\d\d(?::?\d\d)?", re.ASCII)
_PLAIN_WIDTH = len("2026-05-04T09:13:20")


class ZoneUnknown(ValueError):
    """A time zone that is neither an IANA name nor an offset."""


def zone(name: str) -> tzinfo:
    """The time zone of an IANA name ("Europe/Oslo") or an offset ("+02:00").

    Raises
    ------
    ZoneUnknown
    """
    name = name.strip()
    if name.upper() in ("UTC", "Z", "GMT"):
        return UTC
    if match := _OFFSET.fullmatch(name):
        minutes = int(match[2]) * 60 + int(match[3] or 0)
        if minutes <= 15 * 60:
            return timezone(timedelta(minutes=-minutes if match[1] == "-" else minutes))
    if re.fullmatch(r"[A-Za-z0-9_+\-]{1,40}(?:/[A-Za-z0-9_+\-]{1,40}){0,2}", name):
        from zoneinfo import ZoneInfo

        try:
            return ZoneInfo(name)
        except (
            OSError,
            ValueError,
            KeyError,
        ):  # not in the zone data; each of the three is met, by kind of name
            pass
    raise ZoneUnknown(name)


@dataclass(slots=True)
class Times:
    """Times of a column.

    Parameters
    ----------
    values : (n,) float64 array
        UTC, s since 2000-01-01T00:00:00Z; NaN where the cell is empty or bad.
    bad : list of BadCell
    leap, midnight : list of int
        Rows with 23:59:60 and with 24:00:00, which count as 00:00:00 of the next day.
    offsets : set of float
        The offsets from UTC, s, that the cells themselves state.
    to_minutes : int
        How many cells state no seconds.
    """

    values: Array
    bad: list[BadCell] = field(default_factory=list)
    leap: list[int] = field(default_factory=list)
    midnight: list[int] = field(default_factory=list)
    offsets: set[float] = field(default_factory=set)
    to_minutes: int = 0


def times_of(cells: Sequence[str], *, local: tzinfo | None = None) -> Times:
    """Times of a column of cells.

    Parameters
    ----------
    cells : sequence of str
        ISO 8601; date and time parted by T or a blank; a zone as Z, +02:00, +0200 or +02.
    local : tzinfo or None
        Zone of cells that state none; None: such a cell is bad.
    """
    plain = _plain_times(cells, local)
    if plain is not None:
        return plain
    times = Times(np.full(len(cells), math.nan))
    days: dict[tuple[str, str, str], int | str] = {}
    for row, cell in enumerate(cells):
        if cell:
            found = _one(cell, row, times, days, local)
            if isinstance(found, BadCell):
                times.bad.append(found)
            else:
                times.values[row] = found
    return times


def _plain_times(cells: Sequence[str], local: tzinfo | None) -> Times | None:
    """Times when all cells are plain times to the second with one ending, all at once; else None."""
    if not cells:
        return None
    ending = cells[0][_PLAIN_WIDTH:]
    width = _PLAIN_WIDTH + len(ending)
    if len(ending) > 6 or any(len(cell) != width for cell in cells):
        return None
    if ending and (not _ENDING.fullmatch(ending) or any(cell[_PLAIN_WIDTH:] != ending for cell in cells)):
        return None
    codes = np.array(cells, dtype=f"U{width}").view(np.uint32).reshape(len(cells), width)[:, :_PLAIN_WIDTH]
    marks = {4: "-", 7: "-", 13: ":", 16: ":"}
    if any((codes[:, at] != ord(mark)).any() for at, mark in marks.items()):
        return None
    if not ((codes[:, 10] == ord("T")) | (codes[:, 10] == ord(" "))).all():
        return None
    at = [place for place in range(_PLAIN_WIDTH) if place not in marks and place != 10]
    digits = codes[:, at].astype(np.int64) - ord("0")
    if (digits < 0).any() or (digits > 9).any():
        return None
    year, month, day = digits[:, :4] @ [1000, 100, 10, 1], digits[:, 4:6] @ [10, 1], digits[:, 6:8] @ [10, 1]
    hour, minute, second = (digits[:, at : at + 2] @ [10, 1] for at in (8, 10, 12))
    if (hour > 23).any() or (minute > 59).any() or (second > 59).any():
        return None
    stated = _offset_seconds(ending) if ending else None
    dates, which = np.unique(year * 10000 + month * 100 + day, return_inverse=True)
    starts = []
    for one in dates.tolist():
        days = _day(f"{one // 10000:04d}", f"{one // 100 % 100:02d}", f"{one % 100:02d}")
        if isinstance(days, str):
            return None
        shift = stated if ending else _shift_of_day(days, local)
        if shift is None:
            return None
        starts.append(days * 86400.0 - shift)
    values = np.array(starts)[which] + (hour * 3600 + minute * 60 + second)
    return Times(values, offsets=set() if stated is None else {stated})


@lru_cache(maxsize=4096)
def _shift_of_day(days: int, local: tzinfo | None) -> float | None:
    """Offset from UTC, s, of all local times of a day; None where it changes, or there is no zone."""
    if local is None:
        return None
    start = datetime.fromordinal(EPOCH_DAY + days)
    ends = (start, start + timedelta(hours=23, minutes=59, seconds=59))
    offsets = {end.replace(tzinfo=local, fold=fold).utcoffset() for end in ends for fold in (0, 1)}
    offset = offsets.pop()
    return offset.total_seconds() if offset is not None and not offsets else None


def _day(year: str, month: str, day: str) -> int | str:
    """Days since 2000-01-01, or what is wrong with the date."""
    if not FIRST_YEAR <= int(year) <= LAST_YEAR:
        return f"correct the year: it must lie between {FIRST_YEAR} and {LAST_YEAR}"
    try:
        return date(int(year), int(month), int(day)).toordinal() - EPOCH_DAY
    except ValueError:
        return "correct the date: there is no such day"


def _one(
    cell: str, row: int, times: Times, days: dict[tuple[str, str, str], int | str], local: tzinfo | None
) -> float | BadCell:
    """Seconds of one cell; what it needs to be told about is put into `times`."""
    match = _TIME.fullmatch(cell)
    if match is None:
        return BadCell(row, f'"{shown(cell)}"', _mend_of(cell))
    year, month, day, hour, minute, second, fraction, offset = match.groups()
    key = (year, month, day)
    if key not in days:
        days[key] = _day(*key)
    number = days[key]
    if isinstance(number, str):
        return BadCell(row, f'"{shown(cell)}"', number)
    hours, minutes, seconds = int(hour), int(minute), int(second or 0)
    part = int(fraction.ljust(9, "0")) / 1e9 if fraction else 0.0
    end_of_day = hours == 24 and minutes == seconds == 0 and part == 0.0
    if (hours > 23 and not end_of_day) or minutes > 59 or seconds > 60:
        return BadCell(row, f'"{shown(cell)}"', "correct the time of day: there is no such time")
    if end_of_day:
        times.midnight.append(row)
    if second is None:
        times.to_minutes += 1
    clock = hours * 3600 + minutes * 60 + seconds
    if offset is None:
        local_shift = _local_shift(cell, row, number, hours, minutes, min(seconds, 59), local)
        if isinstance(local_shift, BadCell):
            return local_shift
        shift = local_shift
    else:
        stated = _offset_seconds(offset)
        if stated is None:
            return BadCell(row, f'"{shown(cell)}"', "correct the offset from UTC: it lies beyond 15 hours")
        times.offsets.add(stated)
        shift = stated
    whole = number * 86400 + clock - shift
    if seconds == 60:
        if whole % 86400:
            return BadCell(
                row, f'"{shown(cell)}"', "correct the seconds: 60 stands only in 23:59:60 UTC, a leap second"
            )
        times.leap.append(row)
        return float(whole)
    return whole + part


def _offset_seconds(offset: str) -> float | None:
    if offset in "Zz":
        return 0.0
    digits = offset[1:].replace(":", "")
    seconds = int(digits[:2]) * 3600.0 + int(digits[2:] or 0) * 60.0
    if seconds > 15 * 3600 or int(digits[2:] or 0) > 59:
        return None
    return -seconds if offset[0] == "-" else seconds


def _local_shift(
    cell: str, row: int, days: int, hours: int, minutes: int, seconds: int, local: tzinfo | None
) -> float | BadCell:
    """Offset from UTC, s, of a local time, or why there is none or more than one."""
    if local is None:
        return BadCell(
            row,
            f'"{shown(cell)}", a time without a zone',
            "write the zone behind the time (Z for UTC, or +02:00), or time_zone under [data] of survey.toml",
        )
    of_day = _shift_of_day(days, local)
    if of_day is not None and hours < 24:
        return of_day
    moment = datetime.fromordinal(EPOCH_DAY + days) + timedelta(hours=hours, minutes=minutes, seconds=seconds)
    early = moment.replace(tzinfo=local, fold=0)
    first, second = early.utcoffset(), moment.replace(tzinfo=local, fold=1).utcoffset()
    assert first is not None and second is not None
    if first == second:
        return first.total_seconds()
    readings = " or ".join(
        f"{moment - one:%Y-%m-%dT%H:%M:%SZ}" for one in sorted((first, second), reverse=True)
    )
    if second > first:  # the clock jumped forward over this time
        return BadCell(
            row,
            f'"{shown(cell)}", a local time that {local} skips at its clock change',
            f"write the time with its offset; it could mean {readings}",
        )
    return BadCell(
        row,
        f'"{shown(cell)}", a local time that occurs twice in {local} at its clock change',
        f"write the time with its offset; it could mean {readings}",
    )


def _mend_of(cell: str) -> str:
    """How to mend a cell that is no ISO 8601 time."""
    if re.fullmatch(r"\d{1,2}[/.\-]\d{1,2}[/.\-]\d{2}(\d{2})?\D.*", cell + " "):
        return "write year, month and day in this order; day and month first cannot be told apart"
    if re.fullmatch(r"\d{1,2}:\d\d(:\d\d)?(\.\d+)?", cell):
        return "write the date before the time of day"
    if re.fullmatch(r"\d{4}-\d\d-\d\d", cell):
        return "write the time of day after the date"
    if re.fullmatch(r"\d+(\.\d+)?", cell):
        return "write a date and a time; a bare number of days or seconds can mean several"
    return "write the time in that form"


def iso(seconds: float) -> str:
    """A time in s since 2000-01-01 as ISO 8601 text in UTC, with milliseconds where it has some."""
    moment = datetime(2000, 1, 1, tzinfo=UTC) + timedelta(seconds=round(seconds, 3))
    return (
        f"{moment:%Y-%m-%dT%H:%M:%S}"
        + (f".{moment.microsecond // 1000:03d}" if moment.microsecond else "")
        + "Z"
    )
