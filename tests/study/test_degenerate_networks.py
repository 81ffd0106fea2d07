"""Weights, outliers, drift, tares and parts at their limits, through the command line: what is said, nothing false."""

import random
from datetime import datetime

import pytest

from invented_surveys import SLOPE

STOPS = "ABCDEDCBADCBAE"
TARE = '[[tare]]\nrun = "1"\ntime = "2026-05-04T{}Z"\n'


def tares(*minutes):
    """Tares of unknown size in run 1, so many minutes after its start."""
    return "".join(TARE.format(f"{8 + minute // 60:02}:{minute % 60:02}:00") for minute in minutes)


def moved(row, size):
    """The row with another reading, mGal."""
    return {**row, "reading [mGal]": f"{float(row['reading [mGal]']) + size:.4f}"}


def drifting(rows, rate):
    """The rows with so much more drift, mGal/h."""
    start = datetime.fromisoformat(rows[0]["time"])
    return [
        moved(row, rate * (datetime.fromisoformat(row["time"]) - start).total_seconds() / 3600.0) for row in rows
    ]


@pytest.mark.parametrize("written", ["0", "-0.005", "0.0", "1e-400"])
def test_an_sd_of_nothing_or_less_is_wrong_input(invented, command, written):
    rows = [{**row, "reading_sd [mGal]": "0.005"} for row in invented.visits()]
    rows[3]["reading_sd [mGal]"] = written
    told = command.refused(invented.written(rows))
    assert "readings.csv, row 5, reading_sd [mGal]" in told


@pytest.mark.parametrize("key", ["reading_floor", "reseating_sd", "station_floor", "drift_rate_sd"])
def test_a_negative_sd_of_the_instrument_is_wrong_input(invented, command, key):
    assert key in command.refused(invented.written(instrument=f'applied = ["tide"]\n{key} = -0.001'))


@pytest.mark.parametrize("noise", ["estimate", "as_given"])
def test_a_missing_sd_is_no_weight_of_its_own(invented, command, noise):
    """A row without one takes the median: the same survey as with the median written there."""
    gravity = []
    for written in ("", "0.006"):
        rows = [{**row, "reading_sd [mGal]": f"0.00{5 + n % 3}"} for n, row in enumerate(invented.visits())]
        rows[4]["reading_sd [mGal]"] = written
        invented.chance.seed(11)
        gravity.append(command(invented.written(rows, recipe=f'tide = "none"\nnoise = "{noise}"')).gravity())
    assert gravity[0] == gravity[1]


def test_readings_without_any_sd_have_the_floor_at_least(invented, command):
    meter = 'applied = ["tide"]\nreading_floor = 0.05'
    done = command(invented.written(instrument=meter))
    assert done.summary["variance_components"]["reading"] == pytest.approx(0.05)
    # Three readings of 50 microgal a visit and three visits of most stations.
    assert all(float(row["gravity_sd [mGal]"]) > 0.05 / 3.0 for row in done.stations[1:])


@pytest.mark.parametrize("noise", ["estimate", "as_given"])
def test_weights_far_apart_are_told_and_give_numbers(invented, command, noise):
    rows = [{**row, "reading_sd [mGal]": "1"} for row in invented.visits()]
    rows[3]["reading_sd [mGal]"] = "1e-12"
    done = command(invented.written(rows, recipe=f'tide = "none"\nnoise = "{noise}"'))
    assert done.status == 0
    (one,) = done.found("weights_far_apart")
    assert one["severity"] == "look" and one["place"] == "readings.csv, row 5" and "1e+24" in one["text"]
    assert all(done.densities().values())


def test_a_reading_ten_gal_off_is_told_and_kept(invented, command):
    rows = invented.visits(STOPS)
    rows[7] = moved(rows[7], 10_000.0)
    done = command(invented.written(rows))
    assert done.summary["counts"] == {"read": 42, "used": 42, "excluded": 0, "refused": 0}
    (one,) = done.found("reading_disagrees")
    assert one["severity"] == "look" and "row 9 at 120.0 m" in one["text"] and "take it out of use" in one["mend"]
    # A third of 10 Gal in one of three visits: what it spoils has an sd that says so.
    assert done.readings[7]["used"] == "yes"
    spoilt = [row for row in done.intervals if "C" in (row["from_station"], row["to_station"])]
    for row in spoilt:
        assert abs(float(row["density [g/cm3]"]) - 2.4) < 4.0 * float(row["density_sd [g/cm3]"])
        assert "density_unsure" in row["flags"] and "reading_disagrees" not in done.errors()


def test_a_visit_ten_gal_off_is_told_and_kept(invented, command):
    rows = invented.visits(STOPS)
    rows[18:21] = [moved(row, 10_000.0) for row in rows[18:21]]
    done = command(invented.written(rows))
    assert done.summary["counts"]["used"] == 42
    (one,) = done.found("visit_disagrees")
    assert one["place"] == "C, 120.0 m" and "reads 10\u00a0000.0" in one["text"]


def test_a_reading_ten_gal_off_that_nothing_checks_shows_in_its_densities(invented, command):
    """No repeat at C: what is told is a density of 10 000/(50 x 0.0838717) = 2 385 g/cm3 less above it, more below."""
    rows = [moved(row, 10_000.0) if row["station"] == "C" else row for row in invented.visits("ABCDBADBA", readings=1)]
    done = command(invented.written(rows))
    assert "unchecked_readings" in {one["code"] for one in done.summary["findings"]}
    for row, sign in zip(done.intervals[1:], (-1.0, 1.0), strict=True):
        assert float(row["density [g/cm3]"]) == pytest.approx(2.4 + sign * 10_000.0 / 50.0 / 0.0838717, abs=0.2)
        assert "density_outside" in row["flags"]
    assert done.intervals[0]["flags"] == ""


def test_half_of_the_visits_off_have_no_majority(invented, command):
    rows, chance = invented.visits(STOPS), random.Random(21)
    for visit in chance.sample(range(14), 7):
        size = chance.choice([-1.0, 1.0]) * chance.uniform(1.0, 5.0)
        rows[3 * visit : 3 * visit + 3] = [moved(row, size) for row in rows[3 * visit : 3 * visit + 3]]
    done = command(invented.written(rows))
    (one,) = done.found("no_majority")
    assert one["severity"] == "look" and done.summary["counts"]["used"] == 42
    for row in done.intervals:
        assert abs(float(row["density [g/cm3]"]) - 2.4) < 5.0 * float(row["density_sd [g/cm3]"])


def test_drift_larger_than_the_signal_is_told_and_the_result_kept(invented, command):
    meter = 'applied = ["tide"]\ndrift_rate_sd = 100'
    rows = invented.visits(STOPS)
    plain = command(invented.written(rows))
    done = command(invented.written(drifting(rows, 50.0), instrument=meter))
    (one,) = done.found("drift_large")
    assert "5.1 times what gravity changes by between its stations" in one["text"] and not done.errors()
    for label, gravity in done.gravity().items():
        # The plain survey leans on 0.05 mGal/h; readings have four decimals.
        assert float(gravity) == pytest.approx(float(plain.gravity()[label]), abs=5e-4)


def test_a_drift_that_contradicts_the_stated_one_is_no_silent_bias(invented, command):
    done = command(invented.written(drifting(invented.visits(STOPS), 300.0)))
    assert done.status == 3 and done.errors() == {"drift_not_as_stated"}


def test_a_tare_between_every_reading_leaves_no_interval(invented, drawn):
    done = drawn(invented.written(invented.visits("ABCBA", readings=1), tables=tares(5, 15, 25, 35)))
    assert done.status == 3 and {"tare_confounded", "network_parts"} <= done.errors()
    # Each station is its own datum; nothing stands between any two.
    assert done.intervals == [] and done.layers == []
    # A and B are read twice, and nothing checks how far apart.
    assert len(done.repeats) == 2
    assert {row["difference_sd [mGal]"] + row["standardised"] for row in done.repeats} == {""}
    assert {row["gravity_sd [mGal]"] for row in done.stations} == {""}
    (one,) = done.found("tare_confounded")
    for minute in (5, 15, 25, 35):
        assert f"2026-05-04 08:{minute:02}:00 UTC" in one["text"]
    assert "(2 less would join the stations)" in one["mend"]
    assert all(tare["size"] is None and tare["sd"] is None for tare in done.summary["tares"]["applied"])


def test_the_tares_that_are_named_are_those_to_drop(invented, command):
    done = command(invented.written(invented.visits("ABCBA", readings=1), tables=tares(25, 35)))
    assert "tare_confounded" not in done.errors() and all(done.densities().values())


def test_two_tares_in_one_gap_have_no_size_and_leave_gravity(invented, command):
    rows = invented.visits()
    done = command(invented.written(rows, tables=tares(65, 66)))
    alone = command(invented.written(rows, tables=tares(65)))
    assert done.status == 3 and done.errors() == {"rank_lost"} and not alone.errors()
    assert done.gravity() == alone.gravity() and done.densities() == alone.densities()
    assert [tare["size"] for tare in done.summary["tares"]["applied"]] == [None, None]
    (one,) = done.found("rank_lost")
    assert "09:05:00" in one["text"] and "09:06:00" in one["text"] and one["mend"].startswith("Remove this tare")


def test_a_drift_that_bends_where_nothing_repeats_leaves_no_gravity(invented, drawn):
    recipe = 'tide = "none"\ndrift_order = 3'
    rows = invented.visits("ABCDE") + invented.visits("ABABAB", run="2", start=5.0)
    done = drawn(invented.written(rows, recipe=recipe))
    assert done.status == 3 and "rank_lost" in done.errors()
    assert [label for label, gravity in done.gravity().items() if gravity] == ["A", "B"]
    assert [label for label, density in done.densities().items() if density] == ["A~B"]
    assert all("rank_lost" in row["flags"] for row in done.intervals[1:])
    first = next(run for run in done.summary["drift"] if run["run"] == "1")
    assert all(one["value"] is None and one["sd"] is None for one in first["coefficients"])
    # Its drift is known at its first reading, from which it counts, and at its last, by the stated rate; not between.
    of_run = [row for row in done.readings if row["run"] == "1"]
    assert [row["drift [mGal]"] == "" for row in of_run] == [False] + [True] * 13 + [False]
    assert all(row["residual [mGal]"] for row in of_run)


def test_what_stands_beside_lost_gravity_is_what_the_good_run_alone_gives(invented, command):
    recipe = 'tide = "none"\ndrift_order = 3\nnoise = "as_given"'
    good = invented.visits("ABABAB", run="2", start=5.0)
    alone = command(invented.written(good, recipe=recipe))
    both = command(invented.written(invented.visits("ACDEB") + good, recipe=recipe))
    # The other run has its ends at A and B, and tells of B within its stated drift, 35 microgal, to a good run's 4.
    assert both.gravity()["B"] and alone.gravity()["B"]
    assert float(both.gravity()["B"]) == pytest.approx(float(alone.gravity()["B"]), abs=0.002)


def test_a_tare_at_a_station_change_is_told_by_name(invented, command):
    done = command(invented.written(invented.visits("ABABCDCD"), tables=tares(35)))
    assert done.status == 3 and {"tare_confounded", "network_parts"} <= done.errors()
    (one,) = done.found("tare_confounded")
    assert "read before it (A and B) and after it (C and D)" in one["text"]
    assert list(done.densities()) == ["A~B", "C~D"]


def test_a_tare_of_stated_size_at_a_station_change_has_its_error_in_the_density(invented, command):
    tables = tares(35) + "size = 0.0\nsize_sd = 0.1\n"
    done = command(invented.written(invented.visits("ABABCDCD"), tables=tables))
    assert done.status == 0
    sd = {row["from_station"]: float(row["density_sd [g/cm3]"]) for row in done.intervals}
    # 0.1 mGal over 50 m, between B and C alone.
    assert sd["B"] > 0.1 / 50.0 / 0.0838717 > 10.0 * max(sd["A"], sd["C"])


@pytest.mark.parametrize("where", ["A", "E"])
def test_loops_without_a_shared_station_stand_each_on_its_highest(invented, drawn, where):
    rows = invented.visits("ABABAB") + invented.visits("DEDEDE", run="2", start=5.0)
    done = drawn(invented.written(rows, recipe=f'tide = "none"\ndatum_station = "{where}"'))
    assert done.status == 3 and done.errors() == {"network_parts"}
    assert list(done.densities()) == ["A~B", "D~E"]
    datums = {row["station"] for row in done.stations if row["gravity_sd [mGal]"] == ""}
    assert datums == {"A": {"A", "D"}, "E": {"A", "E"}}[where]
    for label in ("A~B", "D~E"):
        assert float(done.densities()[label]) == pytest.approx(2.4, abs=0.01)


def test_loops_that_meet_in_one_reading_are_one(invented, command):
    rows = invented.visits("ABABAB") + invented.visits("BDEDEDE", run="2", start=5.0)
    done = command(invented.written(rows))
    assert done.status == 0 and list(done.densities()) == ["A~B", "B~D", "D~E"]
    assert float(done.gravity()["E"]) == pytest.approx(SLOPE * 200.0, abs=0.03)


def test_runs_that_meet_at_an_unused_reading_only_are_parts(invented, command):
    rows = invented.visits("ABABAB") + invented.visits("BDEDEDE", run="2", start=5.0)
    for row in rows[18:21]:
        row["use"] = "no"
    done = command(invented.written(rows))
    assert done.status == 3 and list(done.densities()) == ["A~B", "D~E"]


def test_ties_in_both_loops_give_the_gravity_between_them(invented, command):
    rows = invented.visits("ABABAB") + invented.visits("DEDEDE", run="2", start=5.0)
    ties = f"station,gravity [mGal],gravity_sd [mGal]\nA,980000,0.01\nE,{980000.0 + SLOPE * 200.0:.4f},0.01\n"
    done = command(invented.written(rows, data='ties = "ties.csv"', files={"ties.csv": ties}))
    assert done.status == 0 and done.summary["absolute"] is True
    assert list(done.densities()) == ["A~B", "B~D", "D~E"] and all(done.densities().values())
