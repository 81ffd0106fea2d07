"""Numbers as people read them."""

import pytest

from plumbwell.plates.numbers import (
    column_decimals,
    constant,
    counted,
    number,
    sd_decimals,
    step_decimals,
    with_sd,
)


@pytest.mark.parametrize(
    ("sd", "decimals"),
    [
        (0.012, 3),
        (0.0124, 3),
        (0.0195, 3),
        (0.02, 3),
        (0.0294, 3),
        (0.0297, 2),
        (0.03, 2),
        (0.007, 3),
        (0.0096, 3),
        (0.4, 1),
        (1.4, 1),
        (3.2, 0),
        (25.0, 0),
        (410.0, 0),
        (1e-12, 6),
    ],
)
def test_decimals_follow_the_standard_deviation(sd, decimals):
    assert sd_decimals(sd) == decimals


def test_a_column_has_one_number_of_decimals():
    assert column_decimals([0.012, 0.011, 0.014], default=3) == 3
    assert column_decimals([0.0012, 0.5], default=3) == 2, "at most one more than the largest asks"
    assert column_decimals([0.0012, 0.004, None, 0.0, float("nan")], default=3) == 4
    assert column_decimals([None, None], default=3) == 3
    assert column_decimals([], default=1) == 1


@pytest.mark.parametrize(
    ("value", "decimals", "signed", "text"),
    [
        (2.2164, 3, False, "2.216"),
        (-0.039, 3, True, "\u22120.039"),
        (0.131, 3, True, "+0.131"),
        (-0.0004, 3, True, "0.000"),
        (0.0, 1, True, "0.0"),
        (981342.118, 3, False, "981\u00a0342.118"),
        (1000.0, 0, False, "1\u00a0000"),
        (999.0, 0, False, "999"),
        (-1234567.0, 1, False, "\u22121\u00a0234\u00a0567.0"),
        (None, 3, False, "\u2014"),
        (float("nan"), 3, True, "\u2014"),
    ],
)
def test_numbers_are_printed_as_people_read_them(value, decimals, signed, text):
    assert number(value, decimals, signed=signed) == text


def test_constants_are_spaced_after_the_point_too():
    assert constant(0.083872, 6) == "0.083\u00a0872"
    assert constant(981342.118, 3) == "981\u00a0342.118"
    assert constant(1200.0, 0) == "1\u00a0200"


def test_value_and_standard_deviation_stand_together():
    assert with_sd(2.43149, 0.0124) == "2.431\u00a0\u00b1\u00a00.012"
    assert with_sd(-0.0661, 0.0129, signed=True) == "\u22120.066\u00a0\u00b1\u00a00.013"
    assert with_sd(2.43149, None) == "2.431"
    assert with_sd(None, 0.012) == "\u2014"


@pytest.mark.parametrize(
    ("step", "decimals"), [(100.0, 0), (1.0, 0), (0.5, 1), (0.1, 1), (0.02, 2), (0.001, 3)]
)
def test_neighbouring_ticks_can_be_told_apart(step, decimals):
    assert step_decimals(step) == decimals


def test_one_of_a_kind_is_not_many():
    assert [counted(count, "station") for count in (0, 1, 2)] == ["0 stations", "1 station", "2 stations"]
    assert counted(1440, "row") == "1\u00a0440 rows"
