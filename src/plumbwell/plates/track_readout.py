"""What the tracks show at one depth, in words: the read-out at the crosshair. Paints nothing.

Each value has forms from the longest to the shortest, so that a narrow track can leave out its standard deviation or
shorten its name, but never leave out a figure.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.plates.numbers import number, with_sd
from plumbwell.plates.track import PointColumns, StepColumns, Track

LOG_NAME = "log"
BESIDE_NAME = "beside"


@dataclass(frozen=True, slots=True, kw_only=True)
class Reading:
    """A value at a depth: its forms, the longest first, the name before it, and the colour role of its curve."""

    forms: tuple[str, ...]
    name: str = ""
    role: str = "ink"


def _step_at(columns: StepColumns, depth: float) -> tuple[float, float | None] | None:
    """Return value and standard deviation of the step around a depth; of two that meet there, the lower one."""
    number_of = int(np.searchsorted(columns.top, depth, side="right")) - 1
    if number_of < 0 or depth > columns.base[number_of]:
        return None
    sd = float(columns.sd[number_of])
    return float(columns.value[number_of]), sd if np.isfinite(sd) else None


def _forms(track: Track, value: float, sd: float | None) -> tuple[str, ...]:
    plain = number(value, track.decimals, signed=track.signed)
    return (plain,) if sd is None else (with_sd(value, sd, decimals=track.decimals, signed=track.signed), plain)


def readings_at(track: Track, depth: float, *, reach: float = 0.0) -> list[Reading]:
    """Return what a track shows at a depth, curve by curve; nothing where its curves do not reach.

    Parameters
    ----------
    track : Track
    depth : float
    reach : float
        How far from a stacked bar its standard deviation is still told.
    """
    found = []
    sources: list[tuple[StepColumns | PointColumns, str]] = [
        (track.step_columns, ""),
        (track.beside_columns, track.beside_name or BESIDE_NAME),
        (track.point_columns, ""),
        *((curve.columns, curve.name) for curve in track.lines),
    ]
    for columns, name in sources:
        here = _step_at(columns, depth) if isinstance(columns, StepColumns) else columns.at(depth)
        if here is not None:
            found.append(Reading(forms=_forms(track, *here), name=name))
    away = np.abs(track.bar_columns.depth - depth)
    if len(away) and away.min() <= reach:
        found.append(Reading(forms=_forms(track, float(track.bar_columns.sd[away.argmin()]), None)))
    value = None if track.line is None else track.line.at(depth)
    if value is not None:
        name = (track.line_name or LOG_NAME) if found else ""
        found.append(Reading(forms=_forms(track, value, None), name=name, role="log"))
    return found


def told(track: Track, depth: float, *, reach: float = 0.0) -> str:
    """Return what a track shows at a depth as one phrase with title and unit; empty where it shows nothing."""
    readings = readings_at(track, depth, reach=reach)
    values = ", ".join(f"{reading.name} {reading.forms[0]}".lstrip() for reading in readings)
    return f"{track.title} {values} {track.unit}".rstrip() if values else ""
