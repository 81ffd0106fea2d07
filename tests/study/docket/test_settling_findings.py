"""Visits that had not settled, as the docket tells of them; settled ones stay silent."""

import pytest

LONG = "ABCDABCDABCDABCDABCD"


def creeping(rows, first, sizes):
    """Rows of which those from `first` on read so much more, in mGal."""
    for row, size in zip(rows[first:], sizes, strict=False):
        row["reading [mGal]"] = f"{float(row['reading [mGal]']) + size:.4f}"
    return rows


def test_a_visit_that_creeps_is_named_with_its_size_and_the_rows_to_leave_out(invented, found):
    rows = creeping(invented.visits(LONG, readings=6), 6 * 6, (-0.080, -0.040))
    (one,) = found(invented.survey(rows), "visit_settling")
    assert one.severity == "look" and one.stations == (2,) and one.rows == (36, 37)
    assert one.place == "C, 120.0 m; readings.csv, rows 38 and 39"
    assert one.text.startswith("Visit 7 at 120.0 m (2026-05-04 09:00:00 UTC, run 1) creeps: its first reading lies ")
    assert " (1 sd) below the level of its later half. The first 2 readings of 6 had not settled, which " in one.text
    size, sd = (float(part.split(" µGal")[0]) for part in one.text.split(" lies ")[1].split(" ± "))
    # 3 microgal a reading, the later half has three; a fifth of slack for its estimate.
    assert sd == pytest.approx(3.0 * (4.0 / 3.0) ** 0.5, rel=0.2) and size == pytest.approx(80.0, abs=4.0 * sd)
    assert float(one.text.split("by ")[1].split(" µGal")[0].replace("\u2212", "-")) == pytest.approx(-20.0, abs=5.0)
    assert one.mend.startswith("Take readings.csv, rows 38 and 39 out of use")


def test_half_a_visit_that_creeps_may_not_have_settled_even_then(invented, found):
    rows = creeping(invented.visits(LONG, readings=6), 36, (0.2, 0.12, 0.07, 0.04, 0.02, 0.01))
    (one,) = found(invented.survey(rows), "visit_settling")
    assert "above the level" in one.text and "At least the first 3 readings of 6 had not settled" in one.text


def test_a_survey_in_which_every_visit_creeps_is_told_of_once_and_for_all(invented, found):
    rows = invented.visits(LONG, readings=6)
    for first in range(0, len(rows), 6):
        creeping(rows, first, (0.080, 0.020))
    told = found(invented.survey(rows), "visit_settling")
    assert len(told) == 6
    (rest,) = [one for one in told if "more visits creep" in one.text]
    assert rest.text.startswith("15 more visits creep, by ")
    assert ", 20 of the 20 visits that can tell in all" in rest.text
    left_out = sorted(row for one in told for row in one.rows)
    assert set(range(0, len(rows), 6)) <= set(left_out) and len(left_out) == len(set(left_out))


def test_a_visit_that_settles_within_its_noise_is_not_named(invented, graver):
    # 6 microgal: 1.7 sd of the first reading against three others.
    assert graver(invented.survey(creeping(invented.visits(LONG, readings=6), 36, (0.006,)))) == []


def test_a_bad_reading_in_the_middle_is_no_creep(invented, found):
    results = invented.survey(creeping(invented.visits(LONG, readings=6), 39, (0.080,)))
    assert found(results, "reading_disagrees") and not found(results, "visit_settling")


def test_visits_of_one_or_two_readings_cannot_tell(invented, found):
    rows = creeping(invented.visits(LONG, readings=2), 12, (0.080,))
    assert not found(invented.survey(rows), "visit_settling")


@pytest.mark.parametrize("counts", [(6,), (4, 8)])
def test_a_little_creep_that_all_visits_share_is_told(invented, found, counts):
    rows = []
    for number, stop in enumerate(LONG * 2):
        rows += creeping(invented.visits(stop, readings=counts[number % len(counts)], start=number / 6.0), 0, (0.005,))
    results = invented.survey(rows)
    (one,) = found(results, "visits_creep_alike")
    assert one.severity == ("note" if len(counts) == 1 else "look")
    size, sd = (float(part.split(" µGal")[0]) for part in one.text.split(" on average ")[1].split(" ± "))
    assert size == pytest.approx(5.0, abs=4.0 * sd) and sd == pytest.approx(3.5 / 40**0.5, rel=0.25)
    assert ("4 to 8 readings" in one.text) == (len(counts) == 2)


def test_a_shared_creep_below_its_noise_is_not_told(invented, found):
    rows = invented.visits(LONG * 2, readings=6)
    for first in range(0, len(rows), 6):
        creeping(rows, first, (0.0008,))
    assert not found(invented.survey(rows), "visits_creep_alike")
