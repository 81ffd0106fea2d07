"""Surveyed places, ties, path, markers and time series: the tables that stand beside the readings."""

from __future__ import annotations

from dataclasses import dataclass

from plumbwell.survey.column import Column


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Places:
    """Levels, tunnels, base stations, underground collars, (n,) each.

    Parameters
    ----------
    station : tuple of str
    depth : Column
        m on the path; NaN where the place is surveyed.
    east, north, elevation : Column
        m; east and north from the collar, elevation above sea level; NaN where the place is on the path.
    elevation_sd : Column
        m; NaN: the recipe's depth_sd.
    role : tuple of str
        "column" or "base".
    note : tuple of str
    """

    station: tuple[str, ...]
    depth: Column
    east: Column
    north: Column
    elevation: Column
    elevation_sd: Column
    role: tuple[str, ...]
    note: tuple[str, ...]


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Ties:
    """Known gravity at stations' sensor level: `station`, `gravity` and `gravity_sd` in m/s2."""

    station: tuple[str, ...]
    gravity: Column
    gravity_sd: Column


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Path:
    """Deviation survey: measured depth m (rising), inclination rad (0 to pi), azimuth rad (as given)."""

    depth: Column
    inclination: Column
    azimuth: Column


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Markers:
    """Formation tops: `marker`, measured `depth` m, `density` kg/m3 (NaN: none)."""

    marker: tuple[str, ...]
    depth: Column
    density: Column


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class TimeSeries:
    """A tide or loading table: `time` UTC s since 2000-01-01 (rising), `value` m/s2, added to readings."""

    time: Column
    value: Column
