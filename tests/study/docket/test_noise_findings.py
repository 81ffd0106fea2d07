"""What the docket says about noise: each kind where it is due, and a near miss."""

import random

import pytest


def moved(rows, visits, size, *, readings=3):
    """The rows with all readings of some visits moved: `size` is one number, or one a visit, mGal."""
    for place, visit in enumerate(visits):
        by = size[place] if isinstance(size, list) else size
        for row in rows[visit * readings : (visit + 1) * readings]:
            row["reading [mGal]"] = f"{float(row['reading [mGal]']) + by:.4f}"
    return rows


def with_sd(rows, sd_of):
    """The rows with a stated sd each."""
    return [{**row, "reading_sd [mGal]": sd_of(number)} for number, row in enumerate(rows)]


def test_weights_a_million_times_apart_are_told_with_the_rows(invented, found):
    rows = with_sd(invented.visits(), lambda number: "1e-12" if number == 3 else "1")
    (one,) = found(invented.survey(rows), "weights_far_apart")
    assert (one.severity, one.place, one.rows) == ("look", "readings.csv, row 5", (3,))
    assert one.text == (
        "reading_sd goes from 1e-12 mGal (row 5) to 1 mGal (row 2): weights differ by a factor of 1e+24; "
        "reading_floor brings that to 1."
    )


def test_weights_that_no_floor_brings_together_are_called_so(invented, found):
    rows = with_sd(invented.visits(), lambda number: "1e-12" if number == 3 else "5")
    results = invented.survey(rows, recipe='tide = "none"\nnoise = "as_given"')
    (one,) = found(results, "weights_far_apart")
    # 5 mGal beside the floor of 2 microgal.
    assert one.text.endswith(
        "with reading_floor still by 6e+06. Beside the best readings the others count for nothing."
    )


@pytest.mark.parametrize(("least", "told"), [("0.00099", 1), ("0.00101", 0)])
def test_a_thousand_times_the_sd_is_a_million_times_the_weight(invented, found, least, told):
    rows = with_sd(invented.visits(), lambda number: least if number == 3 else "1")
    assert len(found(invented.survey(rows), "weights_far_apart")) == told


def test_rows_out_of_use_do_not_count_for_the_weights(invented, found):
    rows = with_sd(invented.visits(), lambda number: "1e-12" if number == 3 else "1")
    rows[3]["use"] = "no"
    assert not found(invented.survey(rows), "weights_far_apart")


def test_readings_without_scatter_rest_on_what_is_stated(invented, found):
    rows = invented.visits()
    for row in rows:
        row["reading [mGal]"] = f"{4000.0 + 0.1 * float(row['depth [m]']):.4f}"
    results = invented.survey(rows)
    (one,) = found(results, "noise_at_floor")
    assert one.severity == "look" and one.place == "network"
    assert "every sd rests on what is stated (reading_floor, reseating_sd), not on what the survey shows" in one.text
    assert "degrees of freedom)" in one.text


def test_usual_noise_is_not_too_small(invented, found):
    assert not found(invented.survey(), "noise_at_floor")
    assert not found(invented.survey(invented.visits("ABCDABCDABCDAB")), "noise_at_floor")


@pytest.mark.parametrize(("quiet", "told"), [(0.05, 1), (0.1, 0)])
def test_noise_far_below_the_floor_is_told_from_one_chance_in_a_thousand_on(invented, found, quiet, told):
    # Of the usual 3 microgal; the chances of so good an agreement are 0.0007 and 0.03.
    assert len(found(invented.survey(invented.visits(quiet=quiet)), "noise_at_floor")) == told


def read_twice(rows, visits, size):
    """Single readings, some of them read again half a minute later, off the first by so much, mGal."""
    more = [
        {
            **rows[one],
            "time": rows[one]["time"].replace(":00Z", ":30Z"),
            "reading [mGal]": f"{float(rows[one]['reading [mGal]']) + size:.4f}",
        }
        for one in visits
    ]
    return sorted([*rows, *more], key=lambda row: row["time"])


def test_one_bad_second_reading_is_told_as_such_and_is_no_noise(invented, found):
    results = invented.survey(read_twice(invented.visits("ABCDEDCBADCBAE", readings=1), [4], 0.06))
    assert not found(results, "noise_at_floor")
    (one,) = found(results, "noise_of_few")
    assert (one.severity, one.stations, one.rows) == ("look", (4,), (4, 5))
    # Two readings 60 microgal apart, 0.2 of it drift: that over the root of 2.
    assert one.text.startswith(
        "Readings within visits scatter by 42.3 µGal (1 degree of freedom), most in visit 5 at 220.0 m, where the "
        "visits themselves allow "
    )
    assert one.place == "E, 220.0 m; readings.csv, rows 6 and 7"
    assert results.network.adjustment.noise.sd.max() == 2e-8


def test_a_second_reading_as_far_off_as_noise_puts_it_is_no_finding(invented, found):
    rows = read_twice(invented.visits("ABCDEDCBADCBAE", readings=1), [4], 0.01)
    assert not found(invented.survey(rows), "noise_of_few")


def test_noise_that_five_bad_visits_gave_to_all_is_told_as_such(invented, found):
    rows = read_twice(invented.visits("ABCDE" * 10, readings=1), [4, 13, 22, 31, 45], 0.06)
    (one,) = found(invented.survey(rows), "noise_of_few")
    assert one.severity == "look" and "the noise of a reading, 42.3 µGal, is what 5 degrees of freedom" in one.text


def test_noise_that_many_visits_share_is_not_that_of_few(invented, found):
    assert not found(invented.survey(), "noise_of_few")


def test_a_base_that_is_the_only_repeat_tells_its_own_noise_only(invented, found):
    (one,) = found(invented.survey(invented.visits("ABACADAEA")), "one_station_repeated")
    assert (one.severity, one.place, one.stations) == ("look", "A, 20.0 m", (1, 2, 3, 4))
    assert one.text == (
        "Only A is visited more than once: the noise of a stop is what that station shows, and is taken for the 4 "
        "others, where nothing tells it."
    )


def test_one_more_repeat_at_depth_is_enough(invented, found):
    assert not found(invented.survey(invented.visits("ABACADAEAC")), "one_station_repeated")


def test_stated_noise_needs_no_repeat(invented, found):
    results = invented.survey(invented.visits("ABACADAEA"), recipe='tide = "none"\nnoise = "as_given"')
    assert not found(results, "one_station_repeated")


STOPS = "ABCDEDCBADCBAE"


def half_of_the_visits(share):
    """Which of the fourteen visits are off, and by how much, mGal."""
    chance = random.Random(5)
    bad = chance.sample(range(len(STOPS)), round(share * len(STOPS)))
    return bad, [chance.choice([-1.0, 1.0]) * chance.uniform(1.0, 5.0) for _ in bad]


@pytest.mark.parametrize("stated", [0.0, 0.003])
def test_visits_of_which_half_are_off_have_no_majority(invented, found, stated):
    rows = moved(invented.visits(STOPS), *half_of_the_visits(0.5))
    results = invented.survey(rows, instrument=f'applied = ["tide"]\nreseating_sd = {stated}')
    (one,) = found(results, "no_majority")
    assert one.severity == "look" and one.place == "network" and one.stations
    assert "only 8 degrees of freedom check them: no consistent majority tells which are wrong" in one.text
    # Nothing was left out, and the sds count the scatter of 1 to 5 mGal.
    assert len(results.network.visits.rows) == 3 * len(STOPS)
    assert results.stations.gravity_sd.values[1:].min() > 5e-6


def test_stated_noise_does_not_count_the_scatter_and_that_is_said(invented, found):
    rows = moved(invented.visits(STOPS), *half_of_the_visits(0.5))
    (one,) = found(invented.survey(rows, recipe='tide = "none"\nnoise = "as_given"'), "no_majority")
    assert one.text.endswith("No sd counts this scatter, since the noise is the stated one.")


def test_half_of_many_visits_hide_behind_no_noise(invented, found):
    stops = "ABCDECBDAE" * 3
    chance = random.Random(8)
    bad = chance.sample(range(30), 15)
    sizes = [chance.choice([-1.0, 1.0]) * chance.uniform(1.0, 5.0) for _ in bad]
    results = invented.survey(moved(invented.visits(stops), bad, sizes))
    assert [one.place for one in found(results, "no_majority")] == ["network"]


def test_one_bad_visit_leaves_a_majority(invented, found):
    results = invented.survey(moved(invented.visits(STOPS), [6], 3.0))
    assert not found(results, "no_majority") and found(results, "visit_disagrees")


def test_noise_of_five_times_what_is_stated_is_noise(invented, found):
    results = invented.survey(invented.visits("ABCDEDCBADCBAE" * 2, quiet=5.0))
    assert not found(results, "no_majority")


def test_readings_of_which_half_are_off_have_no_majority(invented, found):
    rows, chance = invented.visits(STOPS), random.Random(3)
    for row in rows[::2]:
        by = chance.choice([-1.0, 1.0]) * chance.uniform(1.0, 5.0)
        row["reading [mGal]"] = f"{float(row['reading [mGal]']) + by:.4f}"
    results = invented.survey(rows)
    (one,) = (one for one in found(results, "no_majority") if one.rows)
    assert one.severity == "look" and set(one.rows) & set(range(0, 42, 2))
    assert "28 degrees of freedom check the readings within visits: no consistent majority" in one.text
    assert len(results.network.visits.rows) == 42


def test_one_bad_reading_leaves_a_majority(invented, found):
    rows = invented.visits(STOPS)
    rows[7]["reading [mGal]"] = f"{float(rows[7]['reading [mGal]']) + 10_000.0:.4f}"
    results = invented.survey(rows)
    assert not found(results, "no_majority") and len(found(results, "reading_disagrees")) == 1


def test_the_fit_by_least_absolute_deviations_is_as_low_as_the_linear_programme(invented):
    """Half of the visits off by milligals: the sum of absolute residuals against its least by linear programming."""
    import numpy as np
    from scipy.optimize import linprog

    from plumbwell.study.docket.noise import _least_deviations

    results = invented.survey(moved(invented.visits(STOPS), *half_of_the_visits(0.5)))
    fit, visits = results.network.adjustment, results.network.visits
    residual = fit.solution.residual[:, 0]
    left = np.abs(_least_deviations(results, residual, np.full(len(visits), 4e-8))).sum() / 1e-5
    past = (0.5 * (visits.first + visits.last) - visits.first[0]) / 3600.0
    columns = [visits.station == one for one in range(5)] + [past]
    design, count = np.column_stack(columns).astype(float), len(visits)
    # residual = design x + over - under, all in mGal; the sum of over and under is least.
    equal = np.hstack([design, np.eye(count), -np.eye(count)])
    bounds = [(None, None)] * design.shape[1] + [(0.0, None)] * (2 * count)
    cost = np.concatenate([np.zeros(design.shape[1]), np.ones(2 * count)])
    least = linprog(cost, A_eq=equal, b_eq=residual / 1e-5, bounds=bounds).fun
    # Residuals under a tenth of 4 microgal count by their squares: at most half of that is lost in each of the visits.
    assert least <= left + 1e-9 and left - least < count * 0.5 * 0.1 * 0.004
    assert np.abs(residual).sum() / 1e-5 > 1.02 * least
