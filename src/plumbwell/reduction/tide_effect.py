"""The tide correction of each reading: which tide it is, and how ours compares with the instrument's own.

The correction is added to readings. A row that gives the correction its instrument made is freed of it
in the calibration and gets the whole of ours; a row of an instrument that has made one without giving
it gets none. All rows are reckoned at the collar, at the level of the ground.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

from plumbwell.earth.longman import longman_tide
from plumbwell.earth.tide import tide_correction
from plumbwell.reduction.calibration import instrument_column, instruments_used, of_instrument
from plumbwell.survey.column import (
    Array,
    Column,
    Index,
    Input,
    Law,
    Setting,
    computed,
    constant_column,
    frozen,
    frozen_index,
)
from plumbwell.survey.errors import SurveyError
from plumbwell.survey.instrument import Instrument
from plumbwell.survey.places import TimeSeries
from plumbwell.survey.readings import Readings
from plumbwell.survey.site import Site

SHIFTS = (-7200.0, -3600.0, 0.0, 3600.0, 7200.0)
"""s; a clock set to another hour shows as the shift at which two tides agree."""

UTC = Law(
    "time of the reading",
    "UTC = instrument clock - clock_ahead",
    "definition",
    lambda time, instrument, clock_ahead: time - of_instrument(clock_ahead, instrument),
)


def utc_time(readings: Readings, instruments: tuple[Instrument, ...]) -> Column:
    """UTC of each row, s since 2000-01-01: the instrument's clock freed of what it is ahead.

    Parameters
    ----------
    readings : Readings
    instruments : tuple of Instrument
    """
    ahead = tuple(one.clock_ahead for one in instruments_used(readings, instruments))
    return computed(
        "utc",
        "s",
        UTC,
        Input("time", readings.time),
        Input("instrument", instrument_column(readings)),
        Input(
            "clock_ahead",
            Setting(key="clock_ahead", value=ahead, unit="s", origin="survey.toml, [instrument]"),
        ),
    )


def between(time: Any, series: TimeSeries) -> Any:
    """A time series at given times, by the cubic through the four rows around; NaN outside its span.

    Straight lines through the hourly rows of a tide err by 3 µGal where it bends; the cubic by less than 0.1 µGal.

    Parameters
    ----------
    time : float or (n,), UTC s since 2000-01-01
    series : TimeSeries
        With fewer than four rows the parabola or the line through all of them.

    Notes
    -----
    Lagrange's polynomial: sum over rows of value times the product of (t - t_j)/(t_i - t_j), j other than i.
    """
    rows, values = series.time.values, series.value.values
    time = np.asarray(time, dtype=np.float64)
    points = min(4, len(rows))
    first = np.clip(np.searchsorted(rows, time, side="right") - 2, 0, len(rows) - points)
    nodes = [rows[first + one] for one in range(points)]
    total = np.zeros(time.shape)
    for one in range(points):
        share = np.ones(time.shape)
        for other in range(points):
            if other != one:
                share = share * (time - nodes[other]) / (nodes[one] - nodes[other])
        total = total + share * values[first + one]
    return np.where((time < rows[0]) | (time > rows[-1]), np.nan, total)


def _at_known(utc: Any, modelled: Callable[[Array], Any]) -> Array:
    """A model of the tide at known times; NaN where a row has no time."""
    utc = np.asarray(utc, dtype=np.float64)
    known = np.isfinite(utc)
    values = np.full(utc.shape, np.nan)
    if known.any():
        values[known] = modelled(utc[known])
    return values


MODELS = {
    "ephemeris": Law(
        "tide of a rigid Earth",
        "sum over Moon and Sun of GM [(d - r)/|d - r|^3 - d/|d|^3] . n",
        "direct third-body difference; positions by ERFA (Meeus 1998; Simon et al. 1994)",
        lambda utc, place: _at_known(utc, lambda time: tide_correction(time, factor=1.0, **place)),
    ),
    "longman": Law(
        "tide of a rigid Earth",
        "vertical tide of Moon and Sun",
        "Longman 1959, J. Geophys. Res. 64, 2351-2355",
        lambda utc, place: _at_known(utc, lambda time: longman_tide(time, **place)),
    ),
}
TABLE = Law(
    "tide of the table",
    "the tide table at the time of the reading, cubic through the four rows around",
    "the survey's tide table",
    lambda utc, table: _at_known(utc, lambda time: between(time, table)),
)
LOADING = Law(
    "loading",
    "the loading series at the time of the reading, cubic through the four rows around",
    "the survey's loading table",
    lambda utc, loading: _at_known(utc, lambda time: between(time, loading)),
)
CORRECTION = Law(
    "tide correction",
    "factor x tide + loading; 0 where the reading holds its own",
    "common practice",
    lambda modelled, ours, factor, loading: np.where(
        np.asarray(ours) > 0.0, factor * np.asarray(modelled) + loading, 0.0
    ),
)
NONE = Law(
    "tide correction", "0: the recipe takes no tide out", "definition", lambda time: np.zeros_like(time)
)
OURS = Law(
    "whether the tide is ours",
    "1 where the reading gives the correction it holds, or its instrument has made none; else 0",
    "definition",
    lambda tide_in_reading, instrument, applied: np.where(
        np.isnan(tide_in_reading) & (of_instrument(applied, instrument) > 0.0), 0.0, 1.0
    ),
)


def tide_place(site: Site) -> dict[str, float]:
    """Where the tide is reckoned: the ground at the collar, in rad and m above the ellipsoid."""
    return {
        "latitude": site.latitude,
        "longitude": site.longitude,
        "height": site.ground_elevation + site.geoid_height,
    }


def modelled_tide(
    utc: Column, *, site: Site, source: str, tide_table: TimeSeries | None
) -> Column | None:
    """The tide at each row before the gravimetric factor, m/s2; None when the recipe takes no tide out.

    Parameters
    ----------
    utc : Column, s
    site : Site
    source : str
        "ephemeris", "longman", "table" or "none".
    tide_table : TimeSeries or None

    Raises
    ------
    SurveyError
        When the source is "table" and there is no table.
    """
    if source == "none":
        return None
    if source == "table":
        if tide_table is None:
            raise SurveyError('tide = "table" needs a tide table: name one as tide in [data]')
        table = Setting(key="tide_table", value=tide_table, unit="m/s2", origin="tide.csv")
        return computed("modelled_tide", "m/s2", TABLE, Input("utc", utc), Input("table", table))
    place = Setting(key="tide_place", value=tide_place(site), origin="survey.toml, [site]")
    return computed("modelled_tide", "m/s2", MODELS[source], Input("utc", utc), Input("place", place))


def tide(
    readings: Readings,
    instruments: tuple[Instrument, ...],
    modelled: Column | None,
    *,
    utc: Column,
    factor: float,
    loading: TimeSeries | None,
) -> Column:
    """Tide corrections, m/s2, added to calibrated readings, one a row.

    Parameters
    ----------
    readings : Readings
    instruments : tuple of Instrument
    modelled : Column or None
        From `modelled_tide`; None: all corrections are 0, and the calibration must not take the instrument's
        own correction out.
    utc : Column, s
    factor : float
        On the modelled tide: the gravimetric factor, or 1 for a tide table, which holds its own.
    loading : TimeSeries or None
        Added, cubic in time. Outside the span of a table the correction is NaN.
    """
    if modelled is None:
        return computed("tide", "m/s2", NONE, Input("time", readings.time))
    used = instruments_used(readings, instruments)
    applied = tuple(1.0 if "tide" in one.applied else 0.0 for one in used)
    held = readings.tide_in_reading
    if held is None:
        held = constant_column("tide_in_reading", "m/s2", np.full(len(readings), np.nan))
    ours = computed(
        "tide_is_ours",
        "",
        OURS,
        Input("tide_in_reading", held),
        Input("instrument", instrument_column(readings)),
        Input("applied", Setting(key="applied", value=applied, origin="survey.toml, [instrument]")),
    )
    load = Setting(key="ocean_loading", value=0.0, unit="m/s2", origin="no loading table")
    added: Column | Setting = load
    if loading is not None:
        series = Setting(key="ocean_loading", value=loading, unit="m/s2", origin="loading.csv")
        added = computed("loading", "m/s2", LOADING, Input("utc", utc), Input("loading", series))
    return computed(
        "tide",
        "m/s2",
        CORRECTION,
        Input("modelled", modelled),
        Input("ours", ours),
        Input("factor", Setting(key="tide_factor", value=factor, origin="recipe")),
        Input("loading", added),
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class TideComparison:
    """How the corrections that instruments made compare with ours, at several shifts of the clock.

    Parameters
    ----------
    rows : int
        Used rows that give the correction they hold.
    shifts : tuple of float, s
        Ours is taken that much later than the time of the reading.
    rms, largest : tuple of float, m/s2
        Root mean square and largest size of (instrument's less ours), one a shift.
    """

    rows: int
    shifts: tuple[float, ...]
    rms: tuple[float, ...]
    largest: tuple[float, ...]

    @property
    def best_shift(self) -> float:
        """The shift, s, at which both agree best."""
        return self.shifts[int(np.argmin(self.rms))]


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class ShiftedTides:
    """The rigid tide of our own at the rows that give theirs: `rows` of the readings, `rigid` (shifts, rows) m/s2."""

    rows: Index
    rigid: Array


def shifted_tides(readings: Readings, utc: Column, site: Site) -> ShiftedTides | None:
    """Our rigid tide at several shifts of the clock, for used rows that give the correction they hold."""
    if readings.tide_in_reading is None:
        return None
    rows = np.flatnonzero(
        readings.use & np.isfinite(readings.tide_in_reading.values) & np.isfinite(utc.values)
    )
    if rows.size == 0:
        return None
    times = np.add.outer(np.asarray(SHIFTS), utc.values[rows])
    # One call for all shifts: whole hours fall on the same raster of computed tides.
    rigid = tide_correction(times.ravel(), factor=1.0, **tide_place(site)).reshape(times.shape)
    return ShiftedTides(rows=frozen_index(rows), rigid=frozen(rigid))


def tide_comparison(readings: Readings, shifted: ShiftedTides | None, factor: float) -> TideComparison | None:
    """The instruments' own tide corrections against ours by ephemeris; None when no used row gives one.

    Parameters
    ----------
    readings : Readings
    shifted : ShiftedTides or None
    factor : float
        Gravimetric factor on the rigid tide.
    """
    if shifted is None or readings.tide_in_reading is None:
        return None
    apart = readings.tide_in_reading.values[shifted.rows] - factor * shifted.rigid
    return TideComparison(
        rows=len(shifted.rows),
        shifts=SHIFTS,
        rms=tuple(np.sqrt(np.mean(apart**2, axis=1)).tolist()),
        largest=tuple(np.max(np.abs(apart), axis=1).tolist()),
    )
