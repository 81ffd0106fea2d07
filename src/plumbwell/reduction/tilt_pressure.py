"""Tilt and air pressure: two small corrections that rest on the cells beside a reading.

The tilt correction is added; the effect of air pressure is to be subtracted. Nothing is taken out that
the instrument has already taken out, and no pressure that is not the free air's.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from plumbwell.earth.atmosphere import pressure_effect as air_pressure_effect
from plumbwell.earth.atmosphere import standard_pressure
from plumbwell.reduction.calibration import instrument_column, instruments_used, of_instrument
from plumbwell.survey.column import Array, Column, Index, Input, Law, Setting, computed, constant_column
from plumbwell.survey.instrument import Instrument
from plumbwell.survey.readings import Readings

LARGEST_DEPARTURE = 8000.0
"""Pa (80 hPa); no weather is farther from the standard atmosphere."""

STEEPEST_RISE = 2.0
"""Pa per m of depth (0.02 hPa/m); the air of a drift has about 0.12 hPa/m, water 98 hPa/m."""

LEAST_RANGE = 10.0
"""m; a smaller range of depths says nothing about a rise with depth."""


def tilt_correction(*, tilt_x: Any, tilt_y: Any, normal_gravity: Any) -> Any:
    """What a tilted gravimeter reads too little, m/s2: gamma (1 - cos x cos y).

    Parameters
    ----------
    tilt_x, tilt_y : float or (n,), rad
        NaN counts as level.
    normal_gravity : float or (n,), m/s2
        The whole gravity at the station, not the reading, which is relative.

    Notes
    -----
    1 - cos x cos y = 2 sin2(x/2) + 2 cos x sin2(y/2), without cancellation.
    """
    x, y = np.where(np.isnan(tilt_x), 0.0, tilt_x), np.where(np.isnan(tilt_y), 0.0, tilt_y)
    tilted = np.asarray((x != 0.0) | (y != 0.0))
    size = 2.0 * np.sin(x / 2) ** 2 + 2.0 * np.cos(x) * np.sin(y / 2) ** 2
    return np.where(tilted, normal_gravity * size, 0.0)


TILT = Law(
    "tilt correction",
    "gamma (1 - cos x cos y); 0 where the instrument has applied it or gives no tilt",
    "geometry; gamma is normal gravity at the station",
    lambda tilt_x, tilt_y, normal_gravity, instrument, applied: np.where(
        of_instrument(applied, instrument) > 0.0,
        0.0,
        tilt_correction(tilt_x=tilt_x, tilt_y=tilt_y, normal_gravity=normal_gravity),
    ),
)


def _has_applied(readings: Readings, instruments: tuple[Instrument, ...], what: str) -> tuple[float, ...]:
    return tuple(1.0 if what in one.applied else 0.0 for one in instruments_used(readings, instruments))


def _or_missing(column: Column | None, key: str, unit: str, rows: int) -> Column:
    return column if column is not None else constant_column(key, unit, np.full(rows, np.nan))


def tilt(
    readings: Readings, instruments: tuple[Instrument, ...], *, gravity: Column, station_rows: Index | None
) -> Column:
    """Tilt corrections, m/s2, added to calibrated readings, one a row.

    Parameters
    ----------
    readings : Readings
    instruments : tuple of Instrument
    gravity : Column, m/s2
        Normal gravity at the stations.
    station_rows : (n,) int array or None
        Row of `gravity` that belongs to each reading; None: `gravity` has one a reading.
    """
    applied = _has_applied(readings, instruments, "tilt")
    return computed(
        "tilt",
        "m/s2",
        TILT,
        Input("tilt_x", _or_missing(readings.tilt_x, "tilt_x", "rad", len(readings))),
        Input("tilt_y", _or_missing(readings.tilt_y, "tilt_y", "rad", len(readings))),
        Input("normal_gravity", gravity, station_rows),
        Input("instrument", instrument_column(readings)),
        Input("applied", Setting(key="applied", value=applied, origin="survey.toml, [instrument]")),
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class PressureFact:
    """What was done with the pressures of one instrument in one run, and why.

    Parameters
    ----------
    instrument, run : str
    rows : int
        Used rows that give a pressure.
    reason : str
        "": the effect is taken out. Else it is not: "in reading" (the instrument has done it), "far" (some
        pressure is more than 80 hPa from the standard) or "rises" (with depth by more than 0.02 hPa/m).
    largest : float, Pa
        The difference from the standard pressure that is largest in size, with its sign.
    largest_row : int
        The row of that difference.
    rise : float, Pa per m
        Least-squares slope of that difference with depth; NaN where depths range over less than 10 m.
    """

    instrument: str
    run: str
    rows: int
    reason: str
    largest: float
    largest_row: int
    rise: float


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Pressure:
    """Effect of air pressure on each reading, and what was found about the pressures.

    Parameters
    ----------
    column : Column, (n,), m/s2
        To be subtracted; 0 where nothing is taken out.
    facts : tuple of PressureFact
        One for each instrument and run with pressures.
    """

    column: Column
    facts: tuple[PressureFact, ...]


PRESSURE_EFFECT = Law(
    "effect of air pressure",
    "admittance x (p - p0(H)), p0 = 1013.25 (1 - 0.0065 H/288.15)^5.2559 hPa; 0 where no air pressure stands",
    "IAG 1983, resolution 9; ISO 2533",
    lambda pressure, barometer_elevation, is_air, admittance: np.where(
        np.asarray(is_air) > 0.0,
        air_pressure_effect(pressure, barometer_height=barometer_elevation, admittance=admittance),
        0.0,
    ),
)


def _rise(departure: Array, depth: Array) -> float:
    """Least-squares slope of pressure differences with depth, Pa per m; NaN under the least range."""
    known = np.isfinite(depth)
    departure, depth = departure[known], depth[known]
    if len(depth) < 2 or np.ptp(depth) < LEAST_RANGE:
        return np.nan
    centred = depth - depth.mean()
    return float(centred @ (departure - departure.mean()) / (centred @ centred))


def pressure_effect(
    readings: Readings,
    instruments: tuple[Instrument, ...],
    *,
    admittance: float,
    barometer_elevation: Column | float,
    rows: Index | None,
    depth_below_ground: Array,
) -> Pressure:
    """Effects of air pressure, m/s2, to be subtracted from calibrated readings, and what was found.

    Parameters
    ----------
    readings : Readings
    instruments : tuple of Instrument
    admittance : float, m/s2 per Pa
        Negative: more air above lifts.
    barometer_elevation : Column or float, m above sea level
        A column when the barometer went with the instrument.
    rows : (n,) int array or None
        Row of that column which belongs to each reading; None: it has one a reading.
    depth_below_ground : (n,), m
        Of the sensor at each reading.

    Notes
    -----
    An instrument's pressures of a run count as the air's unless a used one is more than 80 hPa from the
    standard or they rise by more than 0.02 hPa per m of depth (over 10 m or more): such a gauge stands in
    fluid or in a drift's own air.
    """
    number = len(readings)
    pressure = _or_missing(readings.pressure, "pressure", "Pa", number)
    if isinstance(barometer_elevation, Column):
        height = Input("barometer_elevation", barometer_elevation, rows)
    else:
        origin = "survey.toml, [data] barometer_elevation; else the ground at the collar"
        stated = Setting(key="barometer_elevation", value=float(barometer_elevation), unit="m", origin=origin)
        height = Input("barometer_elevation", stated)
    departure = pressure.values - standard_pressure(height.values())
    applied = of_instrument(_has_applied(readings, instruments, "pressure"), readings.instrument.code) > 0.0
    is_air = np.zeros(number)
    given = np.isfinite(departure)
    runs = len(readings.run.names)
    pairs = readings.instrument.code[given] * runs + readings.run.code[given]
    at = np.flatnonzero(given)
    facts = []
    for pair in np.unique(pairs).tolist():
        instrument, run = divmod(pair, runs)
        all_rows = at[pairs == pair]
        used = all_rows[readings.use[all_rows]]
        if not len(used):
            continue
        worst = used[np.argmax(np.abs(departure[used]))]
        rise = _rise(departure[used], np.asarray(depth_below_ground)[used])
        reason = ""
        if applied[all_rows[0]]:
            reason = "in reading"
        elif abs(departure[worst]) > LARGEST_DEPARTURE:
            reason = "far"
        elif rise > STEEPEST_RISE:
            reason = "rises"
        else:
            is_air[all_rows] = np.abs(departure[all_rows]) <= LARGEST_DEPARTURE
        facts.append(
            PressureFact(
                instrument=readings.instrument.names[instrument],
                run=readings.run.names[run],
                rows=len(used),
                reason=reason,
                largest=float(departure[worst]),
                largest_row=int(worst),
                rise=rise,
            )
        )
    column = computed(
        "pressure_effect",
        "m/s2",
        PRESSURE_EFFECT,
        Input("pressure", pressure),
        height,
        Input("is_air", constant_column("is_air", "", is_air)),
        Input(
            "admittance",
            Setting(key="pressure_admittance", value=admittance, unit="m/s2/Pa", origin="recipe"),
        ),
    )
    return Pressure(column=column, facts=tuple(facts))
