"""What a survey can serve: counter and tide tables that readings lie in, instruments that rows name."""

from pathlib import Path

import pytest

from plumbwell.files.folder import read_survey
from plumbwell.study.acts import ActRefused, AddRecipe, ChooseRecipe, Exclude, Include, SetRecipe
from plumbwell.study.case import AS_SURVEYED, Case
from small_folder import READINGS, TOML

COUNTS = """\
time,station,depth [m],reading [counts],use
2026-05-04T09:00:00Z,A,100.0,1500,
2026-05-04T09:20:00Z,B,120.0,1700,
2026-05-04T09:40:00Z,A,100.0,2100,
2026-05-04T10:00:00Z,A,100.0,1510,
"""
TIDE = "time,tide [mGal]\n2026-05-04T08:00:00Z,0.01\n2026-05-04T09:00:00Z,0.02\n2026-05-04T09:30:00Z,0.03\n"


def read(folder: Path, toml: str, readings: str, **tables: str) -> Case:
    (folder / "survey.toml").write_text(toml, "utf-8")
    (folder / "readings.csv").write_text(readings, "utf-8")
    for name, text in tables.items():
        (folder / f"{name}.csv").write_text(text, "utf-8")
    return Case(survey=read_survey(folder))


def refused(act, case):
    with pytest.raises(ActRefused) as caught:
        act.apply(case)
    return str(caught.value)


def setting(key, value, name=AS_SURVEYED):
    return SetRecipe(name=name, key=key, value=value)


def test_a_counter_outside_the_table_is_an_error_only_while_no_used_row_needs_it(tmp_path):
    toml = TOML + '[instrument.A]\ncalibration = "table.csv"\n[recipe]\nout_of_table = "extend"\n'
    table = "counter [counts],gravity [mGal]\n1400,3000\n1600,3200\n1800,3400\n"
    case = read(tmp_path, toml, COUNTS, table=table)
    assert refused(setting("out_of_table", "error"), case) == (
        'A counter outside the table cannot be an "error": row 4 of readings.csv is in use and lies outside.'
    )
    without = Exclude(rows=(2,), reason="spike").apply(case)
    strict = setting("out_of_table", "error").apply(without)
    assert refused(Include(rows=(2,)), strict) == (
        "Row 4 of readings.csv cannot be used: its counter value lies outside the calibration table."
    )
    assert Include(rows=(2,)).apply(without).overlay == case.overlay


def test_a_recipe_is_not_chosen_that_the_readings_do_not_allow(tmp_path):
    toml = TOML + '[instrument.A]\ncalibration = "table.csv"\n[recipe]\nout_of_table = "extend"\n'
    table = "counter [counts],gravity [mGal]\n1400,3000\n1600,3200\n1800,3400\n"
    case = Exclude(rows=(2,), reason="spike").apply(read(tmp_path, toml, COUNTS, table=table))
    case = AddRecipe(name="strict", based_on=AS_SURVEYED).apply(case)
    case = setting("out_of_table", "error", "strict").apply(case)
    case = Include(rows=(2,)).apply(case)
    assert "is in use and lies outside" in refused(ChooseRecipe(name="strict"), case)


def test_a_tide_table_spans_the_used_readings(tmp_path):
    toml = TOML + 'tide = "tide.csv"\n'
    readings = READINGS.replace("time,station", "time,run,station").replace("Z,", "Z,1,")
    case = read(tmp_path, toml, readings, tide=TIDE)
    assert refused(setting("tide", "table"), case) == (
        'The tide cannot be "table": the table goes from 2026-05-04 08:00:00 UTC to 2026-05-04 09:30:00 UTC, '
        "which leaves out row 4 of readings.csv."
    )
    inside = setting("tide", "table").apply(Exclude(rows=(2,), reason="late").apply(case))
    assert refused(Include(rows=(2,)), inside) == (
        "Row 4 of readings.csv cannot be used: its time lies outside the tide table."
    )


def test_a_row_names_its_instrument_where_there_are_several(tmp_path):
    toml = TOML + "[instrument.A]\n[instrument.B]\n"
    readings = (
        "time,instrument,station,depth [m],reading [mGal],use\n"
        "2026-05-04T09:00:00Z,A,A,100.0,4000.010,\n"
        "2026-05-04T09:20:00Z,B,B,120.0,4001.900,\n"
        "2026-05-04T09:40:00Z,,A,100.0,4000.020,no\n"
        "2026-05-04T09:50:00Z,A,A,100.0,4000.020,no\n"
    )
    case = read(tmp_path, toml, readings)
    assert refused(Include(rows=(2,)), case) == (
        "Row 4 of readings.csv cannot be used: it names no instrument, and the survey has several."
    )
    assert Include(rows=(3,)).apply(case).overlay.rows[0].use


def test_a_row_at_a_surveyed_place_needs_no_depth(tmp_path):
    readings = READINGS + "2026-05-04T09:50:00Z,HUT,,4000.020\n"
    readings = readings.replace("reading [mGal]\n", "reading [mGal],use\n").replace("\n2026", ",\n2026")[:-1] + ",no\n"
    readings = readings.replace("use,\n", "use\n")
    places = "station,east [m],north [m],elevation [m]\nHUT,5,5,180.0\n"
    case = read(tmp_path, TOML + 'places = "places.csv"\n', readings, places=places)
    assert not case.survey.readings.use[3]
    assert Include(rows=(3,)).apply(case).overlay.rows[0].use


def test_a_station_whose_label_is_not_written_may_be_the_datum(tmp_path):
    readings = READINGS.replace("Z,B,", "Z,,")
    case = read(tmp_path, TOML, readings)
    assert setting("datum_station", "120.00").apply(case).chosen.datum_station == "120.00"
    assert "one line, without control characters" in refused(setting("datum_station", "a\x07"), case)
