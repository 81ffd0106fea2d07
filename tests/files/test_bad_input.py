"""What a person is told when a survey folder is wrong: the whole text, since that is all they have."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from plumbwell.files.folder import read_survey
from plumbwell.survey.errors import InputError
from small_folder import READINGS, TOML

TIME_EXPECTED = "a time such as 2026-05-04T09:13:20Z or 2026-05-04T11:13:20+02:00"

Told = Callable[..., str]


def test_the_folder_that_the_others_spoil_is_right(tmp_path: Path) -> None:
    (tmp_path / "survey.toml").write_text(TOML)
    (tmp_path / "readings.csv").write_text(READINGS)
    survey = read_survey(tmp_path)
    assert (len(survey.readings), survey.notes) == (3, ())


def test_unknown_unit_is_told_once_and_alone(told: Told) -> None:
    assert told(readings=READINGS.replace("depth [m]", "depth [fathems]")) == (
        'readings.csv, row 1, depth [fathems]: found the unit "fathems"; expected one of the units m, cm, '
        "mm, km, "
        "ft, ftUS, in; to mend: write one of these units in square brackets, as in depth [m]"
    )


def test_unit_of_another_dimension(told: Told) -> None:
    text = told(readings=READINGS.replace("reading [mGal]", "reading [m]"))
    assert text.startswith(
        'readings.csv, row 1, reading [m]: found the unit "m"; expected one of the units mGal, uGal, Gal, '
        "m/s2, "
    )


def test_measured_column_without_unit(told: Told) -> None:
    assert told(readings=READINGS.replace("depth [m]", "depth")) == (
        "readings.csv, row 1, depth: found a measured column without a unit; expected one of the units m, "
        "cm, mm, "
        "km, ft, ftUS, in; to mend: write the unit in square brackets, as in depth [m]"
    )


def test_required_column_missing_names_the_nearest(told: Told) -> None:
    assert told(readings=READINGS.replace("reading [mGal]", "readng [mGal]")) == (
        "readings.csv, row 1, reading: found no such column (the header has time, station, depth [m], "
        'readng [mGal]); expected a column reading [mGal]; to mend: rename the column "readng [mGal]" to '
        "reading [mGal], if that is it"
    )


def test_time_without_zone(told: Told) -> None:
    assert told(readings=READINGS.replace("09:20:00Z", "09:20:00")) == (
        'readings.csv, row 3, time: found "2026-05-04T09:20:00", a time without a zone; '
        f"expected {TIME_EXPECTED}; to mend: write the zone behind the time (Z for UTC, or +02:00), or "
        f"time_zone "
        "under [data] of survey.toml"
    )


def test_times_at_a_clock_change_name_both_readings(told: Told) -> None:
    readings = READINGS.replace("2026-05-04T09:20:00Z", "2026-03-29T02:30:00")
    readings = readings.replace("2026-05-04T09:40:00Z", "2026-10-25T02:30:00")
    assert told(TOML + 'time_zone = "Europe/Oslo"\n', readings).split("\n") == [
        'readings.csv, row 3, time: found "2026-03-29T02:30:00", a local time that Europe/Oslo skips at its '
        "clock "
        f"change; expected {TIME_EXPECTED}; to mend: write the time with its offset; it could mean "
        "2026-03-29T00:30:00Z or 2026-03-29T01:30:00Z",
        'readings.csv, row 4, time: found "2026-10-25T02:30:00", a local time that occurs twice in '
        "Europe/Oslo at "
        f"its clock change; expected {TIME_EXPECTED}; to mend: write the time with its offset; it could mean "
        "2026-10-25T00:30:00Z or 2026-10-25T01:30:00Z",
    ]


def test_time_with_the_day_first(told: Told) -> None:
    assert told(readings=READINGS.replace("2026-05-04T09:20:00Z", "04/05/2026 09:20")) == (
        f'readings.csv, row 3, time: found "04/05/2026 09:20"; expected {TIME_EXPECTED}; to mend: write '
        f"year, month "
        "and day in this order; day and month first cannot be told apart"
    )


def test_ragged_rows(told: Told) -> None:
    readings = READINGS.replace("B,120.0,", "B,").replace("4000.020", "4000,020")
    assert told(readings=readings).split("\n") == [
        "readings.csv, row 3: found 3 cells; expected 4, as the header has; to mend: write the missing "
        "cells; "
        "an unknown one stays empty between its commas",
        "readings.csv, row 4: found 5 cells; expected 4, as the header has; to mend: put a cell that holds a "
        "comma "
        "in quotes, and write decimal marks as points",
    ]


@pytest.mark.parametrize(
    ("cell", "mend"),
    [
        ("NaN", "leave the cell empty where there is no value"),
        ("inf", "leave the cell empty where there is no value"),
        ("off scale", "write a number, or leave the cell empty"),
        ('"1,234.5"', "write the number without thousands marks"),
        ("1 234.5", "write the number without thousands marks"),
        ("1'234.5", "write the number without thousands marks"),
        ('"12,5"', "write the decimal mark as a point"),
        (
            '"1,234"',
            "write it without the comma if that marks thousands, with a point if it is the decimal mark",
        ),
        ("1_000", "write the number without underscores"),
        ("12.5 m", "write the number alone; the unit stands once, in the heading"),
        ("５０", "write the number with the digits 0 to 9"),
        (".5", "write a digit before the decimal point"),
        ("5.", "write a digit after the decimal point, or no point"),
        ("1d3", "write the exponent with e"),
        ("1e400", "write a number that a computer can hold (under 1e308)"),
        ("'12", "remove the apostrophe"),
        ("=A1", "write the value, not a formula"),
        ("*****", "leave the cell empty; the number was too wide for the program that wrote it"),
    ],
)
def test_cell_that_is_no_number(told: Told, cell: str, mend: str) -> None:
    shown = cell.strip('"')
    assert told(readings=READINGS.replace("120.0", cell)) == (
        f'readings.csv, row 3, depth [m]: found "{shown}"; expected a number such as 12.5; to mend: {mend}'
    )


def test_reading_that_is_missing_or_text(told: Told) -> None:
    readings = READINGS.replace("4001.900", "").replace("4000.020", "off scale")
    assert told(readings=readings) == (
        "readings.csv, row 3, reading [mGal]: found an empty cell, and 1 more row: 4; expected a number such as "
        "12.5; to mend: write the value, or set use = no in the row"
    )


def test_missing_value_marks_are_not_taken_as_values(told: Told) -> None:
    readings = READINGS.replace("4000.010", "-999.25").replace("4000.020", "-999.25")
    assert told(readings=readings) == (
        "readings.csv, row 2, reading [mGal]: found -999.25 in 2 rows (rows 2, 4), far from all other "
        "values; "
        "expected an empty cell where there is no value; to mend: empty these cells, or set use = no in "
        "these rows"
    )


def test_nul_byte(told: Told) -> None:
    assert told(readings=READINGS.replace("120.0", "12\0.0")) == (
        "readings.csv, row 3: found a NUL byte (byte offset 101); expected text; "
        "to mend: the file may be damaged: export it anew"
    )


def test_duplicate_column(told: Told) -> None:
    assert told(readings=READINGS.replace("station", "Depth [m]")) == (
        "readings.csv, row 1, depth [m]: found the same column twice (columns 2 and 3); "
        "expected every column name once; to mend: rename or remove one of the two"
    )
    assert told(readings=READINGS.replace("station", "depth [ft]")) == (
        "readings.csv, row 1, depth [m]: found the column depth twice; expected every column name once; "
        "to mend: rename or remove one of the two"
    )


def test_counter_outside_the_calibration_table(told: Told) -> None:
    toml = TOML + '\n[instrument.A]\ncalibration = "calibration.csv"\n'
    table = "counter [counts],gravity [mGal]\n3000,3010\n4001,4020\n"
    assert told(toml, READINGS.replace("mGal", "counts"), calibration=table) == (
        "readings.csv, row 3, reading [counts]: found the counter value 4001.900; expected 3000 to 4001 "
        "counts, the "
        'calibration table of "A"; to mend: correct it, set use = no in the row, or write out_of_table = '
        '"extend" '
        "under [recipe]"
    )


def test_counts_without_calibration_table(told: Told) -> None:
    assert told(readings=READINGS.replace("mGal", "counts")) == (
        'readings.csv, reading [counts]: found counter readings of "1", an instrument without calibration '
        "table; "
        'expected a calibration table, or readings in mGal; to mend: write calibration = "calibration.csv" '
        "under "
        "[instrument.1]"
    )


def test_calibration_table_that_does_not_rise(told: Told) -> None:
    toml = TOML + '\n[instrument.A]\ncalibration = "calibration.csv"\n'
    table = "counter [counts],gravity [mGal]\n3000,3010\n2900,4020\n"
    assert told(toml, READINGS.replace("mGal", "counts"), calibration=table).split("\n")[0] == (
        "calibration.csv, row 3, counter [counts]: found 2900 after 3000; expected a value above that of the "
        "row "
        "before; to mend: order the rows by counter value, each once; gravity must rise with it"
    )


def test_station_without_depth(told: Told) -> None:
    assert told(readings=READINGS.replace(",120.0,", ",,")) == (
        'readings.csv, row 3, depth [m]: found no depth for the station "B"; expected a depth, or a row of '
        "places.csv "
        'for the station; to mend: write the depth, or give "B" a row in places.csv, named under [data]'
    )


def test_places_that_are_doubled_or_have_no_position(told: Told) -> None:
    places = "station,depth [m],east [m],role\nA,100,,\nA,100,,base\nC,,3.0,floor\n"
    assert told(TOML + 'places = "places.csv"\n', places=places).split("\n") == [
        'places.csv, row 3, station: found "A" again (first in row 2); expected every station once; '
        "to mend: remove one of the rows, or rename it",
        'places.csv, row 4, role: found "floor"; expected column or base; to mend: write base for a station '
        "outside "
        "the column of densities, else column",
        'places.csv, row 4: found neither a depth nor all of east, north, elevation for "C" (no north, '
        "elevation); "
        "expected a depth [m] on the path, or east [m], north [m] and elevation [m]; to mend: fill one of "
        "the two "
        "ways, and only one",
    ]


def test_path_that_falls_or_bends_too_far(told: Told) -> None:
    path = "depth [m],inclination [deg],azimuth [deg]\n0,0,0\n50,1,10\n40,2,10\n60,190,10\n"
    assert told(TOML + 'path = "path.csv"\n', path=path).split("\n") == [
        "path.csv, row 4, depth [m]: found 40 after 50; expected a depth above that of the row before; "
        "to mend: order the rows by depth; one row a depth",
        'path.csv, row 5, inclination [deg]: found "190"; expected an inclination from 0 (down) through 90 '
        "(level) to "
        "180 (up) deg; to mend: correct the value, or check that inclination and azimuth are not exchanged",
    ]


def test_empty_file(told: Told) -> None:
    mend = "write the column names, each measured one with its unit: depth [m]"
    expected = f"no header; expected a first row with the names of the columns; to mend: {mend}"
    assert told(readings="") == f"readings.csv: found an empty file: {expected}"
    assert told(readings="# nothing yet\n\n") == f"readings.csv: found only comments: {expected}"


def test_header_only(told: Told) -> None:
    assert told(readings=READINGS.split("\n")[0] + "\n") == (
        "readings.csv, row 1: found a header and no readings; expected a row for each of the readings; "
        "to mend: write the rows under the header, or name the file that holds them"
    )


@pytest.mark.parametrize(
    ("data", "named"),
    [
        (
            b"\xff\xfe" + READINGS.encode("utf-16-le"),
            "UTF-16, little endian (it begins with its byte-order mark)",
        ),
        (
            b"\xfe\xff" + READINGS.encode("utf-16-be"),
            "UTF-16, big endian (it begins with its byte-order mark)",
        ),
        (READINGS.encode("utf-16-le"), "UTF-16, little endian (every second byte is NUL)"),
    ],
)
def test_utf_16(told: Told, data: bytes, named: str) -> None:
    assert told(readings=data) == (
        f"readings.csv: found a file encoded in {named}; expected UTF-8; to mend: save the file again with "
        f'the encoding "UTF-8"'
    )


def test_byte_that_is_not_utf_8(told: Told) -> None:
    assert told(readings=READINGS.replace("B", "Bø").encode("latin-1")) == (
        "readings.csv, row 3: found a byte that is not UTF-8 (0xf8 at byte offset 98; perhaps ISO 8859-1 "
        "(Latin-1) or "
        'Windows-1252); expected UTF-8; to mend: save the file again with the encoding "UTF-8"'
    )


def test_ten_million_characters_in_a_line(told: Told) -> None:
    assert told(readings=READINGS + "x" * 10_000_000) == (
        "readings.csv, row 5: found a line longer than 1 MiB; expected one row a line; "
        "to mend: check that the file is a table with line ends"
    )


def test_more_than_a_thousand_columns(told: Told) -> None:
    assert told(readings=",".join(f"c{n}" for n in range(1001)) + "\n" + "," * 1000 + "\n") == (
        "readings.csv, row 1: found 1001 columns; expected at most 1000; to mend: remove the columns that "
        "are not needed"
    )


def test_other_kinds_of_file(told: Told) -> None:
    text = (
        "readings.csv: found {}; expected a plain text file, UTF-8; "
        "to mend: export the table as CSV, UTF-8, and name that file"
    )
    assert told(readings=b"PK\x03\x04" + bytes(60)) == text.format("a ZIP archive (perhaps a spreadsheet)")
    assert told(readings="<!DOCTYPE html><html></html>") == text.format(
        "a web page (perhaps a login page saved in its place)"
    )


def test_semicolons(told: Told) -> None:
    assert told(readings=READINGS.replace(",", ";").replace(".", ",")) == (
        "readings.csv, row 1: found cells parted by semicolons; expected commas between cells; "
        "to mend: export the table with commas between the cells and points as decimal marks"
    )


def test_quotes_that_do_not_match(told: Told) -> None:
    assert told(readings=READINGS.replace(",B,", ',"B,')) == (
        'readings.csv, row 3: found a quote that is opened and never closed: "B,120.0,4001.900; expected a '
        "quoted cell "
        'that ends on its own line; to mend: close the quote, or write a quote inside a cell twice ("")'
    )


def test_use_that_is_neither_yes_nor_no(told: Told) -> None:
    readings = READINGS.replace("station", "use").replace(",A,", ",YES,").replace(",B,", ",perhaps,")
    assert told(readings=readings) == (
        'readings.csv, row 3, use: found "perhaps"; expected yes or no; to mend: write yes, no, or leave the '
        "cell empty (yes)"
    )


def test_reading_sd_of_nothing(told: Told) -> None:
    readings = READINGS.replace("station", "reading_sd [mGal]").replace(",A,", ",0.01,").replace(",B,", ",0,")
    assert told(readings=readings) == (
        'readings.csv, row 3, reading_sd [mGal]: found "0"; expected a number above 0; to mend: correct the '
        "value"
    )


def test_instrument_not_described_or_not_told(told: Told) -> None:
    toml = TOML + "\n[instrument.X]\n[instrument.Y]\n"
    readings = READINGS.replace("station", "instrument").replace(",A,", ",,").replace(",B,", ",Z,")
    lines = told(toml, readings).split("\n")
    assert lines[0] == (
        "readings.csv, row 2, instrument: found no instrument, and the survey has several, and 1 more row: 4; "
        "expected one of "
        '"X", "Y"; '
        "to mend: fill the column instrument, or state instrument in the [[run]] of survey.toml"
    )
    assert lines[1] == (
        'readings.csv, row 3, instrument: found "Z"; expected one of "X", "Y"; '
        "to mend: correct the label, or describe it in [instrument.Z] of survey.toml"
    )


def test_tie_without_error(told: Told) -> None:
    ties = "station,gravity [mGal],gravity_sd [mGal]\nA,981000,0\n"
    assert told(TOML + 'ties = "ties.csv"\n', ties=ties) == (
        'ties.csv, row 2, gravity_sd [mGal]: found "0"; expected a number above 0; to mend: correct the value'
    )


def test_tide_table_with_a_gap_and_too_short(told: Told) -> None:
    toml = TOML + 'tide = "tide.csv"\n\n[recipe]\ntide = "table"\n'
    gap = "time,tide [mGal]\n2026-05-04T09:00:00Z,0.1\n2026-05-04T10:30:00Z,0.1\n"
    assert told(toml, tide=gap) == (
        "tide.csv, row 3, time: found a gap of 1.5 h before this row; expected rows at most 1 h apart; "
        "to mend: give the series in steps of an hour or less"
    )
    short = "time,tide [mGal]\n2026-05-04T09:10:00Z,0.1\n2026-05-04T10:00:00Z,0.1\n"
    assert told(toml, tide=short) == (
        "tide.csv, time: found a series from 2026-05-04T09:10:00Z to 2026-05-04T10:00:00Z; expected one that "
        "spans the "
        "readings, 2026-05-04T09:00:00Z to 2026-05-04T09:40:00Z; to mend: give a longer series"
    )


def test_all_problems_of_a_folder_come_at_once_in_order(told: Told) -> None:
    text = told(
        TOML.replace("latitude = 54.5\n", "") + 'path = "path.csv"\nties = "gone.csv"\n',
        READINGS.replace("120.0", "deep").replace("4000.020", ""),
        path="depth [m],inclination [deg],azimuth [deg]\n0,200,0\n",
    )
    assert [line.split(":")[0] for line in text.split("\n")] == [
        "survey.toml, row 3, [site] latitude",
        "survey.toml, row 11, [data] ties",
        "readings.csv, row 3, depth [m]",
        "readings.csv, row 4, reading [mGal]",
        "path.csv, row 2, inclination [deg]",
    ]


def test_a_table_in_a_wrong_format_does_not_list_without_end(tmp_path: Path) -> None:
    rows = "2026-05-04T09:00:00Z,A,deep,high\n" * 5000
    (tmp_path / "survey.toml").write_text(TOML)
    (tmp_path / "readings.csv").write_text(READINGS.split("\n")[0] + "\n" + rows)
    with pytest.raises(InputError) as caught:
        read_survey(tmp_path)
    assert len(caught.value.problems) == 1000
    lines = str(caught.value).split("\n")
    assert any("more than 999 problems in this file" in line for line in lines)
    # One block, and one that says that there are more.
    assert len(lines) == 2 and ", and 998 more rows: 3-1000; expected a number" in lines[0]


def test_depth_beyond_every_hole(told: Told) -> None:
    assert told(readings=READINGS.replace("120.0", "1e300").replace("[m]", "[ft]")) == (
        'readings.csv, row 3, depth [ft]: found "1e300"; expected a number of at most 65616.8 ft in size; '
        "to mend: correct the value, or the unit in the heading"
    )


def test_tie_at_a_station_that_is_not_in_the_survey(told: Told) -> None:
    ties = "station,gravity [mGal],gravity_sd [mGal]\nC,981000,0.1\n"
    assert told(TOML + 'ties = "ties.csv"\n', ties=ties) == (
        'ties.csv, row 2, station: found "C"; expected a station of the readings or of places.csv, such as '
        '"A", "B"; '
        "to mend: correct the label; case and blanks count"
    )


def test_calibration_table_without_one_number(told: Told) -> None:
    toml = TOML + '\n[instrument.A]\ncalibration = "calibration.csv"\n'
    table = "counter [counts],gravity [mGal]\nx,1\ny,2\n"
    text = told(toml, READINGS.replace("mGal", "counts"), calibration=table)
    assert text.startswith('calibration.csv, row 2, counter [counts]: found "x", and 1 more row: 3; expected a number')
    assert "\n" not in text
