"""The CSV files as a reader finds them: headings, empties, digits, sums that close, true covariances."""

import csv
import io
from dataclasses import replace
from decimal import Decimal
from pathlib import Path

import numpy as np
import pytest

from plumbwell.files import tables_out
from plumbwell.files.folder import read_survey
from plumbwell.files.tables_out import alternatives_text, cell, csv_notes, csv_text, csv_texts, number_cells, text_cells
from plumbwell.study.alternative_columns import COLUMNS
from plumbwell.study.alternatives import alternatives
from plumbwell.study.case import Case
from plumbwell.study.reduce import reduce
from plumbwell.study.tables import TABLES

CHECKOUT = Path(__file__).resolve().parents[2]
SURVEYS = {
    "shaft": CHECKOUT / "tests" / "data" / "reiche_zeche_shaft",
    "well": CHECKOUT / "sample_surveys" / "tolly_bank_well",
    "mine": CHECKOUT / "sample_surveys" / "quernlow_shaft",
}


@pytest.fixture(scope="module")
def written():
    """Results and CSV texts of each survey."""
    results = {name: reduce(Case(survey=read_survey(folder))) for name, folder in SURVEYS.items()}
    return {name: (one, csv_texts(one)) for name, one in results.items()}


def rows_of(text):
    """Rows of a CSV text as dictionaries."""
    return list(csv.DictReader(io.StringIO(text)))


def matrix_of(text):
    """Labels and values of a covariance that is written whole; NaN for an empty cell."""
    first, *rows = csv.reader(io.StringIO(text))
    assert [row[0] for row in rows] == first[1:]
    return first[1:], np.array([[float(one) if one else np.nan for one in row[1:]] for row in rows])


ALL = [
    "stations.csv", "intervals.csv", "layers.csv", "readings_reduced.csv", "repeats.csv", "visits.csv",
    "density_covariance.csv", "common_covariance.csv", "station_covariance.csv",
]  # fmt: skip


@pytest.mark.parametrize("name", SURVEYS)
def test_all_files_are_there_with_one_line_feed_a_row(written, name):
    texts = written[name][1]
    assert list(texts) == ALL
    for text in texts.values():
        assert "\r" not in text and text.endswith("\n") and not text.endswith("\n\n")
        widths = {len(row) for row in csv.reader(io.StringIO(text))}
        assert len(widths) == 1


@pytest.mark.parametrize("name", SURVEYS)
def test_no_cell_says_nan_or_none_and_no_number_has_more_than_12_digits(written, name):
    results, texts = written[name]
    for key, table in TABLES.items():
        for row in rows_of(texts[table.file]):
            for one in table.columns:
                text = row[one.heading]
                assert text.lower() not in ("nan", "none", "inf", "-0"), (key, one.heading)
                if one.kind == "number" and text:
                    assert len(Decimal(text).as_tuple().digits) <= 12, (key, one.heading)


@pytest.mark.parametrize("name", SURVEYS)
def test_written_and_read_back_is_equal_to_the_results(written, name):
    results, texts = written[name]
    for table in TABLES.values():
        rows = rows_of(texts[table.file])
        assert len(rows) == table.rows(results)
        for one in table.columns:
            cells = [row[one.heading] for row in rows]
            values = one.values(results)
            if one.kind == "text":
                assert tuple(cells) == values
            elif one.kind == "number" and one.name != "residual":
                back = np.array([float(text) if text else np.nan for text in cells])
                assert back == pytest.approx(values, rel=1e-11, abs=0.0, nan_ok=True), one.heading


@pytest.mark.parametrize("name", SURVEYS)
def test_written_numbers_of_a_reading_add_up_to_the_gravity_of_its_station(written, name):
    results, texts = written[name]
    gravity = {row["station"]: Decimal(row["gravity [mGal]"]) for row in rows_of(texts["stations.csv"])}
    labels = results.stations.label
    station = results.stations.located.placement.station.tolist()
    inside = results.readings.estimates.residual.values / 1e-5
    rows = rows_of(texts["readings_reduced.csv"])
    assert len(rows) == len(results.survey.readings)
    for row, at, residual in zip(rows, station, inside, strict=True):
        part = {key: Decimal(text or "0") for key, text in row.items() if "[mGal]" in key}
        total = part["calibrated [mGal]"] + part["tide [mGal]"] + part["tilt [mGal]"]
        total = total - part["pressure_effect [mGal]"] + part["to_station [mGal]"] - part["run_bias [mGal]"]
        total = total - part["drift [mGal]"] - part["visit_effect [mGal]"] - part["residual [mGal]"]
        assert abs(total - gravity[labels[at]]) < Decimal("1e-9")
        assert float(part["residual [mGal]"]) == pytest.approx(residual, abs=3e-6)


def test_a_row_out_of_use_keeps_its_corrections_and_has_no_visit_effect_nor_redundancy(written):
    rows = [row for row in rows_of(written["well"][1]["readings_reduced.csv"]) if row["used"] == "no"]
    assert len(rows) == 1 and rows[0]["use"] == "no"
    assert rows[0]["visit_effect [mGal]"] == rows[0]["redundancy"] == rows[0]["standardised_residual"] == ""
    assert all(rows[0][f"{name} [mGal]"] for name in ("calibrated", "tide", "run_bias", "drift", "residual"))


def test_raw_columns_stand_first_as_they_were_written(written):
    raw = (SURVEYS["shaft"] / "readings.csv").read_text("utf-8").splitlines()
    table = [line for line in raw if not line.startswith("#")]
    back = written["shaft"][1]["readings_reduced.csv"].splitlines()
    assert len(table) == len(back)
    for before, after in zip(table, back, strict=True):
        assert after.startswith(before + ",")


@pytest.mark.parametrize("name", SURVEYS)
def test_covariances_are_symmetric_have_no_negative_side_and_match_the_tables(written, name):
    results, texts = written[name]
    stations, intervals = rows_of(texts["stations.csv"]), rows_of(texts["intervals.csv"])
    expected = {
        "density_covariance.csv": (intervals, "density_sd [g/cm3]"),
        "common_covariance.csv": (intervals, "density_common_sd [g/cm3]"),
        "station_covariance.csv": (stations, "gravity_sd [mGal]"),
    }
    for file, (rows, heading) in expected.items():
        labels, matrix = matrix_of(texts[file])
        assert np.array_equal(matrix, matrix.T)
        sd = np.array([float(row[heading]) if row[heading] else 0.0 for row in rows])
        assert np.diagonal(matrix) == pytest.approx(sd**2, rel=1e-10, abs=1e-30)
        assert np.linalg.eigvalsh(matrix).min() > -1e-12 * np.diagonal(matrix).max()
    labels, matrix = matrix_of(texts["density_covariance.csv"])
    assert labels == [f"{row['from_station']}~{row['to_station']}" for row in intervals]
    assert texts["density_covariance.csv"].startswith("interval,")
    assert np.all(np.diagonal(matrix, 1) < 0.0)  # neighbours share a station and part in opposite ways


def test_row_and_column_of_the_datum_station_are_0(written):
    labels, matrix = matrix_of(written["shaft"][1]["station_covariance.csv"])
    assert labels[0] == "P3"
    assert np.all(matrix[0] == 0.0) and np.all(matrix[:, 0] == 0.0) and np.all(matrix[1:, 1:] > 0.0)


def test_datum_sd_enters_the_common_covariance_only(written):
    results, texts = written["shaft"]
    other = csv_texts(reduce(Case(survey=results.survey), recipe=replace(results.recipe, datum_sd=500e-5)))
    assert other["density_covariance.csv"] == texts["density_covariance.csv"]
    assert other["station_covariance.csv"] == texts["station_covariance.csv"]
    assert matrix_of(other["common_covariance.csv"])[1][0, 0] > matrix_of(texts["common_covariance.csv"])[1][0, 0]


@pytest.mark.parametrize("name", SURVEYS)
def test_above_the_limit_covariances_are_pairs_and_agree_with_the_whole(written, name, monkeypatch):
    results, texts = written[name]
    assert csv_notes(results) == []
    monkeypatch.setattr(tables_out, "MOST_WHOLE", 2)
    for file in ("density_covariance.csv", "station_covariance.csv"):
        labels, matrix = matrix_of(texts[file])
        rows = rows_of(tables_out.COVARIANCES[file](results))
        pairs = [(a, a) for a in labels] + list(zip(labels[:-1], labels[1:], strict=True))
        assert sorted((row["a"], row["b"]) for row in rows) == sorted(pairs)
        for row in rows:
            whole = matrix[labels.index(row["a"]), labels.index(row["b"])]
            assert float(row["covariance"]) == pytest.approx(whole, rel=1e-9, abs=1e-12 * matrix.max())
    labels, matrix = matrix_of(texts["common_covariance.csv"])
    first, *rows = csv.reader(io.StringIO(tables_out.common_covariance(results)))
    assert first == ["factor", *labels]
    factors = np.array([[float(text) for text in row[1:]] for row in rows])
    assert factors.T @ factors == pytest.approx(matrix, rel=1e-9)
    notes = csv_notes(results)
    assert any("density_covariance.csv" in note and "neighbours" in note for note in notes)
    assert any("station_covariance.csv" in note for note in notes)


@pytest.mark.parametrize("text", ["=1+2", "+cmd", "-x", "@SUM(A1)", "\tq", "\rq"])
def test_a_text_that_a_spreadsheet_would_run_gets_an_apostrophe(text):
    assert next(csv.reader(io.StringIO(cell(text), newline=""))) == ["'" + text]


@pytest.mark.parametrize("text", ["-5", "+0.25", "-1.5e-3", "12", ".5", "2026-05-04T09:13:20Z", ""])
def test_numbers_and_harmless_texts_stay_as_they_are(text):
    assert cell(text) == text


@pytest.mark.parametrize("text", ["a,b", 'say "hole"', "two\nlines", " blank", "blank ", "#5", "Grübe µ"])
def test_texts_are_quoted_so_that_they_come_back(text):
    for made in (cell(text), text_cells(["x", text])[1]):
        assert next(csv.reader(io.StringIO(made, newline=""))) == [text]
        assert not made.startswith("#")


def test_numbers_come_with_12_digits_and_unknown_ones_empty():
    values = [0.1, -0.0, np.nan, np.inf, 981234.567890123, 1e-12, 1.0]
    assert number_cells(values) == ["0.1", "0", "", "", "981234.56789", "1e-12", "1"]
    assert number_cells([2.5, np.nan] * 6) == ["2.5", ""] * 6


def test_a_table_without_rows_has_its_headings():
    assert csv_text(["a", "b [m]"], [[], []]) == "a,b [m]\n"


def test_a_label_like_a_formula_comes_back_as_it_was(tmp_path):
    """Written with an apostrophe so that no spreadsheet runs it, read again without it."""
    written = cell("=SUM(A1)")
    assert written == "'=SUM(A1)"
    (tmp_path / "survey.toml").write_text(
        'format = "plumbwell-survey/1"\n[site]\nname = "x"\nlatitude = 1.0\nlongitude = 2.0\nground_elevation = 3.0\n'
        '[data]\nreadings = "readings.csv"\n',
        "utf-8",
    )
    rows = f"2026-05-04T08:00:00Z,{written},1.0,5000.0\n2026-05-04T09:00:00Z,'quoted,9.0,5001.0\n"
    (tmp_path / "readings.csv").write_text("time,station,depth [m],reading [mGal]\n" + rows, "utf-8")
    assert read_survey(tmp_path).readings.station.names == ("=SUM(A1)", "'quoted")


def test_control_characters_are_escaped_and_line_ends_and_tabs_stay():
    texts = ["winch \x1b[31mred\x07", "two\nlines\tand a tab", "next\x85line\u2028sep\x7f", "plain"]
    cells = list(text_cells(texts))
    assert cells == ["winch \\x1b[31mred\\x07", '"two\nlines\tand a tab"', "next\\x85line\\u2028sep\\x7f", "plain"]
    assert list(text_cells(["a\x1bb", "c"])) == ["a\\x1bb", "c"]


def test_alternatives_stand_in_their_units_and_unknowns_are_empty(written):
    results, _ = written["well"]
    rows = alternatives(results)
    text = alternatives_text(rows)
    assert text.endswith("\n") and "\r" not in text and "nan" not in text
    back = rows_of(text)
    assert len(back) == len(rows) and list(back[0]) == [one.heading for one in COLUMNS]
    for row, cells in zip(rows, back, strict=True):
        assert (cells["key"], cells["change"], cells["problem"]) == (row.key, row.sentence, "")
        assert float(cells["reseating_sd [mGal]"]) == pytest.approx(row.reseating_sd * 1e5, rel=1e-11)
        assert float(cells["rms_change [g/cm3]"]) == pytest.approx(row.rms_change / 1000.0, rel=1e-11)
        assert cells["f"] == "" if np.isnan(row.f) else float(cells["f_p"]) == pytest.approx(row.f_chance, rel=1e-11)
        assert (cells["f_steps"] == "") == (cells["f_dof"] == "") == (cells["f"] == "")
    (out,) = (cells for cells in back if cells["key"].startswith("tare_out:"))
    # As the folder lists it: 10:19 in summer time.
    assert out["time"] == "2026-05-13T09:19:00Z" and out["run"] == "2"
    assert out["edits"] == 'no [[tare]] run = "2", time = "2026-05-13T09:19:00Z"'
    assert back[0]["time"] == ""
    lost = replace(rows[0], problem="why not", squares=np.nan, walk=np.nan)
    (cells,) = rows_of(alternatives_text([lost]))
    assert (cells["problem"], cells["dof"], cells["tares"], cells["chi_square"], cells["walk [mGal/h^1.5]"]) == (
        "why not", "", "", "", "",
    )  # fmt: skip


def test_the_strength_of_a_walk_is_written_in_mgal_an_hour_to_the_one_and_a_half(written):
    row = replace(alternatives(written["mine"][0])[0], walk=2e-5 / 3600.0**1.5)
    (cells,) = rows_of(alternatives_text([row]))
    assert float(cells["walk [mGal/h^1.5]"]) == pytest.approx(2.0, rel=1e-12)
