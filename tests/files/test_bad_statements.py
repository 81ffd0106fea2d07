"""What a person is told when survey.toml, or a name in it, is wrong: the whole text, as it is shown."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from plumbwell.files.folder import read_survey
from plumbwell.survey.errors import InputError, SurveyError
from small_folder import TOML

OUTSIDE_MEND = "copy the file into the survey folder and write its name without drive, leading slash or .."

Told = Callable[..., str]


def test_no_survey_toml(tmp_path: Path) -> None:
    with pytest.raises(InputError) as caught:
        read_survey(tmp_path)
    assert str(caught.value) == (
        f'{tmp_path / "survey.toml"}: found no such file; expected the file "survey.toml" in the survey folder; '
        "to mend: put the file there; or name the folder that holds survey.toml; plumbwell new DIR writes one to "
        "start from"
    )


def test_no_such_folder_is_told_as_it_was_typed(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    with pytest.raises(InputError) as caught:
        read_survey("far/nowhere")
    assert str(caught.value) == (
        "far/nowhere: found no such folder; expected a survey folder; to mend: name the folder that holds "
        "survey.toml; plumbwell new DIR writes one to start from"
    )


def test_missing_file(told: Told) -> None:
    assert told(readings=None) == (
        'survey.toml, row 10, [data] readings: found no such file; expected the file "readings.csv" in the '
        "survey folder; to mend: put the file there, or correct or remove its name"
    )


def test_file_named_in_other_case(told: Told) -> None:
    text = told(TOML.replace('"readings.csv"', '"Readings.csv"'))
    assert text.endswith('to mend: the folder holds "readings.csv": write the name exactly so')


def test_missing_latitude(told: Told) -> None:
    assert told(TOML.replace("latitude = 54.5\n", "")) == (
        "survey.toml, row 3, [site] latitude: found no such key; expected the geodetic latitude of the "
        "collar in "
        "deg, north positive; to mend: write it under [site], for example latitude = 54.4612"
    )


def test_latitude_that_is_no_latitude(told: Told) -> None:
    place = "survey.toml, row 5, [site] latitude: found "
    expected = "; expected a number in deg from -90 to 90; to mend: correct the value"
    assert told(TOML.replace("54.5", "nan")) == place + "nan" + expected
    assert told(TOML.replace("54.5", '"54N"')) == place + '"54N"' + expected
    assert told(TOML.replace("54.5", "true")) == place + "true" + expected
    assert told(TOML.replace("54.5", "91")) == (
        place + "91" + expected + "; perhaps latitude and longitude are exchanged"
    )


def test_unknown_recipe_key(told: Told) -> None:
    assert told(TOML + "\n[recipe]\ndrift_oder = 1\n") == (
        "survey.toml, row 13, [recipe] drift_oder: found an unknown key of the recipe; expected one of the "
        "keys of "
        '[recipe]; to mend: write "drift_order", if that is meant, or remove the key'
    )


def test_recipe_values_that_are_wrong_or_cannot_be_done(told: Told) -> None:
    text = told(
        TOML + '\n[recipe]\ndrift_order = 7\nlayers = "smooth"\ndrift_walk = -0.01\ntares = "found"\n'
    )
    assert text.split("\n") == [
        'survey.toml, row 13, [recipe] drift_order: found 7; expected "auto", 0, 1, 2 or 3; to mend: correct '
        "the value",
        'survey.toml, row 14, [recipe] layers: found "smooth", which this version cannot do; '
        'expected "plain" or "none"; to mend: write one of these, or remove the key',
        'survey.toml, row 15, [recipe] drift_walk: found -0.01; expected "auto", "off", "on" or a number in '
        "mGal/h^1.5 above 0, at most 10; to mend: correct the value",
        'survey.toml, row 16, [recipe] tares: found "found"; expected "listed" or "proposed"; to mend: correct '
        "the value",
    ]


def test_recipe_tide_table_without_a_table(told: Told) -> None:
    assert told(TOML + '\n[recipe]\ntide = "table"\n') == (
        'survey.toml, row 13, [recipe] tide: found "table", and [data] names no tide table; expected a tide '
        "table; "
        'to mend: write tide = "tide.csv" under [data], or choose another tide'
    )


def test_time_zone_that_nobody_knows(told: Told) -> None:
    assert told(TOML + 'time_zone = "Hollow/Fell"\n') == (
        'survey.toml, row 11, [data] time_zone: found "Hollow/Fell"; expected an IANA name such as '
        '"Europe/Oslo", or '
        'an offset such as "+02:00"; to mend: correct the name; abbreviations such as CET are not told apart '
        "everywhere"
    )


@pytest.mark.parametrize(
    "name", ["../path.csv", "/etc/path.csv", "C:/path.csv", "//host/path.csv", "a/../../b.csv"]
)
def test_path_that_leads_outside(told: Told, name: str) -> None:
    assert told(TOML + f'path = "{name}"\n') == (
        f'survey.toml, row 11, [data] path: found "{name}"; expected a path that stays inside the survey '
        f"folder; "
        f"to mend: {OUTSIDE_MEND}"
    )


def test_link_that_leads_outside(
    told: Told, tmp_path: Path, tmp_path_factory: pytest.TempPathFactory
) -> None:
    target = tmp_path_factory.mktemp("elsewhere") / "path.csv"
    target.write_text("depth [m],inclination [deg],azimuth [deg]\n0,0,0\n")
    try:
        (tmp_path / "path.csv").symlink_to(target)
    except OSError:
        pytest.skip("this system does not let a plain user make links")
    assert told(TOML + 'path = "path.csv"\n') == (
        'survey.toml, row 11, [data] path: found "path.csv", a link that leads out of the survey folder; expected a '
        "file that lies inside the survey folder; to mend: copy the file itself into the survey folder, in place of "
        "the link"
    )


def test_a_link_to_a_folder_inside_is_called_a_link(told: Told, tmp_path: Path) -> None:
    (tmp_path / "paths").mkdir()
    try:
        (tmp_path / "path.csv").symlink_to(tmp_path / "paths")
    except OSError:
        pytest.skip("this system does not let a plain user make links")
    assert "found a link to a folder; expected a plain file" in told(TOML + 'path = "path.csv"\n')


def test_folder_in_place_of_a_file(told: Told, tmp_path: Path) -> None:
    (tmp_path / "path.csv").mkdir()
    assert told(TOML + 'path = "path.csv"\n') == (
        "survey.toml, row 11, [data] path: found a folder; expected a plain file; to mend: name a file that "
        "holds the data"
    )


def test_tare_in_a_run_that_is_not_there(told: Told) -> None:
    assert told(TOML + '\n[[tare]]\nrun = "2"\ntime = "2026-05-04T09:30:00Z"\n') == (
        'survey.toml, row 13, [[tare]] run: found "2"; expected a run of the readings: "1"; '
        "to mend: correct the label, or remove the tare"
    )


def test_text_that_is_not_toml(told: Told) -> None:
    assert told(TOML.replace("= 54.5", "= 54.5.1")) == (
        "survey.toml, row 5, column 16: found text that is not TOML (Expected newline or end of document "
        "after a "
        'statement); expected lines such as key = 1.0, key = "text", [table]; to mend: correct that line; '
        "texts stand in "
        "quotes, and each key stands once in its table"
    )


def test_toml_that_would_exhaust_the_reader(told: Told) -> None:
    assert told(TOML + "x = " + "[" * 20000) == (
        "survey.toml: found values nested too deeply; expected plain tables; to mend: remove the nested "
        "brackets"
    )
    assert told(TOML + "x = " + "1" * 5000).startswith("survey.toml: found a number too long to read; ")
    assert told(TOML + "# padding\n" * 150_000).startswith(
        "survey.toml: found 1.4 MiB; expected a file of at most 1 MiB; "
    )


def test_format_of_another_version(told: Told) -> None:
    assert told(TOML.replace("survey/1", "survey/2")) == (
        'survey.toml, row 1, format: found "plumbwell-survey/2"; expected "plumbwell-survey/1"; to mend: '
        "read this survey "
        "with the version of the program that wrote it, or bring it to this format"
    )


def test_gradients_without_readings_are_refused_in_a_sentence(tmp_path: Path) -> None:
    (tmp_path / "survey.toml").write_text(TOML.replace("readings =", "gradients ="))
    (tmp_path / "readings.csv").write_text("depth [m],gzz [E]\n10,3000\n")
    with pytest.raises(SurveyError) as caught:
        read_survey(tmp_path)
    assert str(caught.value) == (
        "The survey folder names gradients and no readings. This version reduces gravimeter readings only: "
        "name a table of readings under [data] in survey.toml."
    )


def test_datum_station_that_is_not_in_the_survey(told: Told) -> None:
    assert told(TOML + '\n[recipe]\ndatum_station = "a"\n') == (
        'survey.toml, row 13, [recipe] datum_station: found "a"; expected a station of the readings or of '
        'places.csv, such as "A", "B"; to mend: write "A", which differs only by case or blanks, if that is meant'
    )
    assert told(TOML + '\n[recipe]\ndatum_station = "Q"\n').endswith(
        "to mend: correct the label; case and blanks count"
    )


@pytest.mark.parametrize(
    ("written", "place", "found", "expected"),
    [
        ("[recipes]\nlayers = 1", "row 12, recipes", "the table [recipes], which is not known", "[recipe]"),
        ("[[logg]]\nfile = 1", "row 12, logg", "the table [[logg]], which is not known", "[log]"),
        ("[instruments.A]\nscale = 1", "instruments", "the table [instruments], which is not known", "[instrument]"),
        (
            "[instrument.A]\nclock_ahaed = 1",
            "row 13, [instrument.A] clock_ahaed",
            'the key "clock_ahaed" in [instrument.A], which is not known',
            '"clock_ahead"',
        ),
    ],
)
def test_a_misspelt_table_or_key_is_no_note(told: Told, written: str, place: str, found: str, expected: str) -> None:
    text = told(TOML + "\n" + written + "\n")
    assert text.startswith("survey.toml, ") and f"{place}: found {found}; expected {expected}, if that is meant" in text
    assert text.endswith("; to mend: correct its spelling, or remove it, since it would have no effect")
    assert "\n" not in text


@pytest.mark.parametrize(
    ("table", "key", "value", "expected"),
    [
        ("instrument.A", "scale", "0", "a number above 0, at most 1e+06"),
        ("instrument.A", "clock_ahead", "86401", "a number in s from -86400 to 86400"),
        ("recipe", "min_thickness", "0", "a number in m above 0, at most 1000"),
        ("recipe", "gradient_sd", "0.5", "a number in mGal/m from 0 to 0.01"),
        ("recipe", "layer_boundaries", "0.05", '"auto", "stations", "markers" or a number in m from 0.1'),
        (
            "recipe",
            "free_air",
            "{ gradient = 0.3072 }",
            '"normal" or { gradient = 0.3072, sd = 0.0004 } in mGal/m, gradient above 0 and under 1, sd 0 to 0.1',
        ),
    ],
)
def test_values_beyond_their_limits(told: Told, table: str, key: str, value: str, expected: str) -> None:
    text = told(TOML + f"\n[{table}]\n{key} = {value}\n")
    place = f"survey.toml, row 13, [{table}] {key}"
    assert text == f"{place}: found {value}; expected {expected}; to mend: correct the value"


def test_a_whole_number_beyond_every_size(told: Told) -> None:
    assert told(TOML + "\n[recipe]\ndepth_sd = 1" + "0" * 400 + "\n").startswith(
        "survey.toml, row 13, [recipe] depth_sd: found a whole number of more than 30 digits; expected a number in m"
    )


@pytest.mark.parametrize("name", ["Hollow\\u001b[31m", "Hollow\\nFell", "H" * 201])
def test_a_site_name_that_cannot_stand_on_a_line(told: Told, name: str) -> None:
    text = told(TOML.replace("Hollow Fell 1", name))
    assert text.startswith("survey.toml, row 4, [site] name: found ") and "\x1b" not in text and len(text) < 300
