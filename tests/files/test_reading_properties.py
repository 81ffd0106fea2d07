"""Laws of reading: whatever the bytes, only an input error; what does not matter does not matter."""

from __future__ import annotations

import tempfile
from pathlib import Path

import numpy as np
from hypothesis import example, given, settings
from hypothesis import strategies as st

from plumbwell.files.collected import Collected
from plumbwell.files.folder import read_survey
from plumbwell.files.known_columns import SENTINELS
from plumbwell.files.las import las_of
from plumbwell.files.number_cells import numbers_of
from plumbwell.files.text_table import TextTable, read_table
from plumbwell.survey.errors import InputError
from plumbwell.survey.survey import Survey

TOML = """\
format = "plumbwell-survey/1"
[site]
latitude = 54.5
longitude = -3.0
ground_elevation = 180.0
[data]
readings = "readings.csv"
"""
HEADER = b"time,station,depth [m],reading [mGal],use\n"

pieces = st.sampled_from(
    [
        b",",
        b'"',
        b"\n",
        b"\r",
        b"\r\n",
        b"#",
        b"\0",
        b"\xff",
        b"\xe2\x88\x92",
        b"1.5",
        b"-",
        b"no",
        b"NaN",
        b"1e999",
    ]
    + [
        b"2026-05-04T09:00:00Z",
        b"2026-05-04T24:00:00Z",
        b"A",
        b" ",
        b";",
        b"\xef\xbb\xbf",
        b"\xe2\x80\xa8",
        b"\x0c",
    ]
)
rough = st.one_of(
    st.binary(max_size=200),
    st.lists(pieces, max_size=40).map(b"".join),
    st.lists(pieces, max_size=40).map(lambda parts: HEADER + b"".join(parts)),
)


def _survey(readings: bytes, toml: bytes = TOML.encode()) -> Survey | None:
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        (folder / "survey.toml").write_bytes(toml)
        (folder / "readings.csv").write_bytes(readings)
        try:
            return read_survey(folder)
        except InputError as error:
            assert error.problems and all(str(problem) for problem in error.problems)
            return None


@given(rough)
@example(HEADER + b"2026-05-04T09:00:00Z,A,1,2,no")
@example(b"")
def test_any_bytes_as_readings_are_read_or_refused(data: bytes) -> None:
    survey = _survey(data)
    assert survey is None or len(survey.readings) > 0


@given(st.one_of(st.binary(max_size=200), st.text(max_size=100).map(lambda text: (TOML + text).encode())))
def test_any_bytes_as_survey_toml_are_read_or_refused(data: bytes) -> None:
    survey = _survey(HEADER + b"2026-05-04T09:00:00Z,A,1,2,\n", data)
    assert survey is None or survey.readings.station.as_list() == ["A"]


las_pieces = st.sampled_from(
    [
        "~V\n",
        "~W\n",
        "~C\n",
        "~A\n",
        "~P\n",
        "~O\n",
        "VERS. 2.0:\n",
        "WRAP. YES:\n",
        "NULL. -999.25:\n",
        "STRT.M 1:\n",
    ]
    + [
        "DEPT.M:\n",
        "RHOB.G/CC:\n",
        "1 ",
        "2.5 ",
        "-999.25 ",
        "\n",
        "10-999.25 ",
        "*** ",
        "1,5 ",
        "x",
        ":",
        ".",
        "#",
        "\x1a",
    ]
)


@given(st.lists(las_pieces, max_size=40).map("".join))
def test_any_text_as_las_is_read_or_refused(text: str) -> None:
    collected = Collected()
    las = las_of(text.encode(), file="x.las", collected=collected)
    assert (las is None) == bool(collected.problems)


# marks for a missing value are refused when they repeat, so they are no numbers here
numbers = (
    st.floats(-5000, 5000, allow_nan=False)
    .map(lambda value: round(value, 3))
    .filter(lambda value: value not in SENTINELS)
)
rows = st.lists(st.tuples(st.integers(0, 59), numbers, numbers), min_size=1, max_size=8)


def _table(written: list[tuple[int, float, float]]) -> list[dict[str, str]]:
    return [
        {
            "time": f"2026-05-04T09:{minute:02d}:00Z",
            "station": f"S{minute}",
            "depth [m]": f"{depth:.3f}",
            "reading [mGal]": f"{reading:.3f}",
        }
        for minute, depth, reading in written
    ]


def _bytes(table: list[dict[str, str]], names: list[str], end: str = "\n") -> bytes:
    lines = [",".join(names), *(",".join(row[name] for name in names) for row in table)]
    return (end.join(lines) + end).encode()


def _same(one: Survey | None, other: Survey | None) -> bool:
    assert one is not None and other is not None
    for name in ("time", "depth", "reading"):
        np.testing.assert_array_equal(
            getattr(one.readings, name).values, getattr(other.readings, name).values
        )
    return one.readings.station.as_list() == other.readings.station.as_list()


NAMES = ["time", "station", "depth [m]", "reading [mGal]"]


@settings(max_examples=25)
@given(rows, st.permutations(NAMES), st.sampled_from(["\n", "\r\n", "\r"]), st.booleans())
def test_order_of_columns_line_ends_mark_comments_and_blanks_do_not_matter(
    written: list[tuple[int, float, float]], names: list[str], end: str, mark: bool
) -> None:
    table = _table(written)
    plain = _bytes(table, NAMES)
    other = b"# from the field" + end.encode() * 2 + _bytes(table, names, end) + b"  # end"
    assert _same(_survey(plain), _survey(b"\xef\xbb\xbf" * mark + other))


@settings(max_examples=25)
@given(rows)
def test_quotes_blanks_and_case_of_headings_do_not_matter(written: list[tuple[int, float, float]]) -> None:
    table = _table(written)
    quoted = [{f' "{name.upper()}" ': f' "{cell}" ' for name, cell in row.items()} for row in table]
    assert _same(_survey(_bytes(table, NAMES)), _survey(_bytes(quoted, list(quoted[0]))))


@settings(max_examples=25)
@given(rows)
def test_feet_and_metres_agree(written: list[tuple[int, float, float]]) -> None:
    table = _table(written)
    feet = [{**row, "depth [ft]": repr(float(row["depth [m]"]) / 0.3048)} for row in table]
    one = _survey(_bytes(table, NAMES))
    other = _survey(_bytes(feet, ["time", "station", "depth [ft]", "reading [mGal]"]))
    assert one is not None and other is not None
    np.testing.assert_allclose(other.readings.depth.values, one.readings.depth.values, rtol=1e-15, atol=1e-15)


line = st.sampled_from(["1,2", "# a comment", "", "   ", '"x, y",2', "  # indented", ",", "\t"])


@given(st.lists(line, max_size=20), st.sampled_from(["\n", "\r\n", "\r"]))
def test_rows_comments_blanks_and_header_are_all_the_lines(lines: list[str], end: str) -> None:
    data = (end.join(["a,b", "0,0", *lines]) + end).encode()
    table = read_table(data, file="t.csv", rows_are="rows", collected=Collected())
    assert isinstance(table, TextTable)
    assert len(table) + table.comments + table.blanks + 1 == table.physical == len(lines) + 2
    physical = data.decode().split(end)
    for row, cell in zip(table.lines, table.raw.cells[0], strict=True):
        assert cell in physical[row - 1]


@given(st.floats(allow_nan=False, allow_infinity=False))
def test_every_number_that_is_written_is_read_to_the_last_digit(value: float) -> None:
    for text in (repr(value), f"{value:.17g}", f"{value:.16e}"):
        values, bad, _ = numbers_of([text, "", text])
        assert not bad and values[0] == value and np.isnan(values[1])


@given(st.text(max_size=12))
def test_a_cell_is_a_plain_ascii_number_or_refused(text: str) -> None:
    values, bad, minuses = numbers_of([text])
    if np.isfinite(values[0]):
        assert minuses or set(text) <= set("+-.eE0123456789")
        assert float(text.replace("\u2212", "-").replace("\u2013", "-")) == values[0]
    else:
        assert bad or text == ""
