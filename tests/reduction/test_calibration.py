"""Calibrated readings: table, end slopes, scale, the tide that a reading holds, and each cell's working."""

import numpy as np
import pytest

from plumbwell.reduction.calibration import calibrated, outside_table
from plumbwell.survey.column import constant_column
from plumbwell.survey.errors import SurveyError
from plumbwell.survey.instrument import Calibration, Instrument

TABLE = Calibration(
    counter=constant_column("counter", "counts", [1000.0, 1100.0, 1300.0]),
    gravity=constant_column("gravity", "m/s2", [10e-3, 11e-3, 13.4e-3]),
)


def test_a_counter_is_read_off_the_table_and_its_end_slopes(made_readings):
    readings = made_readings([1000.0, 1050.0, 1100.0, 1250.0, 1400.0, 900.0], unit="counts")
    found = calibrated(readings, (Instrument(name="A", calibration=TABLE),), remove_tide=True)
    # Slopes 1e-5 and 1.2e-5 m/s2 a count.
    assert found.values == pytest.approx([10e-3, 10.5e-3, 11e-3, 12.8e-3, 14.6e-3, 9e-3], rel=1e-14)
    assert (
        outside_table(readings, (Instrument(name="A", calibration=TABLE),)).tolist()
        == [False] * 4 + [True] * 2
    )


def test_scale_works_on_the_reading_freed_of_the_tide_it_holds(made_readings):
    readings = made_readings([1e-3, 2e-3, 3e-3], tide_in_reading=[1e-6, np.nan, -2e-6])
    instruments = (Instrument(name="A", scale=1.5),)
    freed = calibrated(readings, instruments, remove_tide=True)
    assert freed.values == pytest.approx([1.5 * 0.999e-3, 3e-3, 1.5 * 3.002e-3], rel=1e-14)
    kept = calibrated(readings, instruments, remove_tide=False)
    assert kept.values == pytest.approx([1.5e-3, 3e-3, 4.5e-3], rel=1e-14)
    assert not outside_table(readings, instruments).any()


def test_each_row_belongs_to_its_own_instrument_by_name(made_readings):
    readings = made_readings([1000.0, 1000.0, 1200.0], unit="counts", instrument=["B", "A", "B"])
    other = Calibration(
        counter=constant_column("counter", "counts", [0.0, 1000.0]),
        gravity=constant_column("gravity", "m/s2", [0.0, 5e-3]),
    )
    instruments = (
        Instrument(name="A", calibration=TABLE),
        Instrument(name="B", calibration=other, scale=2.0),
    )
    found = calibrated(readings, instruments, remove_tide=True)
    assert found.values == pytest.approx([10e-3, 10e-3, 12e-3], rel=1e-14)
    assert outside_table(readings, instruments).tolist() == [False, False, True]


def test_each_cell_is_worked_out_anew(made_readings):
    readings = made_readings(
        [1011.7, 1287.3, np.nan],
        unit="counts",
        instrument=["A", "B", "A"],
        tide_in_reading=[3e-7, np.nan, 0.0],
    )
    instruments = tuple(Instrument(name=name, calibration=TABLE, scale=1.0003) for name in "AB")
    found = calibrated(readings, instruments, remove_tide=True)
    assert [found.worked(row) for row in range(2)] == found.values[:2].tolist()
    assert np.isnan(found.worked(2)) and np.isnan(found.values[2])


def test_counts_without_a_table_and_unknown_instruments_are_refused(made_readings):
    readings = made_readings([1000.0], unit="counts")
    with pytest.raises(
        SurveyError, match="instrument A: its readings are counts and it has no calibration table"
    ):
        calibrated(readings, (Instrument(name="A"),), remove_tide=True)
    with pytest.raises(SurveyError, match=r"no \[instrument.A\] in survey.toml describes"):
        calibrated(readings, (Instrument(name="B"),), remove_tide=True)
