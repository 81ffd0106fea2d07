"""What a filter of a ledger keeps, and what it says when it cannot be understood."""

import numpy as np
import pytest

from made_ledger import interval_table, seconds, visit_table
from plumbwell.desk.ledger.ledger_filter import FilterError, kept_rows, parsed
from plumbwell.desk.ledger.ledger_words import ColumnWords, number_words
from plumbwell.desk.ledger.table import TIME, LedgerColumn


def kept(text, table):
    """Numbers of the rows that a filter keeps."""
    columns = (number_words(table), *(ColumnWords(column) for column in table.columns))
    mask = kept_rows(parsed(text, columns), columns, len(table))
    return [number for number, stays in zip(table.numbers, mask, strict=True) if stays]


def told(text, table):
    """What is wrong with a filter."""
    columns = (number_words(table), *(ColumnWords(column) for column in table.columns))
    with pytest.raises(FilterError) as caught:
        parsed(text, columns)
    return str(caught.value)


@pytest.mark.parametrize(
    ("text", "numbers"),
    [
        ("density > 2.9", ["40", "41", "42", "43"]),
        ("density>2.9 and ratio<0", ["40"]),
        ("ratio <= -4.6", ["27", "28"]),
        ("ratio \u2264 \u22124.55", ["27", "28", "29"]),
        ("density = 2.216", ["28"]),
        ("density = 2.2163", ["28"]),
        ("density = 2.2164", []),
        ("density sd > 0.0125", ["29", "30"]),
        ("No >= 42", ["42", "43"]),
        ("no = 24", ["24"]),
        ("layer = corran salt", ["36", "37", "38", "39"]),
        ("layer != Corran Salt and top >= 860", ["41", "42", "43"]),
        ("salt 808.0", ["37", "38"]),
        ("2.330", ["24", "25"]),
        ("-0.066", ["27"]),
        ("SALT And 828", ["38", "39"]),
    ],
)
def test_filters_keep_the_rows_they_mean(text, numbers):
    assert kept(text, interval_table()) == numbers


def test_rows_without_a_value_meet_no_comparison():
    assert kept("residual != 2", visit_table()) == ["33", "37"]
    assert kept("less tide < 1000", visit_table()) == ["31", "32", "33", "34", "36", "37"]


@pytest.mark.parametrize(
    ("text", "numbers"),
    [
        ("time < 11:41", ["31"]),
        ("time <= 11:41", ["31", "32"]),
        ("time > 12:39", ["36", "37"]),
        ("time >= 12:39", ["35", "36", "37"]),
        ("time = 12:02", ["33"]),
        ("time != 12:02 and time < 12:17", ["31", "32"]),
        ("time >= 15 Oct 13:00", ["36", "37"]),
        ("time >= 2025-10-15T13:22", ["37"]),
        ("time = 15 Oct 2025", ["31", "32", "33", "34", "35", "36", "37"]),
        ("time > 2025-10-15", []),
    ],
)
def test_times_are_compared_as_they_are_written(text, numbers):
    assert kept(text, visit_table()) == numbers


def test_what_is_written_to_the_minute_lasts_a_minute():
    values = np.array([seconds(2025, 10, 15, 11, 41, 30)] * 10 + [seconds(2025, 10, 15, 11, 42)] * 10)
    table = interval_table(columns=(LedgerColumn(key="time", name="time", kind=TIME, values=values),))
    counts = [len(kept(f"time {sign} 11:41", table)) for sign in ("<", "<=", "=", "!=", ">=", ">")]
    assert counts == [0, 10, 10, 10, 20, 10]
    assert len(kept("time <= 11:41:29", table)) == 0 and len(kept("time = 11:41:30", table)) == 10


def test_a_clock_needs_its_day_where_there_are_several():
    values = np.array([seconds(2025, 10, 15, 11, 42), seconds(2025, 10, 16, 8, 5)])
    table = interval_table()
    times = LedgerColumn(key="time", name="time", kind=TIME, values=np.resize(values, len(table)))
    table = interval_table(columns=(times,))
    assert told("time > 11:42", table) == "there are several days; write 15 Oct 11:42 or 2025-10-15 11:42"
    assert len(kept("time > 15 Oct 11:42", table)) == 10


THERE = "there are No, top, base, Δg, density, log, difference, ratio, layer"


@pytest.mark.parametrize(
    ("text", "reason"),
    [
        ("densty > 2.4", f'there is no column "densty"; {THERE}'),
        ("density >", 'a value must stand after ">"'),
        ("> 3", 'a column must stand before ">"'),
        ("density > heavy", '"heavy" is not a number'),
        ("density > 2,4", "write the decimal point: 2.4"),
        ("density > nan", '"nan" is not a number'),
        ("density > 2.4 and", 'something must stand on both sides of "and"'),
        ("layer > 3", '"layer" holds texts; compare it with = or !='),
        ("top sd > 3", f'there is no column "top sd"; {THERE}'),
    ],
)
def test_a_wrong_filter_says_why(text, reason):
    assert told(text, interval_table()) == reason


@pytest.mark.parametrize("text", ["time > noon", "time > 25:00", "time = 31 Feb 10:00"])
def test_a_wrong_time_says_why(text):
    assert "time" in told(text, visit_table()) and text.partition(" ")[2].lstrip("<>= ") in told(text, visit_table())
