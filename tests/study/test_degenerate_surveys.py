"""Surveys with too few stations, repeats or times, through the command line: what is said, and nothing false."""

import pytest

from invented_surveys import DEPTHS, SLOPE


def at_one_time(rows):
    """The rows, all at the time of the first."""
    return [{**row, "time": rows[0]["time"]} for row in rows]


def at_depth(rows, depths):
    """The rows with other depths at some stations."""
    return [{**row, "depth [m]": depths.get(row["station"], row["depth [m]"])} for row in rows]


def test_one_station_has_its_value_and_no_density(invented, command):
    done = command(invented.written(invented.visits("AAAA")))
    assert done.status == 3 and "single_station" in done.errors()
    assert done.gravity() == {"A": "0"} and done.intervals == [] and done.layers == []
    assert "a density needs two depths" in done.found("single_station")[0]["text"]


def test_one_station_with_a_tie_has_the_gravity_of_the_tie(invented, command):
    ties = {"ties.csv": "station,gravity [mGal],gravity_sd [mGal]\nA,980665.25,0.02\n"}
    done = command(invented.written(invented.visits("AAAA"), data='ties = "ties.csv"', files=ties))
    (row,) = done.stations
    assert float(row["gravity [mGal]"]) == pytest.approx(980665.25, abs=1e-9)
    # The tie's own sd, and the floor of a station, 1 microgal, beside it at least.
    assert float(row["gravity_sd [mGal]"]) >= 0.02
    assert done.intervals == []


def test_stations_at_one_depth_have_repeats_and_no_density(invented, command):
    done = command(invented.written(at_depth(invented.visits("ABABAB"), {"B": "20.0"})))
    assert done.status == 3 and done.errors() == {"single_station"}
    assert done.intervals == [] and len(done.repeats) == 4
    assert all(float(row["difference_sd [mGal]"]) > 0.0 for row in done.repeats)
    assert float(done.gravity()["B"]) == pytest.approx(SLOPE * 50.0, abs=0.03)


def test_two_depths_a_millimetre_apart_make_no_interval_unless_asked_for(invented, command):
    rows = at_depth(invented.visits("ABCABCABC"), {"B": "20.001"})
    done = command(invented.written(rows))
    assert done.status == 0 and list(done.densities()) == ["A~C"] and done.found("close_stations")


def test_two_depths_a_millimetre_apart_tell_nothing_and_say_so(invented, command):
    rows = at_depth(invented.visits("ABCABCABC"), {"B": "20.001"})
    done = command(invented.written(rows, recipe='tide = "none"\nmin_thickness = 0.0005'))
    thin, thick = done.intervals
    # 5.4 mGal over a millimetre; the depths are 3 cm true each, so that the sd says 42 times what it says.
    assert float(thin["density [g/cm3]"]) < -6e4 and float(thin["density_sd [g/cm3]"]) > 2e6
    assert thin["flags"] == "density_unsure" and "density_unsure" not in thick["flags"]
    # In layers it counts by its sd: the whole keeps the density of the thick interval.
    assert float(done.layers[-1]["density [g/cm3]"]) == pytest.approx(float(thick["density [g/cm3]"]), abs=1e-6)


@pytest.mark.parametrize("stops", ["ABCDE", "AABBCC", "EDCBA"])
def test_without_a_repeat_the_drift_is_the_stated_one_and_never_driftless(invented, command, stops):
    meter = 'applied = ["tide"]\ndrift_rate = 0.01\ndrift_rate_sd = 0.04'
    done = command(invented.written(invented.visits(stops), instrument=meter))
    assert done.status == 3 and {"no_repeat", "noise_untold"} <= done.errors()
    assert "the drift is the stated one, 0.01 ± 0.04 mGal/h" in done.found("no_repeat")[0]["text"]
    (run,) = done.summary["drift"]
    (slope,) = run["coefficients"]
    # Readings of 4000 mGal are rounded at 1e-12 mGal, and the free fit is some hundred times as weak as they are.
    assert slope["value"] == pytest.approx(0.01, abs=1e-9) and slope["sd"] == pytest.approx(0.04, abs=1e-9)
    # Between neighbours that were read ten minutes apart the sd of drift is 0.04 mGal/h for as long, at the least.
    minutes = 20.0 if stops[0] == stops[1] else 10.0
    least = 0.04 * minutes / 60.0 / 50.0 / 0.0838717
    assert all(float(row["density_sd [g/cm3]"]) > least for row in done.intervals)
    assert all(row["flags"].split(";").count("no_repeat") == 1 for row in done.stations)


def test_a_pass_down_and_one_up_again_tell_drift_from_depth(invented, command):
    done = command(invented.written(invented.visits("ABCDEDCBA")))
    assert done.status == 0 and not done.errors()


def test_equal_times_have_no_drift_and_are_no_error(invented, command):
    done = command(invented.written(at_one_time(invented.visits("ABABABAB"))))
    assert done.status == 0 and not done.errors()
    (run,) = done.summary["drift"]
    assert run["order"] == 0 and run["coefficients"] == []
    assert {row["drift [mGal]"] for row in done.readings} == {"0"}
    assert "order, and the drift between them, is not known" in done.found("equal_times")[0]["text"]
    assert not done.found("drift_held")


def test_missing_times_are_wrong_input(invented, command):
    rows = [{**row, "time": ""} for row in invented.visits("ABAB")]
    told = command.refused(invented.written(rows))
    assert "readings.csv, row 2, time" in told and "write the time of the reading" in " ".join(told.split())


def test_one_missing_time_is_wrong_input(invented, command):
    rows = invented.visits("ABAB")
    rows[4]["time"] = ""
    assert "readings.csv, row 6, time" in command.refused(invented.written(rows))


def test_a_base_alone_that_is_repeated_gives_drift_and_densities_and_a_word(invented, command):
    done = command(invented.written(invented.visits("ABACADAEA", readings=1)))
    assert done.status == 0
    for density in done.densities().values():
        assert float(density) == pytest.approx(2.4, abs=0.01)
    (slope,) = done.summary["drift"][0]["coefficients"]
    assert slope["sd"] < 0.01 < 0.05
    (one,) = done.found("one_station_repeated")
    assert one["severity"] == "look" and "is taken for the 4 others" in one["text"]


@pytest.mark.parametrize("readings", [1, 3])
def test_no_spare_degree_of_freedom_has_no_noise_of_its_own(invented, command, readings):
    meter = 'applied = ["tide"]\nreseating_sd = 0.007\nreading_floor = 0.002'
    done = command(invented.written(invented.visits("ABCDEA", readings=readings), instrument=meter))
    assert done.status == 3 and done.errors() == {"noise_untold"}
    assert done.summary["chi_square"] == {"value": None, "dof": 0, "p": None}
    noise = done.summary["variance_components"]
    assert noise["dof"] == 0 and noise["reseating"] == pytest.approx(0.007) and noise["reading"] >= 0.002
    assert {row["dof"] for row in done.intervals} == {"4"}
    # Two stops of 7 microgal each over 50 m, at the least.
    assert all(float(row["density_sd [g/cm3]"]) > 0.007 / 50.0 / 0.0838717 for row in done.intervals)


def test_stated_sds_stand_in_for_noise_where_nothing_else_tells_it(invented, command):
    """u0 = sqrt(reseating_sd2 + m2), m the median of the stated sds, where no visit has two readings."""
    rows = [{**row, "reading_sd [mGal]": "0.024"} for row in invented.visits("ABCDEA", readings=1)]
    meter = 'applied = ["tide"]\nreseating_sd = 0.007'
    done = command(invented.written(rows, instrument=meter))
    assert done.summary["variance_components"]["reseating"] == pytest.approx(0.025, rel=1e-9)


def test_a_perfect_fit_has_the_sd_of_the_floor_and_a_word(invented, command):
    rows = invented.visits("ABCDEDCBADCBAEAB")
    for row in rows:
        row["reading [mGal]"] = f"{4000.0 + 0.1 * float(row['depth [m]']):.4f}"
    meter = 'applied = ["tide"]\nreading_floor = 0.002\nstation_floor = 0.001'
    done = command(invented.written(rows, instrument=meter))
    assert done.status == 0
    (one,) = done.found("noise_at_floor")
    assert one["severity"] == "look" and "rests on what is stated" in one["text"]
    assert done.summary["variance_components"]["reading"] == pytest.approx(0.002)
    # Three readings a visit of 2 microgal each, and no better than the floor of a station, 1 microgal.
    for row in done.stations[1:]:
        assert float(row["gravity_sd [mGal]"]) >= 0.001
    for row in done.stations:
        expected = 0.1 * (DEPTHS[row["station"]] - 20.0)
        assert float(row["gravity [mGal]"]) == pytest.approx(expected, abs=1e-9)


def test_one_reading_in_all_is_a_station_without_a_false_number(invented, drawn):
    done = drawn(invented.written(invented.visits("A", readings=1)))
    assert done.status == 3 and "single_station" in done.errors()
    (row,) = done.readings
    assert row["redundancy"] == "" or float(row["redundancy"]) == pytest.approx(0.0, abs=1e-9)
    assert row["standardised_residual"] == ""


def test_two_readings_in_all_are_drawn_too(invented, drawn):
    done = drawn(invented.written(invented.visits("AB", readings=1)))
    assert done.status == 3 and list(done.densities()) == ["A~B"]


def test_readings_out_of_use_alone_are_told_in_a_sentence(invented, command):
    rows = [{**row, "use": "no"} for row in invented.visits("AB")]
    told = command.refused(invented.written(rows))
    assert "no reading in use belongs to a station" in " ".join(told.split())
