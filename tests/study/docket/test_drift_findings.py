"""What the docket says about large drift and tares that part a run: each kind where it is due, and a near miss."""

from datetime import datetime

import pytest

TARE = '[[tare]]\nrun = "1"\ntime = "2026-05-04T{}Z"\n'
HONEST = 'applied = ["tide"]\ndrift_rate_sd = 100'


def drifting(rows, rate):
    """The rows with a drift more, mGal/h."""
    start = datetime.fromisoformat(rows[0]["time"])
    for row in rows:
        hours = (datetime.fromisoformat(row["time"]) - start).total_seconds() / 3600.0
        row["reading [mGal]"] = f"{float(row['reading [mGal]']) + rate * hours:.4f}"
    return rows


def test_drift_beyond_the_signal_is_told_with_its_ratio_and_the_result_is_kept(invented, found):
    results = invented.survey(drifting(invented.visits(), 60.0), instrument=HONEST)
    (one,) = found(results, "drift_large")
    assert (one.severity, one.place, one.stations) == ("look", "run 1", (0, 1, 2, 3))
    # 102 minutes at 60.02 mGal/h over 150 m of 0.1073 mGal/m.
    assert "spans 102.0" in one.text and "6.3 times what gravity changes by between its stations, 16.09" in one.text
    assert abs(results.intervals.density.values / 1000.0 - 2.4).max() < 0.01
    assert not found(results, "drift_not_as_stated")


def test_drift_below_the_signal_is_no_finding(invented, found):
    assert not found(invented.survey(drifting(invented.visits(), 9.0), instrument=HONEST), "drift_large")


def test_a_tare_is_no_drift(invented, found):
    rows = invented.visits("ABCDCBABCDCBA")
    for row in rows[18:]:
        row["reading [mGal]"] = f"{float(row['reading [mGal]']) + 50.0:.4f}"
    results = invented.survey(rows, tables=TARE.format("08:55:00"))
    assert not found(results, "drift_large") and not found(results, "tare_confounded")


def test_a_run_at_one_station_has_no_signal_to_compare(invented, found):
    rows = invented.visits() + drifting(invented.visits("AA", run="2", start=4.0), 30.0)
    for row in rows[-3:]:
        row["visit"] = "later"
    assert not found(invented.survey(rows, instrument=HONEST), "drift_large")


def test_a_drift_that_the_stated_one_bends_is_an_error(invented, found):
    results = invented.survey(drifting(invented.visits(), 20.0))
    (one,) = found(results, "drift_not_as_stated")
    assert (one.severity, one.place) == ("error", "run 1")
    assert "The mean drift of run 1 is 19.9 mGal/h, 399 sd off the stated 0 ± 0.05 mGal/h" in one.text
    assert "which pulls it towards itself, by " in one.text and " over the run (sd " in one.text


def test_the_pull_is_what_another_prior_moves_the_drift_by(invented, found):
    from plumbwell.reduction.drift_basis import DriftUnknown

    rows = drifting(invented.visits(), 20.0)
    slope = DriftUnknown(kind="drift", run=0, power=1)
    recipe = 'tide = "none"\nnoise = "as_given"'
    bent = invented.survey(rows, recipe=recipe)
    free = invented.survey(rows, recipe=recipe, instrument='applied = ["tide"]\ndrift_rate_sd = 1e6')
    moved = free.network.adjustment.unknown(slope)[0] - bent.network.adjustment.unknown(slope)[0]
    (one,) = found(bent, "drift_not_as_stated")
    assert f"by {moved / 1e-8:.1f} µGal over the run" in one.text


def test_a_drift_a_little_off_wants_a_look(invented, found):
    (one,) = found(invented.survey(drifting(invented.visits(), 0.25)), "drift_not_as_stated")
    assert one.severity == "look"


def test_a_drift_within_four_sd_is_as_stated(invented, found):
    assert not found(invented.survey(drifting(invented.visits(), 0.15)), "drift_not_as_stated")


def test_a_tare_that_parts_the_run_is_named(invented, found):
    (one,) = found(invented.survey(invented.visits("ABABCDCD"), tables=TARE.format("08:35:00")), "tare_confounded")
    assert (one.severity, one.place, one.stations) == ("error", "run 1", (0, 1, 2, 3))
    assert one.text == (
        "The tare of run 1 at 2026-05-04 08:35:00 UTC cannot be told from the difference of gravity between what is "
        "read before it (A and B) and after it (C and D): no station is read on both sides, so the network falls "
        "apart there."
    )
    assert one.mend == (
        "Remove it, if the field notes do not bear it out; state size and size_sd; or bring in a station read on both "
        "sides."
    )


def test_tares_between_all_readings_are_told_together(invented, found):
    tables = "".join(TARE.format(f"08:{minute:02}:00") for minute in (5, 15, 25, 35))
    (one,) = found(invented.survey(invented.visits("ABCBA", readings=1), tables=tables), "tare_confounded")
    assert one.text.startswith("The 4 tares of run 1 at 2026-05-04 08:05:00 UTC, ") and one.stations == (0, 1, 2)
    assert "(2 less would join the stations)" in one.mend


def test_so_many_tares_less_do_join_the_stations(invented, found):
    tables = "".join(TARE.format(f"08:{minute:02}:00") for minute in (25, 35))
    assert not found(invented.survey(invented.visits("ABCBA", readings=1), tables=tables), "tare_confounded")


@pytest.mark.parametrize("stops", ["ABABCDCDA", "ABABACDCD"])
def test_one_station_on_both_sides_tells_the_tare(invented, found, stops):
    assert not found(invented.survey(invented.visits(stops), tables=TARE.format("08:35:00")), "tare_confounded")


def test_a_tare_of_stated_size_parts_nothing(invented, found):
    tables = TARE.format("08:35:00") + "size = 0.1\nsize_sd = 0.01\n"
    assert not found(invented.survey(invented.visits("ABABCDCD"), tables=tables), "tare_confounded")


def test_runs_that_share_no_station_are_no_matter_of_tares(invented, found):
    rows = invented.visits("ABABAB") + invented.visits("CDCDCD", run="2", start=5.0)
    results = invented.survey(rows, tables=TARE.format("08:35:00"))
    assert found(results, "network_parts") and not found(results, "tare_confounded")
