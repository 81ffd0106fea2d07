"""Whose tide a reading gets, from which source, at which time, and how the instrument's own compares."""

import numpy as np
import pytest

from plumbwell.earth.longman import longman_tide
from plumbwell.earth.tide import rigid_tide
from plumbwell.reduction.tide_effect import modelled_tide, shifted_tides, tide, tide_comparison, utc_time
from plumbwell.survey.column import constant_column
from plumbwell.survey.errors import SurveyError
from plumbwell.survey.instrument import Instrument
from plumbwell.survey.places import TimeSeries
from plumbwell.survey.site import Site

SITE = Site(
    name="Made up",
    latitude=np.radians(40.0),
    longitude=np.radians(-105.0),
    ground_elevation=1550.0,
    collar_elevation=1500.0,
    geoid_height=50.0,
)
PLACE = {"latitude": SITE.latitude, "longitude": SITE.longitude, "height": 1600.0}
START = 8.0e8  # s, in 2025
TIMES = START + np.array([0.0, 1234.5, 9e4, 4e5, 4.1e5])


def series(time, value):
    return TimeSeries(time=constant_column("time", "s", time), value=constant_column("tide", "m/s2", value))


def corrections(readings, *instruments, source="ephemeris", factor=1.16, table=None, loading=None):
    utc = utc_time(readings, instruments)
    modelled = modelled_tide(utc, site=SITE, source=source, tide_table=table)
    factor = 1.0 if source == "table" else factor
    return tide(readings, instruments, modelled, utc=utc, factor=factor, loading=loading)


def compared(readings, factor=1.16):
    utc = utc_time(readings, (Instrument(name="A"),))
    return tide_comparison(readings, shifted_tides(readings, utc, SITE), factor)


def test_ephemeris_and_longman_are_the_rigid_tide_of_the_ground_times_the_factor(made_readings):
    readings = made_readings(np.zeros(5), time=TIMES)
    found = corrections(readings, Instrument(name="A"), factor=1.2)
    assert found.values == pytest.approx(1.2 * rigid_tide(TIMES, **PLACE), abs=2e-12)
    found = corrections(readings, Instrument(name="A"), source="longman", factor=1.2)
    assert found.values == pytest.approx(1.2 * longman_tide(TIMES, **PLACE), abs=1e-18)


def test_a_clock_that_is_ahead_is_set_back(made_readings):
    readings = made_readings(np.zeros(4), time=TIMES[:4], instrument=["A", "B", "A", "B"])
    instruments = (Instrument(name="B", clock_ahead=3600.0), Instrument(name="A"))
    assert (readings.time.values - utc_time(readings, instruments).values).tolist() == [
        0.0,
        3600.0,
        0.0,
        3600.0,
    ]
    found = corrections(readings, *instruments, factor=1.0)
    assert found.values == pytest.approx(rigid_tide(TIMES[:4] - [0, 3600, 0, 3600], **PLACE), abs=2e-12)


def test_whose_tide_it_is(made_readings):
    readings = made_readings(
        np.zeros(4),
        time=TIMES[:4],
        instrument=["A", "A", "B", "B"],
        tide_in_reading=[3e-7, np.nan, 3e-7, np.nan],
    )
    instruments = (Instrument(name="A", applied=("tide", "tilt")), Instrument(name="B"))
    ours = 1.16 * rigid_tide(TIMES[:4], **PLACE)
    # A cell means the tide is in and comes out again; without one, `applied` decides.
    assert corrections(readings, *instruments).values == pytest.approx(ours * [1, 0, 1, 1], abs=2e-12)
    assert not corrections(readings, *instruments, source="none").values.any()


def test_an_hourly_table_gives_the_tide_between_its_rows(made_readings):
    hours = START + 3600.0 * np.arange(30)
    wave = lambda time: 1e-6 * np.sin(2 * np.pi * (time - START) / (12.42 * 3600.0))  # noqa: E731
    times = START + np.array([0.0, 1800.0, 5400.0, 9000.0, 50000.0, 104399.0])
    found = corrections(
        made_readings(np.zeros(6), time=times), Instrument(name="A"), source="table", table=series(hours, wave(hours))
    )
    # Four points: error up to 9/384 of the fourth difference, h^4 omega^4 of the size inside, more in the end cells.
    assert found.values == pytest.approx(wave(times), abs=4e-9)
    assert np.abs(found.values - wave(times))[2:5].max() < 1.6e-9


def test_table_and_loading_are_straight_between_few_rows(made_readings):
    readings = made_readings(np.zeros(3), time=START + np.array([0.0, 900.0, 4500.0]))
    table = series(START + np.array([0.0, 7200.0]), [1e-7, 9e-7])
    loading = series(START + np.array([-3600.0, 7200.0]), [0.0, 12e-9])
    found = corrections(readings, Instrument(name="A"), source="table", factor=9.0, table=table)
    assert found.values == pytest.approx([1e-7, 2e-7, 6e-7], rel=1e-12)
    both = corrections(readings, Instrument(name="A"), source="table", table=table, loading=loading)
    assert both.values - found.values == pytest.approx([4e-9, 5e-9, 9e-9], rel=1e-9)
    stays = corrections(
        readings, Instrument(name="A", applied=("tide",)), source="table", table=table, loading=loading
    )
    assert not stays.values.any()


def test_outside_a_table_the_tide_is_not_known(made_readings):
    readings = made_readings(np.zeros(2), time=[START, START + 9000.0])
    table = series([START, START + 3600.0], [0.0, 1e-7])
    found = corrections(readings, Instrument(name="A"), source="table", table=table)
    assert found.values[0] == 0.0 and np.isnan(found.values[1])
    with pytest.raises(SurveyError, match='tide = "table" needs a tide table'):
        corrections(readings, Instrument(name="A"), source="table")


@pytest.mark.parametrize("source", ["ephemeris", "longman", "table", "none"])
def test_each_cell_is_worked_out_anew_and_a_row_without_time_has_no_tide(made_readings, source):
    readings = made_readings(np.zeros(6), time=[*TIMES, np.nan], use=[True] * 5 + [False])
    table = series(START + np.array([-1e5, 1e6]), [0.0, 1e-6])
    found = corrections(readings, Instrument(name="A"), source=source, table=table, loading=table)
    worked = [found.worked(row) for row in range(5)]
    assert worked == pytest.approx(found.values[:5].tolist(), rel=1e-12, abs=1e-18)
    if source != "none":
        assert np.isnan(found.values[5]) and np.isnan(found.worked(5))


def test_the_comparison_finds_the_hour_at_which_the_instruments_tide_fits(made_readings):
    time = START + np.arange(40) * 700.0
    own = 1.16 * rigid_tide(time + 3600.0, **PLACE) + 2e-9
    readings = made_readings(
        np.zeros(40), time=time, tide_in_reading=[*own[:-2], np.nan, 1.0], use=[True] * 39 + [False]
    )
    found = compared(readings)
    assert found.rows == 38 and found.best_shift == 3600.0
    best = found.shifts.index(3600.0)
    assert found.rms[best] == pytest.approx(2e-9, rel=1e-3) and found.largest[best] == pytest.approx(
        2e-9, rel=1e-2
    )
    assert min(rms for shift, rms in zip(found.shifts, found.rms, strict=True) if shift != 3600.0) > 5e-8


def test_without_an_own_tide_there_is_nothing_to_compare(made_readings):
    assert compared(made_readings([0.0])) is None
    readings = made_readings([0.0], tide_in_reading=[np.nan])
    assert compared(readings) is None
