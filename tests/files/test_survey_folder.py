"""A right survey folder becomes values in SI that know the line and the text they come from."""

from __future__ import annotations

import hashlib
import math
import os
from pathlib import Path

import numpy as np
import pytest

from plumbwell.files.folder import read_survey
from plumbwell.survey.errors import InputError
from plumbwell.survey.recipe import Recipe
from plumbwell.survey.survey import Survey

TOML = """\
format = "plumbwell-survey/1"

[site]
name = "Hollow Fell 1"
latitude = 54.5
longitude = 357.0
ground_elevation = 180.0
depth_datum_height = 5.2
vertical_datum = "local"
{site}
[data]
readings = "readings.csv"
{data}
[instrument.A]
applied = ["tide"]
scale = 1.0002
clock_ahead = 12.0
reading_floor = 0.002
drift_rate_sd = 0.05

[[run]]
name = "2"
instrument = "A"
depth_shift = 0.15
drift_order = 2
{more}
"""
READINGS = """\
# morning trip
time,run,station,depth [ft],reading [mGal],reading_sd [uGal],pressure [hPa],tilt_x [arcsec],use,gamma [API]

2026-05-04T09:00:00Z,1,A,100.0,4000.010,5,1002.5,3.5,yes,55
2026-05-04T11:20:00.25+02:00,1,B,120.0,4001.900,,,−2,,60
2026-05-04T09:40:00Z,2,A,,hopeless,5,,,No,60
2026-05-04T09:50:00Z,2,"A, again",100.0,4000.020,5,,,,
"""


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "readings.csv").write_text(READINGS, encoding="utf-8")
    return tmp_path


def _read(folder: Path, *, site: str = "", data: str = "", more: str = "", **tables: str) -> Survey:
    (folder / "survey.toml").write_text(TOML.format(site=site, data=data, more=more), encoding="utf-8")
    for name, text in tables.items():
        (folder / f"{name}.csv").write_text(text, encoding="utf-8")
    return read_survey(folder)


def _codes(survey: Survey) -> list[str]:
    return [note.code for note in survey.notes]


def test_site_in_si(folder: Path) -> None:
    site = _read(folder, site="collar_elevation = 170.0").site
    assert site.latitude == pytest.approx(math.radians(54.5), rel=1e-15)
    assert site.longitude == pytest.approx(math.radians(-3.0), rel=1e-12)
    assert (site.ground_elevation, site.collar_elevation, site.datum_elevation) == (180.0, 170.0, 175.2)
    assert site.carried == (("vertical_datum", "local"),)


def test_instrument_and_run_in_si(folder: Path) -> None:
    survey = _read(folder)
    (instrument,) = survey.instruments
    assert (instrument.name, instrument.applied, instrument.scale) == ("A", ("tide",), 1.0002)
    assert instrument.clock_ahead == 12.0
    assert instrument.reading_floor == pytest.approx(2e-8, rel=1e-12)
    assert instrument.drift_rate_sd == pytest.approx(0.05e-5 / 3600.0, rel=1e-12)
    (run,) = survey.runs
    assert (run.name, run.depth_shift, run.drift_order) == ("2", 0.15, 2)


def test_readings_in_si_with_their_origin(folder: Path) -> None:
    readings = _read(folder).readings
    np.testing.assert_allclose(readings.depth.values, [30.48, 36.576, math.nan, 30.48], rtol=1e-14)
    np.testing.assert_allclose(
        readings.reading.values[[0, 1, 3]], [0.0400001, 0.040019, 0.0400002], rtol=1e-12
    )
    assert readings.reading.unit == "m/s2" and not readings.in_counts
    assert math.isnan(readings.reading.values[2])
    assert readings.time.values.tolist() == [831200400.0, 831201600.25, 831202800.0, 831203400.0]
    assert readings.reading_sd is not None and readings.pressure is not None and readings.tilt_x is not None
    np.testing.assert_allclose(readings.reading_sd.values, [5e-8, math.nan, 5e-8, 5e-8], rtol=1e-12)
    np.testing.assert_allclose(readings.pressure.values[0], 100250.0, rtol=1e-12)
    np.testing.assert_allclose(readings.tilt_x.values[:2], np.radians([3.5 / 3600, -2.0 / 3600]), rtol=1e-12)
    assert readings.use.tolist() == [True, True, False, True]
    assert readings.station.as_list() == ["A", "B", "A", "A, again"]
    assert readings.run.as_list() == ["1", "1", "2", "2"]
    assert set(readings.instrument.as_list()) == {"A"}
    origin = readings.depth.origin
    assert origin is not None
    assert (origin.file, origin.heading, origin.lines.tolist()) == (
        "readings.csv",
        "depth [ft]",
        [4, 5, 6, 7],
    )
    assert origin.cells == ("100.0", "120.0", "", "100.0")


def test_unknown_columns_are_kept_as_written(folder: Path) -> None:
    raw = _read(folder).readings.raw
    assert raw.cells[raw.headings.index("gamma [API]")] == ("55", "60", "60", "")


def test_what_is_no_error_is_told(folder: Path) -> None:
    notes = {note.code: note for note in _read(folder).notes}
    assert set(notes) == {"typographic_minus", "unused_row_unreadable", "time_offset_changes"}
    assert notes["unused_row_unreadable"].place == "readings.csv, row 6, reading [mGal]"
    assert notes["time_offset_changes"].severity == "note"


def test_without_an_instrument_table_there_is_one_called_1(tmp_path: Path) -> None:
    text = TOML.format(site="", data="", more="").split("[instrument.A]")[0]
    (tmp_path / "survey.toml").write_text(text)
    (tmp_path / "readings.csv").write_text(READINGS, encoding="utf-8")
    survey = read_survey(tmp_path / "survey.toml")
    assert [one.name for one in survey.instruments] == ["1"]
    assert set(survey.readings.instrument.as_list()) == {"1"}


def test_recipe_in_si_and_what_was_written(folder: Path) -> None:
    survey = _read(
        folder,
        more='[recipe]\nvisit_gap = 20\nfree_air = { gradient = 0.3072, sd = 0.0004 }\ndrift_walk = "auto"\n',
    )
    assert survey.recipe.visit_gap == 1200.0
    assert survey.recipe.free_air == pytest.approx((0.3072e-5, 0.0004e-5))
    assert survey.recipe_given == {"visit_gap", "free_air", "drift_walk"}
    assert _read(folder).recipe == Recipe()


def test_files_carry_their_digests(folder: Path) -> None:
    files = {one.name: one.sha256 for one in _read(folder).files}
    assert set(files) == {"survey.toml", "readings.csv"}
    assert files["readings.csv"] == hashlib.sha256((folder / "readings.csv").read_bytes()).hexdigest()


def test_tares_logs_and_named_heights(folder: Path) -> None:
    log = "depth [m],rho [kg/m3],cali [in]\n12,2400,8\n11,2300,9\n13,,8\n"
    more = """
[[tare]]
run = "2"
time = 2026-05-04T11:42:00+02:00
size = -0.05
size_sd = 0.01

[[log]]
file = "log.csv"
caliper = "cali"
depth_shift = 0.5
"""
    survey = _read(folder, data="barometer_elevation = 182.35", more=more, log=log)
    (tare,) = survey.tares
    assert (tare.run, tare.time) == ("2", 831202920.0)
    assert tare.size == pytest.approx(-0.05e-5) and tare.size_sd == pytest.approx(0.01e-5)
    assert survey.barometer_elevation == 182.35
    (one,) = survey.logs
    assert (one.curve, one.datum_height, one.depth_shift) == ("rho", 5.2, 0.5)
    np.testing.assert_array_equal(one.depth.values, [11.0, 12.0, 13.0])
    np.testing.assert_array_equal(one.density.values, [2300.0, 2400.0, math.nan])
    assert one.caliper is not None and one.caliper.values[0] == pytest.approx(9 * 0.0254)
    assert one.depth.origin is not None and one.depth.origin.lines.tolist() == [3, 2, 4]
    assert "log_unordered" in _codes(survey)


def test_side_tables(folder: Path) -> None:
    survey = _read(
        folder,
        data='places = "places.csv"\nties = "ties.csv"\npath = "path.csv"\nmarkers = "markers.csv"\n'
        'ocean_loading = "loading.csv"',
        places="station,depth [m],east [m],north [m],elevation [m],role\nP,,1,2,3,Base\nQ,50,,,,\n",
        ties="station,gravity [mGal],gravity_sd [mGal]\nA,981000.5,0.02\n",
        path="depth [m],inclination [deg],azimuth [deg]\n0,0,0\n50,95,370\n",
        markers="marker,depth [m],density [g/cm3]\nlower,30,2.7\nupper,10,2.5\n",
        loading="time,tide [uGal]\n2026-05-04T08:00:00Z,1\n2026-05-04T09:00:00Z,2\n2026-05-04T10:00:00Z,3\n",
    )
    assert survey.places is not None and survey.ties is not None and survey.path is not None
    assert survey.places.role == ("base", "column")
    assert survey.places.elevation.values[0] == 3.0 and math.isnan(survey.places.depth.values[0])
    assert survey.places.elevation_sd.unit == "m" and np.isnan(survey.places.elevation_sd.values).all()
    assert survey.ties.gravity.values[0] == pytest.approx(9.810005, rel=1e-14)
    assert survey.path.inclination.values[1] == pytest.approx(math.radians(95.0))
    assert survey.markers is not None and survey.markers.marker == ("upper", "lower")
    assert survey.markers.density.values.tolist() == [2500.0, 2700.0]
    assert survey.loading is not None and survey.loading.value.values.tolist() == pytest.approx(
        [1e-8, 2e-8, 3e-8]
    )
    assert {"path_climbs", "azimuth_wrapped", "north_assumed", "markers_ordered"} <= set(_codes(survey))


def test_loading_must_span_the_readings_by_utc_too(folder: Path) -> None:
    """The instrument's clock is 12 s ahead, so the first reading was taken at 08:59:48."""
    rows = "time,tide [mGal]\n2026-05-04T08:59:50Z,0\n2026-05-04T09:50:00Z,0\n"
    with pytest.raises(InputError, match="spans the readings, 2026-05-04T08:59:48Z to 2026-05-04T09:50:00Z"):
        _read(folder, data='ocean_loading = "loading.csv"', loading=rows)


def test_what_this_version_does_not_take_into_account_is_listed(folder: Path) -> None:
    survey = _read(
        folder,
        site="water_depth = 3.0\nfar_elevation = 40.0",
        data='openings = "openings.csv"\ngradients = "gradients.csv"',
        more='[[terrain]]\nfile = "grid.csv"\n[[water]]\nlevel = 171.0\n',
        openings="",
        gradients="",
        grid="",
    )
    assert survey.not_applied == (
        ("openings", "[data] openings"),
        ("gradients", "[data] gradients"),
        ("terrain", "[[terrain]] grid.csv"),
        ("water", "[[water]]"),
        ("water", "[site] water_depth"),
        ("terrain", "[site] far_elevation"),
    )
    assert {one.name for one in survey.files} == {"survey.toml", "readings.csv"}


def test_named_but_unread_file_must_be_there(folder: Path) -> None:
    with pytest.raises(
        InputError, match=r'\[data\] bodies: found no such file; expected the file "bodies.csv"'
    ):
        _read(folder, data='bodies = "bodies.csv"')


def test_unknown_keys_tables_and_misspelt_columns_want_a_look(folder: Path) -> None:
    text = READINGS.replace("gamma [API]", "sensor_ofset [m]")
    (folder / "readings.csv").write_text(text, encoding="utf-8")
    survey = _read(folder, site="rig = 5", more="[crew]\nlead = 1\n")
    looks = {note.place: note for note in survey.notes if note.severity == "look"}
    assert looks["survey.toml, row 10, [site] rig"].text == 'the key "rig" in [site] is not known and has no effect'
    assert looks["survey.toml, row 26, crew"].text == "the table [crew] is not known and has no effect"
    looks = {note.code: note for note in survey.notes if note.severity == "look"}
    assert looks["unknown_column"].mend == "if it is meant so, rename it to sensor_offset [m]"


def test_calibration_table_and_the_extended_recipe(folder: Path) -> None:
    readings = READINGS.replace("reading [mGal]", "reading [counts]")
    (folder / "readings.csv").write_text(readings, encoding="utf-8")
    text = TOML.format(site="", data="", more='[recipe]\nout_of_table = "extend"\n')
    text = text.replace("scale = 1.0002", 'calibration = "calibration.csv"')
    (folder / "survey.toml").write_text(text)
    (folder / "calibration.csv").write_text("counter [counts],gravity [mGal]\n0,0\n100,100.64\n")
    survey = read_survey(folder)
    assert survey.readings.in_counts and survey.readings.reading.values[0] == 4000.01
    calibration = survey.instruments[0].calibration
    assert calibration is not None and calibration.gravity.values[1] == pytest.approx(100.64e-5)


def test_times_out_of_order_and_equal_are_told(folder: Path) -> None:
    text = READINGS.replace("2026-05-04T09:40:00Z,2,A,,hopeless", "2026-05-04T09:55:00Z,2,A,1,1").replace(
        "No", ""
    )
    text += "2026-05-04T09:50:00Z,2,A,100.0,4000.020,5,,,,\n"
    (folder / "readings.csv").write_text(text, encoding="utf-8")
    notes = {note.code: note.place for note in _read(folder).notes}
    assert notes["times_run_back"] == "readings.csv, row 7"
    assert notes["equal_times"] == "readings.csv, row 8"


def test_reading_a_folder_writes_nothing(folder: Path) -> None:
    _read(folder)
    assert sorted(one.name for one in folder.iterdir()) == ["readings.csv", "survey.toml"]


def test_a_table_that_lies_there_unnamed_is_told(folder: Path) -> None:
    survey = _read(folder, path="depth [m],inclination [deg],azimuth [deg]\n0,0,0\n")
    assert survey.path is None
    (note,) = [note for note in survey.notes if note.code == "table_not_named"]
    assert note.mend == 'write path = "path.csv" under [data] of survey.toml, if it belongs to the survey'


def test_a_run_with_two_instruments_is_told(folder: Path) -> None:
    text = READINGS.replace(",use,", ",instrument,").replace(",yes,", ",A,").replace("hopeless", "1")
    text = (
        text.replace("−2,,60", "-2,A,60").replace(",No,", ",A,").replace("4000.020,5,,,,", "4000.020,5,,,B,")
    )
    (folder / "readings.csv").write_text(text, encoding="utf-8")
    survey = _read(
        folder, data='places = "places.csv"', more="[instrument.B]\n", places="station,depth [m]\nA,1\n"
    )
    (note,) = [note for note in survey.notes if note.code == "run_two_instruments"]
    assert note.text == 'the run "2" has readings of several instruments ("A", "B")'


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="this system has no named pipes")
def test_a_pipe_is_refused_without_waiting(folder: Path) -> None:
    os.mkfifo(folder / "path.csv")
    with pytest.raises(InputError, match="found not a plain file"):
        _read(folder, data='path = "path.csv"')


def test_labels_that_differ_by_blanks_or_from_a_place_are_told(folder: Path) -> None:
    text = READINGS.replace('"A, again"', "a").replace(",B,", ",p 1,")
    (folder / "readings.csv").write_text(text, encoding="utf-8")
    survey = _read(folder, data='places = "places.csv"', places="station,depth [m]\nP1,3\n")
    told = [note.text for note in survey.notes if note.code == "labels_alike"]
    assert told == [
        'the stations "A" and "a" differ only by case or blanks and count as two',
        'the station "p 1" and the place "P1" differ only by case or blanks and count as two',
    ]


@pytest.mark.parametrize(("easting", "told"), [(500_000.0, False), (500_020.0, True)])
def test_map_coordinates_are_compared_with_latitude_and_longitude(folder: Path, easting: float, told: bool) -> None:
    """On the central meridian of UTM zone 30 (3 deg W), at 54.5 deg N; 20 m beside it is over 5 m off."""
    site = f'horizontal_crs = "EPSG:32630"\neasting = {easting}\nnorthing = 6039154.23\n'
    (folder / "survey.toml").write_text(TOML.format(site=site, data="", more=""), encoding="utf-8")
    survey = read_survey(folder)
    assert ("position_differs" in {note.code for note in survey.notes}) is told
    assert dict(survey.site.carried)["horizontal_crs"] == "EPSG:32630"
