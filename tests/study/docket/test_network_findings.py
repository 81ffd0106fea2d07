"""What the docket says about the network: each kind where it is due, and a near miss."""

from dataclasses import replace

import numpy as np
import pytest

from plumbwell.study.case import Case
from plumbwell.study.reduce import reduce


def test_a_clean_loop_raises_notes_only(invented, graver):
    assert graver(invented.survey()) == []


def test_one_station_has_gravity_and_no_density(invented, found):
    (one,) = found(invented.survey(invented.visits("AAA")), "single_station")
    assert one.severity == "error" and one.place == "A, 20.0 m" and one.stations == (0,)
    assert one.text == "There is one station only in the column: gravity is given, a density needs two depths."


def test_stations_at_one_height_have_no_density(invented, found):
    rows = [{**row, "depth [m]": "20.0"} for row in invented.visits("ABAB")]
    (one,) = found(invented.survey(rows), "single_station")
    assert "All 2 stations of the column lie within 0.50 m of height" in one.text


def test_two_stations_are_enough_for_a_density(invented, found):
    assert not found(invented.survey(invented.visits("ABABAB")), "single_station")


def test_one_pass_down_rests_its_drift_on_what_is_stated(invented, found):
    results = invented.survey(
        invented.visits("ABCD"), instrument='applied = ["tide"]\ndrift_rate = 0.01\ndrift_rate_sd = 0.04'
    )
    (one,) = found(results, "no_repeat")
    assert one.severity == "error" and one.place == "run 1" and one.stations == (0, 1, 2, 3)
    assert "the drift is the stated one, 0.01 ± 0.04 mGal/h" in one.text


def test_one_repeat_separated_in_time_tells_the_drift(invented, found):
    assert not found(invented.survey(invented.visits("ABCDA")), "no_repeat")


def test_a_run_that_shares_its_stations_with_a_looped_one_is_told_apart(invented, found):
    rows = invented.visits("ABCDCBA") + invented.visits("ABCD", run="2", start=4.0)
    assert not found(invented.survey(rows), "no_repeat")


def test_two_single_passes_in_the_same_order_tell_no_drift(invented, found):
    rows = invented.visits("ABCD") + invented.visits("ABCD", run="2", start=4.0)
    assert [one.place for one in found(invented.survey(rows), "no_repeat")] == ["run 1", "run 2"]


def test_a_tie_does_not_stand_for_a_repeat(invented, found):
    results = invented.survey(
        invented.visits("ABCD"),
        data='ties = "ties.csv"',
        files={"ties.csv": "station,gravity [mGal],gravity_sd [mGal]\nA,980000.0,0.01\n"},
    )
    assert len(found(results, "no_repeat")) == 1
    assert not found(results, "relative_gravity")


def test_a_tied_loop_has_its_repeat(invented, found):
    results = invented.survey(
        data='ties = "ties.csv"',
        files={"ties.csv": "station,gravity [mGal],gravity_sd [mGal]\nA,980000.0,0.01\n"},
    )
    assert not found(results, "no_repeat")


def test_as_many_unknowns_as_visits_leave_the_noise_to_the_instrument(invented, found):
    results = invented.survey(invented.visits("ABCDA"), instrument='applied = ["tide"]\nreseating_sd = 0.007')
    (one,) = found(results, "noise_untold")
    assert one.severity == "error" and "the stated one, 7.0 µGal a visit" in one.text
    assert not found(results, "few_degrees_of_freedom")


def test_few_degrees_of_freedom_want_a_look(invented, found):
    results = invented.survey(invented.visits("ABCDABC"))
    (one,) = found(results, "few_degrees_of_freedom")
    assert one.severity == "look"
    assert one.text.startswith("Only 2 degrees of freedom tie visits together") and one.text.endswith(
        # t.ppf(0.975, 6) = 2.447
        "95 % lie within 2.45 sd (Student's t, 6 degrees of freedom), not within two."
    )
    assert not found(results, "noise_untold")


def test_stated_noise_is_no_error_and_few_checks_are_told(invented, found):
    results = invented.survey(invented.visits("ABCDA"), recipe='tide = "none"\nnoise = "as_given"')
    assert not found(results, "noise_untold")
    (one,) = found(results, "few_degrees_of_freedom")
    assert "little checks the stated noise" in one.text


def test_five_degrees_of_freedom_are_not_few(invented, found):
    assert not found(invented.survey(invented.visits("ABCDABCDAB")), "few_degrees_of_freedom")


def test_runs_without_a_shared_station_are_two_parts(invented, found):
    rows = invented.visits("ABABABAB") + invented.visits("CDCDCDC", run="2", start=5.0)
    results = invented.survey(rows)
    (one,) = found(results, "network_parts")
    assert one.severity == "error" and "2 parts that no shared station joins (A and B; C and D)" in one.text
    assert one.stations == (2, 3)
    assert results.intervals.from_station == ("A", "C")


def test_one_shared_station_joins_two_runs(invented, found):
    rows = invented.visits("ABABABAB") + invented.visits("BCDCDCDC", run="2", start=5.0)
    assert not found(invented.survey(rows), "network_parts")


TARE = '[[tare]]\nrun = "1"\ntime = "2026-05-04T{}Z"\n'


def test_two_tares_in_one_gap_cannot_be_told_apart(invented, found):
    tables = TARE.format("09:05:00") + TARE.format("09:06:00")
    (one,) = found(invented.survey(tables=tables), "rank_lost")
    assert (one.severity, one.place, one.stations, one.intervals) == ("error", "run 1", (), ())
    assert one.text == (
        "The readings cannot tell the tare at 2026-05-04 09:05:00 UTC of run 1 from the tare at 2026-05-04 09:06:00 "
        "UTC: none of them is known, and gravity rests on none of them."
    )
    assert one.mend.startswith("Remove this tare, state size and size_sd of it")


def test_a_bend_of_the_drift_that_no_repeat_shows_takes_gravity_with_it(invented, found):
    results = invented.survey(invented.visits("ABCD"), recipe='tide = "none"\ndrift_order = 2')
    (one,) = found(results, "rank_lost")
    assert one.severity == "error" and one.stations == (1, 2) and one.intervals == (0, 1, 2)
    assert one.text == (
        "The readings cannot tell the drift term of order 2 of run 1 from the drift term of order 1 and gravity at B "
        "and C: 2 stations have no gravity, and no density rests on it."
    )
    assert one.mend.startswith("Lower drift_order of the run")


def test_a_tare_between_repeats_is_determined(invented, found):
    results = invented.survey(tables=TARE.format("08:55:00"))
    assert not found(results, "rank_lost") and not found(results, "tare_outside")


def test_a_tare_before_its_run_has_no_effect(invented, found):
    (one,) = found(invented.survey(tables=TARE.format("07:59:00")), "tare_outside")
    assert one.severity == "look" and one.place == "run 1"
    assert "The tare of run 1 at 2026-05-04 07:59:00 UTC has no effect" in one.text
    assert "from 2026-05-04 08:00:00 UTC to 2026-05-04 09:42:00 UTC" in one.text


def test_a_tie_whose_readings_are_all_out_of_use_is_told(invented, found):
    rows = [{**row, "use": "no" if row["station"] == "D" else "yes"} for row in invented.visits()]
    ties = "station,gravity [mGal],gravity_sd [mGal]\nD,980000.0,0.01\n"
    results = invented.survey(rows, data='ties = "ties.csv"', files={"ties.csv": ties})
    (one,) = found(results, "tie_unknown_station")
    assert one.severity == "look" and one.text.startswith("D: no used reading and no place says where")
    assert found(results, "relative_gravity")


def test_a_tie_where_nothing_was_read_fixes_nothing(invented, found):
    results = invented.survey(
        data='ties = "ties.csv"\nplaces = "places.csv"',
        files={
            "ties.csv": "station,gravity [mGal],gravity_sd [mGal]\nZ,980000.0,0.01\n",
            "places.csv": "station,depth [m],role\nZ,0.0,base\n",
        },
    )
    (one,) = found(results, "tie_unvisited")
    assert one.severity == "look" and "No used reading stands at Z" in one.text
    assert not found(results, "network_parts")


def test_a_tie_at_a_read_station_is_used_in_silence(invented, found):
    ties = "station,gravity [mGal],gravity_sd [mGal]\nA,980000.0,0.01\n"
    results = invented.survey(data='ties = "ties.csv"', files={"ties.csv": ties})
    assert not [one for one in results.findings if one.code.startswith("tie_")]


def test_a_datum_station_that_is_none_is_told(invented, found):
    results = invented.survey()
    asked = replace(results.recipe, datum_station="Q")
    (one,) = found(reduce(Case(survey=results.survey), recipe=asked), "datum_station_unknown")
    assert one.severity == "look" and one.text.endswith("no station of this survey: gravity counts from A.")


def test_a_datum_station_that_serves_is_the_one_named(invented, found):
    results = invented.survey(recipe='tide = "none"\ndatum_station = "C"')
    assert not found(results, "datum_station_unknown")
    (one,) = found(results, "relative_gravity")
    assert one.severity == "note" and "difference from C" in one.text and one.stations == (2,)
    share = float(np.max(np.abs(results.intervals.errors.factors["datum"]))) / 1000.0
    assert f"adds {share:.4f} g/cm³" in one.text and 0.0001 <= share <= 0.0003


def test_equal_times_in_a_run_want_a_look(invented, found):
    rows = invented.visits()
    rows[4]["time"] = rows[3]["time"]
    (one,) = found(invented.survey(rows), "equal_times")
    assert one.severity == "look" and one.place == "readings.csv, row 6" and one.rows == (4,)


def test_copied_rows_are_called_copies(invented, found):
    rows = invented.visits()
    results = invented.survey([*rows, dict(rows[7]), dict(rows[2])])
    (one,) = found(results, "rows_twice")
    assert one.severity == "look" and one.place == "readings.csv, rows 36 and 35" and set(one.rows) == {33, 34}
    assert one.text.startswith("2 readings stand twice, with the time, station, depth and reading of another row")
    assert not found(results, "equal_times")


def test_a_row_of_the_same_time_with_another_reading_is_no_copy(invented, found):
    rows = invented.visits()
    results = invented.survey([*rows, {**rows[7], "reading [mGal]": "4004.0"}, dict(rows[2])])
    assert len(found(results, "rows_twice")[0].rows) == 1 and len(found(results, "equal_times")[0].rows) == 1


def test_equal_times_of_two_runs_are_two_instruments(invented, found):
    rows = invented.visits() + invented.visits(run="2")
    assert not found(invented.survey(rows), "equal_times")


def test_a_bent_drift_tells_its_order(invented, found):
    rows = invented.visits("ABCDABCDABCDABCD")
    for number, row in enumerate(rows):
        row["reading [mGal]"] = f"{float(row['reading [mGal]']) + 0.2 * (number / len(rows)) ** 2:.4f}"
    (one,) = found(invented.survey(rows), "drift_order_chosen")
    assert one.severity == "note" and "The drift of run 1 is of order 2: over order 1 F = " in one.text


def test_a_straight_drift_tells_nothing(invented, found):
    assert not found(invented.survey(), "drift_order_chosen")


def test_a_drift_that_is_held_is_told(invented, found):
    results = invented.survey(
        instrument='applied = ["tide"]\ndrift_rate = 0.02', recipe='tide = "none"\ndrift_order = 0'
    )
    (one,) = found(results, "drift_held")
    assert one.severity == "note" and "held at 0.02 mGal/h without error" in one.text


@pytest.mark.parametrize(("written", "told"), [("auto", 1), ("off", 0)])
def test_the_walk_is_untested_only_where_it_was_asked_for(invented, found, written, told):
    results = invented.survey(recipe=f'tide = "none"\ndrift_walk = "{written}"')
    assert len(found(results, "drift_walk_untested")) == told


def test_single_visits_are_counted_and_named(invented, found):
    (one,) = found(invented.survey(invented.visits("ABCABCABDABC")), "single_visit")
    assert one.severity == "note" and one.text.startswith("1 of 4 stations stands on a single visit (D)")
    assert one.stations == (3,)
    assert not found(invented.survey(), "single_visit")


def test_a_long_label_is_cut_and_one_that_cannot_be_seen_is_spelt_out(invented, found):
    rows = [{**row, "station": {"A": "A" * 150, "B": "B\u200b"}.get(row["station"], row["station"])} for row in
            invented.visits("ABCDACDAC")]  # fmt: skip
    results = invented.survey(rows)
    (one,) = found(results, "relative_gravity")
    assert one.place == "A" * 79 + "…" and "A" * 80 not in one.text
    (one,) = found(results, "single_visit")
    assert "(B\\u200b)" in one.text and one.stations == (1,)


def test_a_high_order_that_few_repeats_leave_open_is_no_missing_repeat(invented, found):
    results = invented.survey(invented.visits("ABAB"), recipe='tide = "none"\ndrift_order = 3')
    assert not found(results, "no_repeat")
    assert [one.severity for one in found(results, "noise_untold")] == ["error"]


def test_what_a_person_reads_of_one_station_and_of_one_pass(invented, found):
    """The whole of both texts, since that is all a person has at the well."""
    (one,) = found(invented.survey(invented.visits("AAA")), "single_station")
    assert (one.text, one.mend) == (
        "There is one station only in the column: gravity is given, a density needs two depths.",
        "Bring in readings at a second depth, or correct depths and roles of the stations.",
    )
    (one,) = found(invented.survey(invented.visits("ABCD")), "no_repeat")
    assert (one.text, one.mend) == (
        "Run 1 has no repeat separated in time that tells its drift from gravity: the drift is the stated one, "
        "0 ± 0.05 mGal/h (drift_rate, drift_rate_sd), and its error is in the densities.",
        "Bring in a second visit of a station of this run, or of one that a well-tied run shares with it; else see "
        "that drift_rate_sd of the instrument is honest.",
    )
