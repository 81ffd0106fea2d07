"""Visits and readings that do not fit, and how the docket tells of them; clean surveys stay silent."""

import numpy as np
import pytest
from scipy import special

from plumbwell.study.docket.outliers import as_normal, beside_the_rest, critical_ratio

LONG = "ABCDABCDABCDABCDABCD"


def shifted(rows, first, last, by):
    """Rows of which some read so much more, in mGal."""
    for row in rows[first:last]:
        row["reading [mGal]"] = f"{float(row['reading [mGal]']) + by:.4f}"
    return rows


def test_a_bad_stop_is_named_with_its_size_and_the_visits_it_disagrees_with(invented, found):
    results = invented.survey(shifted(invented.visits(LONG), 18, 21, 0.040))
    (one,) = found(results, "visit_disagrees")
    assert one.severity == "look" and one.place == "C, 120.0 m" and one.stations == (2,)
    assert one.rows == (18, 19, 20)
    assert one.text.startswith("Visit 7 at 120.0 m (2026-05-04 09:00:00 UTC, run 1) reads ")
    assert " more than visits 3, 11, 15 and 19 and the drift allow." in one.text
    size = float(one.text.split("reads ")[1].split(" µGal")[0])
    assert 30.0 < size < 50.0


def test_a_stop_that_reads_too_little_is_told_so(invented, found):
    results = invented.survey(shifted(invented.visits(LONG), 18, 21, -0.040))
    assert " less than visits 3" in found(results, "visit_disagrees")[0].text


def test_a_stop_off_by_its_own_noise_is_not_named(invented, graver):
    assert graver(invented.survey(shifted(invented.visits(LONG), 18, 21, 0.003))) == []


def test_a_bad_stop_is_found_though_few_visits_raise_their_own_noise(invented, found):
    # With 6 degrees of freedom no residual is larger than 2.5 times the sd that it takes part in.
    results = invented.survey(shifted(invented.visits("ABCDABCDABC"), 15, 18, 0.200))
    assert [one.place for one in found(results, "visit_disagrees")] == ["B, 70.0 m"]


def test_of_two_visits_that_disagree_neither_is_accused(invented, found):
    rows = shifted(invented.visits("ABCABCABCADBCABCABCABD"), 30, 33, 0.100)
    (one,) = found(invented.survey(rows), "visit_disagrees")
    assert one.text.startswith("Visits 11 and 22 at 170.0 m disagree by ")
    assert one.text.endswith("nothing here tells which of the two is off.")
    assert len(one.rows) == 6


def test_a_reading_off_its_visit_is_named_by_its_line(invented, found):
    results = invented.survey(shifted(invented.visits(), 13, 14, 0.050))
    (one,) = found(results, "reading_disagrees")
    assert one.severity == "look" and one.rows == (13,) and one.stations == (2,)
    assert one.place == "C, 120.0 m; readings.csv, row 15"
    assert one.text.startswith("The reading of row 15 at 120.0 m (visit 5) lies +3")
    assert not found(results, "visit_disagrees")


def test_a_reading_as_far_off_as_chance_allows_is_not_named(invented, graver):
    assert graver(invented.survey(shifted(invented.visits(), 13, 14, 0.004))) == []


def test_many_bad_readings_are_capped_and_counted(invented, found):
    rows = invented.visits(LONG, readings=9)
    for first in range(4, 9 * 7, 9):
        shifted(rows, first, first + 1, 0.2)
    told = found(invented.survey(rows), "reading_disagrees")
    assert len(told) == 6
    (rest,) = [one for one in told if "more readings lie" in one.text]
    assert rest.text.startswith("2 more readings lie ")
    assert sorted(row for one in told for row in one.rows) == list(range(4, 9 * 7, 9))


def test_the_limit_grows_with_the_number_of_readings_and_never_falls_below_one_test():
    assert critical_ratio(1) == 3.29
    # Normal quantile of 1 - (1 - 0.99^(1/1000))/2.
    assert critical_ratio(1000) == pytest.approx(float(-special.ndtri(-np.expm1(np.log(0.99) / 1000) / 2)), rel=1e-9)


@pytest.mark.parametrize("freedom", [4, 5, 10, 50, 1000])
def test_few_degrees_of_freedom_weaken_a_ratio_as_student_does(freedom):
    exact = np.array([2.0, 3.29, 4.0, 5.0])
    student = -special.stdtrit(freedom, special.ndtr(-exact))
    told = as_normal(student, float(freedom))
    assert np.all(told <= exact + 1e-9) and np.all(told > exact - 0.13)
    assert np.array_equal(as_normal(-exact, float("inf")), exact)


def test_the_ratio_beside_the_rest_is_that_of_a_fit_without_the_reading():
    values = np.array([1.0, -0.4, 0.3, 6.0, -0.9, 0.1, 0.7])
    n = len(values)
    centred = values - values.mean()
    ratio = centred / np.sqrt(np.sum(centred**2) / (n - 1) * (1 - 1 / n))
    rest = np.delete(values, 3)
    expected = (values[3] - rest.mean()) / np.sqrt(np.var(rest, ddof=1) * (1 + 1 / (n - 1)))
    told = beside_the_rest(ratio, freedom=n - 1.0, variance=np.ones(n), least=np.zeros(n))
    assert told[3] == pytest.approx(expected, rel=1e-12)


def test_stated_noise_is_not_measured_anew():
    ratio = np.array([2.0, -5.0])
    assert beside_the_rest(ratio, freedom=float("inf"), variance=np.ones(2), least=np.zeros(2)) is ratio


def test_readings_that_nothing_checks_are_counted(invented, found):
    rows = invented.visits("ABCABCABCDABC", readings=1)
    (one,) = found(invented.survey(rows), "unchecked_readings")
    assert one.severity == "note" and one.rows == (9,) and one.stations == (3,)
    assert one.text.startswith("Nothing checks 1 reading at D")
    assert not found(invented.survey(invented.visits("ABCDABCDABC", readings=1)), "unchecked_readings")


def test_many_bad_readings_do_not_hide_each_other(invented, found):
    rows = invented.visits("ABCDABCDABCDABCDABCDABCDABCDABCDABCDABCDABCDABCD")
    for first in range(0, len(rows), 12):
        shifted(rows, first, first + 1, 0.300)
    told = found(invented.survey(rows), "reading_disagrees")
    assert sorted(row for one in told for row in one.rows if row % 12 == 0) == list(range(0, len(rows), 12))


def test_a_long_clean_survey_raises_notes_only(invented, graver):
    assert graver(invented.survey(invented.visits("ABCD" * 30))) == []
