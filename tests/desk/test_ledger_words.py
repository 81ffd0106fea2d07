"""How cells of a ledger read, and that searching finds exactly what they read."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from made_ledger import interval_table, seconds, visit_table
from plumbwell.desk.ledger.ledger_order import sorted_rows
from plumbwell.desk.ledger.ledger_search import cells_with, numbers_with, plain
from plumbwell.desk.ledger.ledger_words import FIGURE_SPACE, ColumnWords
from plumbwell.desk.ledger.table import TEXT, TIME, LedgerColumn
from plumbwell.plates.lettering import text_width
from plumbwell.plates.numbers import NO_VALUE, number
from plumbwell.plates.theme import theme_named

NAN = float("nan")


def words_of(values, **given):
    """A column of these values."""
    if given.get("kind") != TEXT:
        values = np.array(values, dtype=float)
    return ColumnWords(LedgerColumn(**{"key": "it", "name": "it", **given}, values=values))


def column(table, key):
    """A column of a made table."""
    return ColumnWords(next(one for one in table.columns if one.key == key))


def test_value_and_sd_have_the_decimals_that_the_smallest_sd_bears():
    density = column(interval_table(), "density")
    assert (density.value(4), density.sd(4)) == ("2.216", "±\u00a00.012")
    assert (density.value(0), density.sd(0)) == ("2.330", "±\u00a00.007")


def test_differences_have_a_sign_and_true_minus_and_gaps_a_dash():
    residual = column(visit_table(), "residual")
    assert [residual.value(row) for row in (1, 2, 3)] == [NO_VALUE, "\u22124.6", "+2.0"]
    assert residual.sd(1) == "", "no standard deviation where there is no value"


def test_plus_minus_signs_stand_under_one_another():
    residual = column(visit_table(), "residual")
    theme = theme_named("light")
    widths = {text_width(theme, "text", residual.sd(row)) for row in (2, 3, 6)}
    assert len(widths) == 1 and widths == {residual.sd_width(theme)}
    assert residual.sd(2) == f"±\u00a0{FIGURE_SPACE}2.8" and residual.sd(6) == "±\u00a011.5"


def test_columns_without_sd_have_three_decimals_and_spaced_thousands():
    assert words_of([981412.2051]).value(0) == "981\u00a0412.205"
    assert words_of([981412.2051], decimals=1).value(0) == "981\u00a0412.2"


def test_from_three_on_a_ratio_wants_a_look():
    ratio = words_of([2.96, -3.0, NAN, 12.8], amber_from=3.0)
    assert [ratio.wants_look(row) for row in range(4)] == [False, True, False, True]


def test_times_of_one_day_leave_the_day_to_the_head():
    time = column(visit_table(), "time")
    assert time.value(0) == "11:22" and time.unit == "15 Oct 2025, UTC"


def test_times_show_seconds_when_minutes_do_not_tell_rows_apart():
    time = words_of([seconds(2025, 10, 15, 11, 42, 7), seconds(2025, 10, 15, 11, 42, 40)], kind=TIME)
    assert [time.value(0), time.value(1)] == ["11:42:07", "11:42:40"]


def test_times_of_several_days_carry_their_day_and_of_several_years_their_year():
    days = words_of([seconds(2025, 10, 15, 11, 42), seconds(2025, 10, 16, 8, 5)], kind=TIME, unit="UTC")
    assert [days.value(0), days.unit] == ["15 Oct 11:42", "UTC"]
    years = words_of([seconds(2024, 12, 31, 23, 59), seconds(2025, 1, 1), NAN], kind=TIME)
    assert [years.value(row) for row in range(3)] == ["31 Dec 2024 23:59", "1 Jan 2025 00:00", NO_VALUE]


def test_spoken_cells_tell_name_value_sd_and_unit():
    assert column(interval_table(), "density").spoken(4) == "density 2.216 ±\u00a00.012 g/cm³"
    assert column(visit_table(), "residual").spoken(2) == "residual \u22124.6 ±\u00a02.8 µGal"
    assert column(visit_table(), "residual").spoken(0) == "residual: no value"


@given(
    values=st.lists(st.floats(-3000, 3000) | st.sampled_from([-0.0, 0.05, 12.25, 0.35, 2.675, -4e-4]), max_size=40),
    decimals=st.integers(0, 4),
    signed=st.booleans(),
    wanted=st.text(alphabet="0123459.-+", min_size=1, max_size=5),
)
def test_searching_numbers_finds_what_their_texts_contain(values, decimals, signed, wanted):
    found = numbers_with(np.array(values, dtype=float), wanted, decimals, signed=signed)
    assert found.tolist() == [wanted in plain(number(value, decimals, signed=signed)) for value in values]


def test_searching_numbers_knows_which_way_their_texts_were_rounded():
    values = np.array([0.35, 0.45, 12.25, 2.675, 1e17, 3e15 + 0.5])
    for wanted in ("0.3", "0.4", "12.2", "2.7", "2.6", "100000", "5"):
        for decimals in (1, 2):
            shown = [wanted in plain(number(value, decimals)) for value in values.tolist()]
            assert numbers_with(values, wanted, decimals).tolist() == shown, wanted


@pytest.mark.parametrize(
    "wanted",
    ["7", "2.2", ".0", "-0", "+0.0", "±", "—", "0.01", "11:4", "oct", "base", "x", "1e5", "999999999999999999999"],
)
def test_searching_cells_finds_what_is_shown(wanted):
    for table in (interval_table(), visit_table()):
        for one in table.columns:
            words = ColumnWords(one)
            shown = [
                wanted in plain(words.value(row)) or wanted in plain(words.sd(row).replace(FIGURE_SPACE, ""))
                for row in range(len(table))
            ]
            assert cells_with(words, wanted).tolist() == shown, one.key


def test_searching_times_finds_days_and_clocks():
    time = words_of([seconds(2025, 10, 15, 11, 42), NAN, seconds(2025, 11, 16, 8, 5)], kind=TIME)
    assert cells_with(time, "nov").tolist() == [False, False, True]
    assert cells_with(time, "1:42").tolist() == [True, False, False]
    assert cells_with(time, "—").tolist() == [False, True, False]


def test_sorting_is_stable_and_puts_what_has_no_value_last_both_ways():
    words = words_of([2.0, NAN, 1.0, 2.0, 1.0])
    assert sorted_rows(words, descending=False).tolist() == [2, 4, 0, 3, 1]
    assert sorted_rows(words, descending=True).tolist() == [0, 3, 2, 4, 1]


def test_texts_sort_with_the_numbers_in_them_by_size():
    words = words_of(("B10", "", "b2", "A7"), kind=TEXT)
    assert sorted_rows(words, descending=False).tolist() == [3, 2, 0, 1]
    assert sorted_rows(words, descending=True).tolist() == [0, 2, 3, 1]
