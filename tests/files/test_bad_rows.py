"""What a person is told of rows that are empty, cut off or alike, of marks for what is missing, and of labels."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from plumbwell.files.folder import read_survey
from plumbwell.survey.errors import InputError
from small_folder import READINGS, TOML

Told = Callable[..., str]


def test_one_cause_in_many_rows_is_one_block_and_the_problems_stay_whole(tmp_path: Path) -> None:
    rows = "".join(
        f"2026-05-04T09:{n:02d}:00Z,A,{'100.0' if n % 5 else 'deep'},4000.{n:03d}\n" for n in range(20)
    )
    (tmp_path / "survey.toml").write_text(TOML)
    (tmp_path / "readings.csv").write_text(READINGS.split("\n")[0] + "\n" + rows + "2026-05-04T10:00:00Z,A,1,\n")
    with pytest.raises(InputError) as caught:
        read_survey(tmp_path)
    assert [(one.row, one.column) for one in caught.value.problems] == [
        *((row, "depth [m]") for row in (2, 7, 12, 17)),
        (22, "reading [mGal]"),
    ]
    assert [one.found for one in caught.value.blocks] == ['"deep", and 3 more rows: 7, 12, 17', "an empty cell"]
    assert str(caught.value).split("\n")[0].startswith(
        'readings.csv, row 2, depth [m]: found "deep", and 3 more rows: 7, 12, 17; expected a number such as 12.5'
    )


def test_empty_rows_are_told_once_and_nothing_else(told: Told) -> None:
    assert told(readings=READINGS + ",,,\n , ,,\n,,\n") == (
        "readings.csv, row 5: found an empty row, commas without values, and 2 more rows: 6-7; expected a value in "
        "each row; to mend: remove the row"
    )


def test_a_last_row_that_was_cut_off(told: Told) -> None:
    assert told(readings=READINGS[:-12]) == (
        "readings.csv, row 4: found 3 cells and no line end; expected 4, as the header has; to mend: the file may "
        "be cut off or still being written: copy it anew, or complete the last row"
    )
    # With a line end behind it the row is a row with a missing cell.
    assert "cut off" not in told(readings=READINGS[:-12] + "\n")


def test_one_mark_of_a_missing_reading_is_refused(told: Told) -> None:
    assert told(readings=READINGS.replace("4001.900", "-999.25")) == (
        "readings.csv, row 3, reading [mGal]: found -999.25, far from all other values; expected an empty cell where "
        "there is no value; to mend: empty this cell, or set use = no in this row"
    )


def test_marks_of_missing_pressures_are_told_once(told: Told) -> None:
    readings = READINGS.replace("station", "pressure [hPa]").replace(",A,", ",-999.25,").replace(",B,", ",1002,")
    assert told(readings=readings) == (
        "readings.csv, row 2, pressure [hPa]: found -999.25 in 2 rows (rows 2, 4), far from all other values; "
        "expected an empty cell where there is no value; to mend: empty these cells"
    )


@pytest.mark.parametrize(
    ("label", "found"),
    [
        ("A\x1b[31m", '"A\\x1b[31m", with control characters'),
        ("\u202eA", '"\\u202eA", with control characters'),
        ("A" * 201, '"' + "A" * 79 + '…", 201 characters'),
    ],
)
def test_labels_that_would_steer_a_terminal_or_never_end(told: Told, label: str, found: str) -> None:
    text = told(readings=READINGS.replace(",B,", f",{label},"))
    assert text.startswith(f"readings.csv, row 3, station: found {found}; expected ")
    places = f"station,depth [m]\n{label},5\n"
    text = told(TOML + 'places = "places.csv"\n', places=places)
    assert text.startswith(f"places.csv, row 2, station: found {found}; expected ")


def test_a_label_near_that_of_a_place_names_it(told: Told) -> None:
    toml = TOML + 'places = "places.csv"\n'
    text = told(toml, READINGS.replace(",B,120.0,", ",pa d,,"), places="station,depth [m]\nPAD,120\n")
    assert text.endswith('to mend: write "PAD", which differs only by case or blanks, if that is meant')


def test_a_path_that_turns_straight_back(told: Told) -> None:
    path = "depth [m],inclination [deg],azimuth [deg]\n0,0,0\n50,90,10\n90,90,190\n"
    assert told(TOML + 'path = "path.csv"\n', path=path) == (
        "path.csv, row 4: found a path that turns straight back between 50 and 90 m; expected a hole that bends by "
        "less than 180 deg from point to point; to mend: correct inclination or azimuth, or write a point between "
        "the two"
    )


def test_no_reading_in_use(told: Told) -> None:
    readings = READINGS.replace("station", "use").replace(",A,", ",no,").replace(",B,", ",no,")
    assert told(readings=readings) == (
        "readings.csv, use: found no reading in use belongs to a station; expected rows in use, each with a depth or "
        "a station; to mend: write yes under use in the rows that count"
    )
