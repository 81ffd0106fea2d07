"""Visits and readings that do not fit, and how the docket tells of them; clean surveys stay silent."""

import pytest

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
    assert one.text.startswith("The reading of row 15 at 120.0 m (visit 5) lies +")
    assert float(one.text.split("lies +")[1].split(" µGal")[0]) == pytest.approx(50.0, abs=12.0)
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
