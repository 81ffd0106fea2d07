"""What the plate of a reduced survey says, from results in SI."""

import pytest

from plumbwell.files.folder import read_survey
from plumbwell.plates.figure_of import survey_plate
from plumbwell.study.case import Case
from plumbwell.study.reduce import reduce

SURVEY = """format = "plumbwell-survey/1"
[site]
name = "Tolmire 4"
latitude = 50.0
longitude = 9.0
ground_elevation = 500.0
[instrument.A]
kind = "gravimeter"
[data]
readings = "readings.csv"
"""


def plate_of(folder, rows):
    """Return the plate of a survey with (hour, run, station, depth, reading) rows, three readings each."""
    lines = ["time,run,station,depth [m],reading [mGal]"]
    for hour, run, station, depth, reading in rows:
        for minute in range(3):
            moved = reading + 0.001 * (minute - 1)
            lines.append(f"2026-03-03T{hour:02d}:{minute:02d}:00Z,{run},{station},{depth},{moved:.4f}")
    folder.joinpath("readings.csv").write_text("\n".join(lines) + "\n", encoding="utf-8")
    folder.joinpath("survey.toml").write_text(SURVEY, encoding="utf-8")
    return survey_plate(reduce(Case(survey=read_survey(folder))))


@pytest.fixture
def there_and_back(tmp_path):
    depths = (10.0, 40.0, 81.5)
    order = (0, 1, 2, 1, 0)
    return plate_of(
        tmp_path, [(hour, "1", f"S{i}", depths[i], 4000 + 0.1 * depths[i]) for hour, i in enumerate(order)]
    )


def test_the_subtitle_counts_in_the_singular_too(there_and_back, tmp_path):
    assert there_and_back.subtitle == "3 stations, 2 intervals, to 81.5 m"
    assert plate_of(tmp_path, [(8, "1", "S1", 250.0, 4000.0)]).subtitle == "1 station, to 250 m"


def test_the_datum_station_has_no_standard_deviation(there_and_back):
    datum, *others = there_and_back.stations
    assert (datum.gravity, datum.gravity_sd, datum.anomaly_sd) == (0.0, None, None)
    assert all(station.gravity_sd > 0 for station in others)


def test_what_densities_share_is_told_with_the_decimals_it_bears(there_and_back):
    shared = max(interval.common_sd for interval in there_and_back.intervals)
    assert 0.003 <= shared < 0.0095, "one figure, three decimals"
    assert f"common to all densities: \u00b1 {shared:.3f} g/cm\u00b3 (1 sd)" in there_and_back.remarks


def test_stations_that_nothing_joins_are_in_different_parts(tmp_path):
    rows = [
        (hour, run, station, depth, 4000 + 0.1 * depth)
        for hour, (run, station, depth) in enumerate(
            [("1", "A", 10.0), ("1", "B", 30.0), ("1", "A", 10.0)]
            + [("2", "C", 50.0), ("2", "D", 70.0), ("2", "C", 50.0)]
        )
    ]
    parts = {station.label: station.part for station in plate_of(tmp_path, rows).stations}
    assert parts["A"] == parts["B"] != parts["C"] == parts["D"]
